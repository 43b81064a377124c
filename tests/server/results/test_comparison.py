"""The explained difference between two population-years."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine import indicators
from engine.ages import AgeGrid
from engine.decomposition import contribution_limits
from engine.estimates import Estimate, Reason
from engine.panel import Panel
from engine.settings import find
from server.accounts.viewer import LOCAL
from server.actions.set_policy import set_policy
from server.results.comparison import Comparison, comparison
from server.results.estimating import stream
from server.results.holdings import NotInEdition
from server.results.loading import Shared
from server.results.questions import ComparisonQuestion, PopulationYear
from server.store.connect import Session
from server.store.heading import heading
from server.store.records import Area, Terms
from tests.factories import (
    GRIDS,
    NOON,
    cells,
    edition,
    gompertz_panel,
    stored_collection,
    stored_edition,
)

FIVE = GRIDS["abridged"]
PLAIN = find("almanac-1")
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])


def asked(
    session: Session,
    this: str,
    that: str,
    *,
    number: int = 1,
    of: str = "e0",
    settings: str = "almanac-1",
) -> Comparison:
    sides = PopulationYear.parse(this), PopulationYear.parse(that)
    question = ComparisonQuestion(*sides, of, settings=settings)
    return comparison(session, heading(session, "isle", number), question)


@pytest.fixture
def isle(session: Session) -> Session:
    panels = {}
    for seed, year in enumerate(("2004", "2014")):
        for sex in "fm":
            level = 3e-5 if year == "2004" else 2.4e-5
            panels[f"north.{sex}.{year}"] = gompertz_panel(
                sex=sex, people=3e6, seed=seed, level=level
            )
            panels[f"south.{sex}.{year}"] = gompertz_panel(
                sex=sex, people=3e6, seed=seed + 9, level=level
            )
    panels["cape.f.2014"] = gompertz_panel(seed=3, people=30_000).regroup(SHORT)
    edition(session, panels, parents={"north": "isle", "south": "isle"})
    return session


def test_contributions_add_up_to_the_difference(isle: Session) -> None:
    found = asked(isle, "north.f.2014", "north.f.2004")
    for key in ("e0", "H"):
        part, difference = found.explained.contributions[key], found.difference[key]
        assert_allclose(part.by_age.sum() + part.remainder, difference.value, rtol=1e-12)
        assert_allclose(part.difference, difference.value, rtol=1e-12)
        assert abs(part.remainder) < 1e-9
        assert np.all(part.low <= part.high)
    assert_allclose(found.arriaga.sum(), found.difference["e0"].value, rtol=1e-10)
    assert (found.grid, found.regrouped, found.overlap) == (FIVE, (), None)


def test_exchanging_the_two_turns_the_sign(isle: Session) -> None:
    there, back = (
        asked(isle, *pair)
        for pair in (("north.f.2014", "north.m.2004"), ("north.m.2004", "north.f.2014"))
    )
    for key in ("e0", "H", "edagger"):
        assert_allclose(there.difference[key].value, -back.difference[key].value)
        assert_allclose(there.difference[key].low, -back.difference[key].high)


def test_two_open_ages_are_brought_to_one_and_named(isle: Session) -> None:
    found = asked(isle, "cape.f.2014", "north.f.2014")
    assert found.grid == SHORT
    assert [one.of.code for one in found.regrouped] == ["north.f.2014"]
    assert set(found.explained.contributions) == {"e0"}
    assert found.difference["H"].reason == Reason.OPEN_GROUP_TOO_LARGE


def test_deaths_counted_in_both_are_counted_once(isle: Session) -> None:
    part = asked(isle, "north.f.2014", "isle.f.2014")
    rest = asked(isle, "north.f.2014", "south.f.2014")
    assert part.overlap == Shared("north", "f", ("2014",))
    width = part.difference["e0"].high - part.difference["e0"].low
    apart = sum(
        ((side.estimates["e0"].high - side.estimates["e0"].low) / 2) ** 2
        for side in (part.this, part.that)
    )
    # the whole is about half north: the difference is about half of that between the two parts
    assert width / 2 < 0.85 * np.sqrt(apart)
    half = (rest.difference["e0"].high - rest.difference["e0"].low) / 2
    assert_allclose(width, half, rtol=0.1)


def test_limits_are_those_of_both_sides_streams_with_shared_deaths_drawn_once(
    isle: Session,
) -> None:
    """Also those of the contributions; what is simulated goes by the codes of the two."""
    found = asked(isle, "north.f.2014", "isle.f.2014")
    this, that = found.this.panel, found.that.panel
    streams = stream("isle", found.this.of), stream("isle", found.that.of)
    median = indicators.difference(
        indicators.find("median"), this, that, PLAIN, shared=this, streams=streams
    )
    assert (found.difference["median"].low, found.difference["median"].high) == (
        median.low,
        median.high,
    )
    for key in ("e0", "H"):
        low, high = contribution_limits(
            indicators.find(key),
            this,
            that,
            PLAIN,
            streams=streams,
            shared=this.deaths,
            groups=found.groups,
        )
        assert_array_equal(found.explained.contributions[key].low, low)
        assert_array_equal(found.explained.contributions[key].high, high)


def test_what_both_count_is_brought_to_the_same_ages(session: Session) -> None:
    """Women of the north, counted in coarser groups than either side, are part of both."""
    women, men = (gompertz_panel(sex=sex, people=3e6, seed=1) for sex in "fm")
    panels = {
        "north.f.2014": women.regroup(SHORT),
        "north.p.2014": Panel.persons(women, men),
        "isle.f.2014": gompertz_panel(sex="f", people=9e6, seed=2),
    }
    edition(session, panels, parents={"north": "isle"}, delivered=("isle",))
    found = asked(session, "isle.f.2014", "north.p.2014")
    assert found.overlap == Shared("north", "f", ("2014",))
    assert found.grid == SHORT
    assert len(found.regrouped) == 2
    assert found.difference["e0"].reason == Reason.NONE


def test_what_both_count_may_not_be_held(session: Session) -> None:
    """Then the two are taken as apart, which makes the interval too wide, and nothing is said."""
    panels = {
        "north.p.2014": gompertz_panel(sex="p", people=3e6, seed=1),
        "isle.f.2014": gompertz_panel(sex="f", people=9e6, seed=2),
    }
    edition(session, panels, parents={"north": "isle"}, delivered=("isle",))
    found = asked(session, "isle.f.2014", "north.p.2014")
    assert found.overlap is None
    apart = np.hypot(*(float(side.estimates["e0"].se) for side in (found.this, found.that)))
    assert_allclose(found.difference["e0"].se, apart, rtol=1e-12)


def test_an_area_that_is_its_whole_differs_by_nothing(session: Session) -> None:
    panels = {f"north.{sex}.2014": gompertz_panel(sex=sex, people=3e6) for sex in "fm"}
    edition(session, panels, parents={"north": "isle"})
    found = asked(session, "north.f.2014", "isle.f.2014")
    for key, difference in _known(found).items():
        assert difference.value == 0, key
        assert difference.reason == Reason.NO_SAMPLING_INTERVAL, key


def _known(found: Comparison) -> dict[str, Estimate]:
    """Those of which both sides hold all that they need: births were not handed in."""
    known = {key: one for key, one in found.difference.items() if one.reason != Reason.NO_BIRTHS}
    assert len(known) > 30
    return known


def test_contributions_through_a_law_stand_on_the_grid_of_the_counts(isle: Session) -> None:
    found = asked(isle, "north.f.2014", "cape.f.2014", settings="almanac-1-kannisto")
    assert found.grid == SHORT
    assert len(found.this.table.grid) > len(found.grid)
    assert abs(found.arriaga[-1]) > 0.01
    assert (
        found.arriaga.shape
        == found.explained.contributions["e0"].by_age.shape
        == (len(found.grid),)
    )
    assert_allclose(found.arriaga.sum(), found.difference["e0"].value, rtol=1e-10)


def test_deaths_without_person_years_are_refused(session: Session) -> None:
    stored_collection(session, "isle")
    stored_edition(session, cells(years=(2014,), measures=("deaths",)), collection="isle")
    with pytest.raises(NotInEdition, match=r"does not hold a\.f\.2014, or not both its deaths and"):
        asked(session, "a.f.2014", "a.m.2014")


def test_the_same_on_both_sides_differs_by_nothing_and_chance_has_no_part(isle: Session) -> None:
    found = asked(isle, "north.f.2014", "north.f.2014")
    assert found.same
    for key, difference in _known(found).items():
        assert difference.value == 0, key
        assert difference.reason == Reason.NO_SAMPLING_INTERVAL, key
        assert np.isnan(difference.low), key
    assert_array_equal(found.explained.contributions["e0"].by_age, 0)


def test_an_indicator_asked_for_joins_the_usual_ones(isle: Session) -> None:
    assert "e80" in asked(isle, "north.f.2014", "north.f.2004", of="e80").difference


def test_where_counts_are_withheld_a_newer_edition_moves_the_headline_as_it_is_given(
    session: Session,
) -> None:
    """To the same decimals, or the page tells of a move that is rounding alone."""
    panels = {
        f"north.f.{year}": gompertz_panel(people=2e5, seed=seed, level=level)
        for seed, (year, level) in enumerate((("2004", 3e-5), ("2014", 2e-5)))
    }
    edition(session, panels)
    terms = Terms(threshold=5)
    set_policy(session, collection="isle", terms=terms, note="Few.", by=LOCAL, now=NOON)
    edition(session, {"north.f.2014": gompertz_panel(people=2e5, seed=5, level=1.9e-5)})
    before = asked(session, "north.f.2014", "north.f.2004")
    after = asked(session, "north.f.2014", "north.f.2004", number=2)
    assert after.this.loaded.protected
    assert before.moved is not None
    assert before.moved.value == after.difference["e0"].value


def test_a_newer_edition_moves_the_headline_by_what_it_says(isle: Session) -> None:
    assert asked(isle, "north.f.2014", "north.f.2004").moved is None
    edition(isle, {"north.f.2014": gompertz_panel(people=3e6, seed=1, level=2.5e-5)})
    before = asked(isle, "north.f.2014", "north.f.2004")
    after = asked(isle, "north.f.2014", "north.f.2004", number=2)
    assert before.moved is not None
    assert before.moved.number == 2
    assert_allclose(before.moved.value, after.difference["e0"].value, rtol=1e-13)
    assert before.moved.value < before.difference["e0"].value
    assert after.moved is None


def test_a_newer_edition_may_lack_a_side(isle: Session) -> None:
    stored_edition(
        isle,
        cells(("north",), years=(2014,)),
        collection="isle",
        areas=(Area("north", "North"),),
        replace=True,
    )
    found = asked(isle, "north.f.2014", "north.f.2004")
    assert found.moved is not None
    assert np.isnan(found.moved.value)


def test_what_the_edition_lacks_is_refused(isle: Session) -> None:
    with pytest.raises(NotInEdition, match=r"does not hold north\.f\.1950"):
        asked(isle, "north.f.2014", "north.f.1950")


def test_eight_statements_at_most(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    edition(isle, {"north.f.2014": gompertz_panel(people=3e6, seed=1, level=2.5e-5)})
    with count_statements() as statements:
        asked(isle, "north.f.2014", "isle.p.2014")
    assert len(statements) <= 8
