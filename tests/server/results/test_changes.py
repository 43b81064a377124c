"""What differs between two editions, against the editions themselves."""

from collections.abc import Callable
from contextlib import AbstractContextManager
from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy.orm import Session

from engine import indicators
from engine import settings as named
from engine.ages import AgeGrid
from engine.panel import Panel
from server.results.changes import Altered, Changes, ChangesQuestion, found_changes, yearly
from server.results.headlines import reached
from server.results.holdings import NotInEdition
from server.results.keys import BadValue, PopulationYear
from server.results.loading import load
from server.store.errors import Missing
from server.store.heading import heading
from server.store.records import Area, Cause, Key
from tests.factories import cells, edition, gompertz_panel

YEARS = ("2012", "2013", "2014")
PARENTS = {"north": "isle", "cape": "isle"}


def counted(sex: str = "f", level: float = 2.6e-5) -> Panel:
    """Numbers that the store keeps as they are, so that sums of them stay as they were."""
    return gompertz_panel(sex=sex, level=level).over(lambda array: np.round(array, 3))


def panels(**levels: float) -> dict[str, Panel]:
    return {
        f"{area}.{sex}.{year}": counted(
            sex, levels.get(area, 2.6e-5) * (1.3 if sex == "m" else 1.0)
        )
        for area in PARENTS
        for sex in "fm"
        for year in YEARS
    }


@pytest.fixture
def isle(session: Session) -> Session:
    """Edition 1 with a provisional year; edition 2 makes it final and revises men of 2013."""
    edition(session, panels(), parents=PARENTS, provisional=("2014",))
    revised = {name: one for name, one in panels().items() if name.endswith("2014")}
    revised["north.m.2013"] = counted("m", 3.1e-5)
    revised["cape.m.2013"] = counted("m", 3.3e-5)
    edition(session, revised)
    return session


def changes(session: Session, number: int = 2, **said: object) -> Changes:
    question = ChangesQuestion(**said)  # type: ignore[arg-type]
    return found_changes(session, heading(session, "isle", number), question)


def test_counts_and_statuses_are_told_apart(isle: Session) -> None:
    found = changes(isle)
    assert {one.key.period for one in found.numbers} == {"2013"}
    assert {one.key.sex for one in found.numbers} == {"m", "p"}
    assert {one.kind for one in found.altered} == {"numbers", "marks"}
    assert {one.key.period for one in found.statuses} == {"2014"}
    assert all(one.then and one.then.status == "provisional" for one in found.statuses)
    (one,) = (one for one in found.numbers if one.key == Key("north", "m", "2013", "deaths"))
    at = PopulationYear("north", "m", "2013")
    old, new = (load(isle, "isle", number, [at])[at].panel.deaths for number in (1, 2))
    assert (one.before, one.after) == (old.sum(), new.sum())
    assert one.ages == int((old != new).sum())


def test_every_headline_that_moves_is_there_largest_first(isle: Session) -> None:
    """Against each edition's own figures of every area, sex and year."""
    found = changes(isle)
    everyone = [
        PopulationYear(area, sex, year)
        for area in ("isle", *PARENTS)
        for sex in "fmp"
        for year in YEARS
    ]
    sides = [load(isle, "isle", number, everyone) for number in (1, 2)]
    e0 = indicators.find("e0")
    wanted = {}
    for one in everyone:
        before, after = (
            float(indicators.estimate(e0, side[one].panel, named.find("almanac-1")).value)
            for side in sides
        )
        if before != after:
            wanted[one] = after - before
    moves = found.moves("e0")
    assert {one.of: one.move for one in moves} == pytest.approx(wanted, abs=1e-12)
    sizes = [abs(one.move) for one in moves]
    assert sizes == sorted(sizes, reverse=True)
    assert len(found.moves("H")) == len(moves)


def test_the_other_way_round_every_sign_is_turned(isle: Session) -> None:
    there, back = changes(isle), changes(isle, 1, since=2)
    assert {one.of: one.move for one in back.moves("e0")} == {
        one.of: -one.move for one in there.moves("e0")
    }


def test_pooled_years_move_with_any_of_them(isle: Session) -> None:
    edition(isle, {"north.m.2012": counted("m", 3.2e-5)})
    found = changes(isle, 3, settings="almanac-1-3-years")
    assert {one.key.period for one in found.altered} == {"2012"}
    assert {one.of.period for one in found.moves("e0")} == {"2014"}


