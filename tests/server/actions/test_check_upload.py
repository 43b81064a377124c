"""A draft is mapped and checked; the report is kept with the edition that stood."""

from dataclasses import replace
from typing import Any

import pytest
from sqlalchemy.orm import Session, sessionmaker

from server.accounts.viewer import LOCAL, NotAllowed, Right, Viewer
from server.actions import check_upload as checking
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.discard_upload import discard_upload
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.intake.mapping import Mapping
from server.intake.parsing import READER, Parsed
from server.intake.report import Report
from server.store import editions, uploads
from server.store.connect import transaction
from server.store.errors import Missing, Refused
from server.store.records import Upload
from tests.factories import BASIS, COLUMNS, NOON, checked_upload, counts_csv, stored_collection

WHOLE = replace(COLUMNS, whole="isle", delivered=("isle",))
BAD = counts_csv().replace(b"2001,f,1-4", b"2001,x,1-4")


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


def draft(session: Session, content: bytes = BAD) -> Upload:
    files = [("counts", "counts.csv", content)]
    return receive_upload(session, collection="saltmarsh", files=files, by=LOCAL, now=NOON)


def mapped(session: Session, upload: Upload, mapping: Mapping = COLUMNS) -> Upload:
    return map_upload(
        session,
        upload_id=upload.id,
        mappings={"counts": mapping},
        basis=BASIS,
        by=LOCAL,
        now=NOON,
    )


def test_a_mapping_is_kept_in_its_canonical_text(session: Session) -> None:
    upload = mapped(session, draft(session))
    assert upload.files[0].mapping == COLUMNS.to_json()
    assert upload.basis == BASIS


def test_the_report_is_kept(session: Session) -> None:
    upload = mapped(session, draft(session))
    report = check_upload(session, upload_id=upload.id)
    assert [problem.key for problem in report.problems] == ["unknown_sex"]
    kept = uploads.find(session, upload.id)
    assert Report.from_json(kept.report) == report
    assert (kept.reader, kept.base) == (READER, 0)


def test_a_check_makes_no_edition(session: Session) -> None:
    upload = checked_upload(session, counts_csv())
    assert editions.listing(session, "saltmarsh") == ()
    assert upload.edition is None


def test_mapping_again_drops_the_report(session: Session) -> None:
    upload = checked_upload(session, counts_csv())
    assert upload.report
    again = mapped(session, upload)
    assert (again.report, again.reader, again.base) == ("", "", None)


def test_an_unmapped_file_is_not_checked(session: Session) -> None:
    with pytest.raises(Refused, match=r"The columns of counts\.csv are not mapped yet"):
        check_upload(session, upload_id=draft(session).id)
    with pytest.raises(Missing, match="There is no upload 99"):
        check_upload(session, upload_id=99)


def test_the_edition_that_stands_is_noted(session: Session) -> None:
    first = checked_upload(session, counts_csv())
    commit_upload(session, upload_id=first.id, note="", by=LOCAL, now=NOON)
    assert checked_upload(session, counts_csv(times=2)).base == 1


def test_parts_of_the_standing_edition_are_not_missed(session: Session) -> None:
    whole = counts_csv(("isle", "north", "south"))
    first = checked_upload(session, whole, mapping=WHOLE)
    assert "whole_differs" in first.report
    commit_upload(session, upload_id=first.id, note="as delivered", by=LOCAL, now=NOON)
    second = checked_upload(session, counts_csv(("isle", "north")), mapping=WHOLE)
    assert Report.from_json(second.report).problems == ()


def test_an_edition_cannot_be_mapped_checked_or_thrown_away(session: Session) -> None:
    upload = checked_upload(session, counts_csv())
    commit_upload(session, upload_id=upload.id, note="", by=LOCAL, now=NOON)
    for act in (
        lambda: mapped(session, upload),
        lambda: check_upload(session, upload_id=upload.id),
        lambda: discard_upload(session, upload_id=upload.id, by=LOCAL),
    ):
        with pytest.raises(Refused, match="has become edition 1"):
            act()


def test_who_may_not_upload_may_not_map(session: Session) -> None:
    upload = draft(session)
    reader = Viewer("a reader", frozenset({Right.READ}))
    with pytest.raises(NotAllowed):
        map_upload(session, upload_id=upload.id, mappings={}, basis=BASIS, by=reader, now=NOON)
    with pytest.raises(Missing, match="There is no file deaths"):
        map_upload(
            session,
            upload_id=upload.id,
            mappings={"deaths": COLUMNS},
            basis=BASIS,
            by=LOCAL,
            now=NOON,
        )


def test_a_draft_mapped_anew_while_it_is_checked_gets_no_report_of_the_old_mapping(
    session: Session, new_session: sessionmaker[Session], monkeypatch: pytest.MonkeyPatch
) -> None:
    draft = checked_upload(session, counts_csv())
    parse = checking.parse

    def overtaken(*handed: Any, **how: Any) -> Parsed:
        parsed = parse(*handed, **how)
        with new_session() as other, transaction(other):
            mappings = {"counts": replace(COLUMNS, whole="isle").to_json()}
            uploads.set_mapping(other, draft.id, mappings=mappings, basis=BASIS)
        return parsed

    monkeypatch.setattr(checking, "parse", overtaken)
    session.rollback()
    with pytest.raises(Refused, match="changed while it was being checked"):
        check_upload(session, upload_id=draft.id)
    assert uploads.find(session, draft.id).report == ""


def test_how_far_it_is_is_told_a_step_a_file(session: Session) -> None:
    told: list[tuple[int, int, str]] = []
    deaths = replace(COLUMNS, population="")
    files = [("deaths", "d.csv", counts_csv()), ("population", "p.csv", counts_csv())]
    upload = receive_upload(session, collection="saltmarsh", files=files, by=LOCAL, now=NOON)
    mappings = {"deaths": deaths, "population": replace(COLUMNS, deaths="")}
    map_upload(session, upload_id=upload.id, mappings=mappings, basis=BASIS, by=LOCAL, now=NOON)
    check_upload(session, upload_id=upload.id, tell=lambda *step: told.append(step))  # type: ignore[arg-type,misc]
    assert told == [
        (0, 6, "opening the files"),
        (1, 6, "reading the rows"),
        (2, 6, "reading the rows"),
        (3, 6, "checking the counts"),
        (4, 6, "comparing with what stands"),
        (5, 6, "writing the report"),
    ]
