"""Every edition made anew from its files is the one that was committed; damage is noticed."""

from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy import Engine, text
from sqlalchemy.orm import Session

from server.accounts.viewer import LOCAL
from server.actions import commit_upload as committing
from server.actions import rebuild_editions as rebuilding
from server.actions.commit_upload import commit_upload
from server.actions.rebuild_editions import Rebuilt, rebuild_editions
from server.intake.parsing import READER
from server.store.errors import Missing
from server.store.records import ALL_OF_IT, Taking
from tests.factories import (
    BASIS,
    COLUMNS,
    NOON,
    cells,
    checked_upload,
    counts_csv,
    stored_collection,
    stored_edition,
    withdrawn,
)

WHOLE = replace(COLUMNS, whole="isle")
DELIVERED = replace(WHOLE, delivered=("isle",))
HISTORY = (  # content, mapping, basis, what is taken of it
    (counts_csv(), WHOLE, BASIS, ALL_OF_IT),
    (counts_csv(["north"], times=2), COLUMNS, replace(BASIS, source="revised"), ALL_OF_IT),
    (counts_csv(times=3), WHOLE, BASIS, ALL_OF_IT),  # withdrawn
    (counts_csv(["south"], years=[2002], times=4), WHOLE, BASIS, ALL_OF_IT),
    (counts_csv(["east"], years=[2002]), WHOLE, BASIS, ALL_OF_IT),  # a new part of the whole
    (counts_csv(years=[2003], sexes="f"), DELIVERED, BASIS, Taking(gives_way="all")),
)


@pytest.fixture(autouse=True)
def history(session: Session) -> None:
    stored_collection(session)
    for number, (content, mapping, basis, over) in enumerate(HISTORY, start=1):
        upload = checked_upload(session, content, mapping=mapping, basis=basis)
        commit_upload(session, upload_id=upload.id, note="n", by=LOCAL, now=NOON, taking=over)
        if number == 3:
            withdrawn(session, 3)


def rebuilt(session: Session) -> tuple[Rebuilt, ...]:
    return rebuild_editions(session, collection="saltmarsh", by=LOCAL)


def test_every_edition_is_made_anew(session: Session) -> None:
    report = rebuilt(session)
    assert [(one.number, one.same, one.reason) for one in report] == [
        (number, True, "") for number in range(1, 7)
    ]
    assert len({one.recorded for one in report}) == 6


def test_a_number_changed_in_the_database_is_noticed(session: Session, engine: Engine) -> None:
    change = text(
        "UPDATE schedule SET vector = :vector WHERE id ="
        " (SELECT min(id) FROM schedule WHERE area = 'south' AND sex = 'p')"
    )
    with engine.begin() as connection:
        connection.execute(change, {"vector": np.arange(4.0).tobytes()})
    report = rebuilt(session)
    assert [one.same for one in report] == [False, False, True, True, True, True]
    assert report[1].recorded == report[1].reread != report[1].stored


def test_a_damaged_file_is_named_and_so_are_the_editions_built_on_it(
    session: Session, engine: Engine
) -> None:
    with engine.begin() as connection:
        blob = {"content": counts_csv(["north"], times=5)}
        connection.execute(
            text("UPDATE upload_file SET content = :content WHERE upload_id = 2"), blob
        )
    report = rebuilt(session)
    assert [one.same for one in report] == [True, False, False, False, False, True]
    assert (
        report[1]
        .reason.format(**report[1].values)
        .startswith("The kept file counts.csv of upload 2 is damaged")
    )
    assert report[3].reason.format(**report[3].values) == (
        "Its base, edition 2, could not be made anew."
    )
    assert all(one.stored == one.recorded for one in report)


def test_a_reader_that_reads_otherwise_is_noticed(
    session: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    read = committing.parse

    def otherwise(*handed: object, **how: object) -> object:
        parsed = read(*handed, **how)  # type: ignore[arg-type]
        key = next(iter(parsed.cells))
        return replace(parsed, cells={k: c for k, c in parsed.cells.items() if k != key})

    monkeypatch.setattr(committing, "parse", otherwise)
    assert not any(one.same for one in rebuilt(session))


def test_a_newer_reader_does_not_pretend(session: Session, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(rebuilding, "READER", "reader-9")
    report = rebuilt(session)
    assert report[0].reason.format(**report[0].values).startswith(f"It was read by {READER}")
    assert report[0].reread == ""


def test_an_edition_that_came_from_no_file_is_said_to(session: Session) -> None:
    stored_collection(session, "reef")
    stored_edition(session, cells(), collection="reef")
    (only,) = rebuild_editions(session, collection="reef", by=LOCAL)
    assert (only.same, only.reason) == (False, "It was not made of an upload.")
    with pytest.raises(Missing, match="There is no collection mire; known: reef, saltmarsh"):
        rebuild_editions(session, collection="mire", by=LOCAL)