def test_a_rate_that_is_borrowed_reaches_the_parts() -> None:
    trees = ((Area("isle", ""), Area("north", "", "isle")),) * 2
    key = [Key("isle", "f", "2014", "deaths")]
    plain, borrowing = (
        reached(key, trees, named.find(one)) for one in ("almanac-1", "almanac-1-borrow")
    )
    assert {one.area for one in plain} == {"isle"}
    assert {one.area for one in borrowing} == {"isle", "north"}
    assert {one.sex for one in plain} == {"f", "p"}


def test_areas_and_years_that_are_new_are_named(isle: Session) -> None:
    edition(isle, {"rock.f.2015": counted()})
    found = changes(isle, 3)
    assert [(then, now and now.code) for then, now in found.areas] == [(None, "rock")]
    assert {one.kind for one in found.numbers} == {"added"}
    assert found.periods[1] - found.periods[0] == {"2015"}
    (one,) = found.moves("e0")
    assert np.isnan(one.before)


def test_the_statements_do_not_grow(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    with count_statements() as few:
        changes(isle)
    edition(isle, panels(north=2.2e-5, cape=2.3e-5))
    with count_statements() as many:
        found = changes(isle, 3)
    assert len(found.numbers) > 20
    assert len(many) == len(few) <= 14


def test_what_cannot_be_set_side_by_side_is_refused(isle: Session) -> None:
    with pytest.raises(NotInEdition, match="built on no earlier one"):
        changes(isle, 1)
    with pytest.raises(BadValue, match="against itself"):
        changes(isle, 2, since=2)
    with pytest.raises(Missing, match="There is no edition 7"):
        changes(isle, 2, since=7)
    for text in ("0", "x", "-1", "9" * 12):
        with pytest.raises(BadValue, match="number of an edition"):
            ChangesQuestion.parse([("since", text)])


def test_a_gap_on_both_sides_is_no_change_and_one_on_either_is() -> None:
    (key,), (cell,) = zip(*cells("a", sexes="f", measures=("deaths",)).items(), strict=True)
    sides = [
        replace(cell, values=np.array(values))
        for values in ((1.0, np.nan, 3.0, np.nan), (1.0, np.nan, 4.0, 5.0))
    ]
    one = Altered(key, *sides)
    assert (one.kind, one.ages) == ("numbers", 2)
    assert Altered(key, sides[0], sides[0]).kind == "marks"
    assert (Altered(key, None, cell).kind, Altered(key, cell, None).ages) == ("added", 4)
    coarser = replace(cell, grid=AgeGrid((0, 5)), values=np.array([3.0, 7.0]))
    assert (Altered(key, cell, coarser).kind, Altered(key, cell, coarser).ages) == ("groups", 2)


def test_a_year_is_counted_once_whatever_levels_hold_it() -> None:
    parts = cells("ab", years=(2001,))
    persons = {
        key._replace(area="w", sex="p"): replace(cell, values=cell.values * 4)
        for key, cell in parts.items()
        if key.area == "a" and key.sex == "f"
    }
    flat = (Area("a", ""), Area("b", ""))
    tree = (Area("w", ""), Area("a", "", "w"), Area("b", "", "w"))
    (plain,) = yearly({}, parts, flat, ())
    total = sum(cell.values.sum() for key, cell in parts.items() if key.measure == "deaths")
    assert plain.deaths == (pytest.approx(np.nan, nan_ok=True), total)
    (held,) = yearly(parts, parts | persons, tree, flat)
    whole = persons[Key("w", "p", "2001", "deaths")].values.sum()
    assert held.deaths == (total, whole)


HEARTS, LUNGS = Cause("heart", "Hearts"), Cause("lungs", "Lungs")


def test_deaths_by_cause_are_told_apart_from_those_of_all_causes(session: Session) -> None:
    women = counted()
    hearts = {"north.f.2012": {"heart": 0.5 * women.deaths}}
    handed = {"north.f.2012": women, "north.f.2013": women}
    edition(session, handed, causes=(HEARTS,), by_cause=hearts)
    moved = {"heart": 0.5 * women.deaths, "lungs": 0.25 * women.deaths}
    once = {"north.f.2012": women}
    edition(session, once, causes=(HEARTS, LUNGS), by_cause={"north.f.2012": moved})
    edition(session, handed)
    second, third = changes(session, 2), changes(session, 3)
    assert (second.altered, second.moved) == ((), ())
    of = {(one.key.cause, one.key.period): one.kind for one in second.by_cause}
    assert of == {("lungs", "2012"): "added"}
    assert second.causes == (HEARTS, LUNGS)
    assert third.altered == ()
    gone = {(one.key.cause, one.kind) for one in third.by_cause}
    assert gone == {("heart", "dropped"), ("lungs", "dropped")}
