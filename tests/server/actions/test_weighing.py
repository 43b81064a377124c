"""What is left to a worker: many rows, or a mask made of many counts."""

from dataclasses import replace

import pytest
from sqlalchemy.orm import Session

from server.accounts.viewer import LOCAL
from server.actions import weighing
from server.actions.commit_upload import Sound, commit_upload, require_sound
from server.actions.set_policy import set_policy
from server.store import schedules
from server.store.records import ALL_OF_IT, Selection, Taking, Terms
from tests.factories import COLUMNS, NOON, checked_upload, counts_csv, stored_collection

WHOLE = replace(COLUMNS, whole="isle")
AREAS = ("north", "south", "east")
YEARS = range(2001, 2007)


@pytest.fixture(autouse=True)
def first(session: Session) -> None:
    stored_collection(session)
    upload = checked_upload(session, counts_csv(AREAS, years=YEARS), mapping=WHOLE)
    commit_upload(session, upload_id=upload.id, note="n", by=LOCAL, now=NOON)


def withheld(session: Session) -> None:
    set_policy(session, collection="saltmarsh", terms=Terms(), note="n", by=LOCAL, now=NOON)


def small(session: Session, **made: object) -> Sound:
    content = counts_csv(**({"areas": ["north"], "years": (2002,), "times": 2} | made))  # type: ignore[arg-type]
    return require_sound(checked_upload(session, content, mapping=WHOLE))


def held(session: Session, *periods: str) -> int:
    """Numbers by age of edition 1, counted here one by one."""
    chosen = Selection(periods=periods or None, cause=None)
    cells = schedules.load(session, "saltmarsh", 1, chosen).values()
    return sum(len(cell.values) for cell in cells)


def test_without_a_policy_rows_alone_weigh(
    session: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    sound = small(session)
    assert weighing.masked(session, sound, ALL_OF_IT) == 0
    monkeypatch.setattr(weighing, "ROWS", sound.rows)
    assert not weighing.takes_long(session, sound, ALL_OF_IT)
    monkeypatch.setattr(weighing, "ROWS", sound.rows - 1)
    assert weighing.takes_long(session, sound, ALL_OF_IT)


def test_a_small_upload_weighs_as_the_years_it_touches(session: Session) -> None:
    """All areas of its year are masked anew, not its own rows alone."""
    withheld(session)
    sound = small(session)
    assert weighing.masked(session, sound, ALL_OF_IT) == held(session, "2002") + sound.rows
    two = small(session, years=(2002, 2004))
    assert weighing.masked(session, two, ALL_OF_IT) == held(session, "2002", "2004") + two.rows
    one = Taking(periods=("2004",))
    assert weighing.masked(session, two, one) == held(session, "2004") + two.rows


@pytest.mark.parametrize("gives_way", ["areas", "all"])
def test_what_touches_every_year_weighs_as_all_of_them(session: Session, gives_way: str) -> None:
    withheld(session)
    sound = small(session)
    everything = held(session) + sound.rows
    assert weighing.masked(session, sound, Taking(gives_way=gives_way)) == everything
    new = small(session, areas=["west"])
    assert weighing.masked(session, new, ALL_OF_IT) == held(session) + new.rows


def test_a_heavy_mask_is_left_to_a_worker(
    session: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    withheld(session)
    sound = small(session)
    weight = held(session, "2002") + sound.rows
    monkeypatch.setattr(weighing, "MASKED", weight)
    assert not weighing.takes_long(session, sound, ALL_OF_IT)
    monkeypatch.setattr(weighing, "MASKED", weight - 1)
    assert weighing.takes_long(session, sound, ALL_OF_IT)
