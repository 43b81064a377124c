"""The numbers of a trend."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine import indicators
from engine.ages import AgeGrid
from engine.estimates import Reason
from engine.settings import find
from server.results import series as module
from server.results.estimating import stream
from server.results.holdings import NotInEdition
from server.results.loading import load
from server.results.questions import PopulationYear, TrendQuestion
from server.results.series import Series, TooLarge, series
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import GRIDS, edition, gompertz_panel

FIVE = GRIDS["abridged"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])
YEARS = tuple(str(year) for year in range(2001, 2006))


@pytest.fixture
def isle(session: Session) -> Session:
    """North through five years, a year missing for men; the cape ends at 85+ from 2004 on."""
    panels = {}
    for seed, year in enumerate(YEARS):
        for sex in "fm":
            panel = gompertz_panel(sex=sex, people=3e6, seed=seed, level=3e-5 - 2e-6 * seed)
            panels[f"north.{sex}.{year}"] = panel
            panels[f"cape.{sex}.{year}"] = panel.regroup(SHORT) if year >= "2004" else panel
    del panels["north.m.2003"]
    edition(session, panels, provisional=("2005",))
    return session


def asked(session: Session, **choices: object) -> Series:
    given = {"areas": ("north",), "sexes": ("f",), "first": "2001", "last": "2005"} | choices
    return series(session, heading(session, "isle", 1), TrendQuestion(**given))  # type: ignore[arg-type]


def test_each_cell_is_the_estimate_of_its_population_year(isle: Session) -> None:
    found = asked(isle, areas=("cape", "north"), sexes=("f", "m"))
    assert found.lines == (("cape", "f"), ("cape", "m"), ("north", "f"), ("north", "m"))
    assert found.periods == YEARS
    assert found.estimate.value.shape == (4, 5)
    panel = gompertz_panel(people=3e6, seed=1, level=3e-5 - 2e-6)
    alone = indicators.estimate(indicators.find("e0"), panel, find("almanac-1"))
    assert_allclose(found.estimate.value[2, 1], alone.value, rtol=1e-10)  # counts are kept to 1e-6
    assert_allclose(found.estimate.low[2, 1], alone.low, rtol=1e-10)


def test_gaps_status_and_open_ages(isle: Session) -> None:
    found = asked(isle, areas=("cape", "north"), sexes=("m",))
    assert found.estimate.reason[1].tolist() == [0, 0, Reason.NOT_AVAILABLE, 0, 0]
    assert np.isnan(found.estimate.value[1, 2])
    assert found.status[1] == ("final", "final", "", "final", "provisional")
    assert found.open_ages == ((100, 100, 100, 85, 85), (100, 100, None, 100, 100))


def test_the_change_is_the_last_year_known_less_the_first(isle: Session) -> None:
    found = asked(isle, areas=("cape", "north"))
    assert found.ends == (("2001", "2005"), ("2001", "2005"))
    assert_allclose(
        found.change.value[1], found.estimate.value[1, -1] - found.estimate.value[1, 0], rtol=1e-12
    )
    assert found.change.low[1] < found.change.value[1] < found.change.high[1]
    # the cape's two ends are compared on the ages both have
    assert abs(found.change.value[0] - found.change.value[1]) < 0.5
    one = asked(isle, last="2001")
    assert one.ends == (None,)
    assert np.isnan(one.change.value[0])


@pytest.mark.parametrize("of", ["e0", "median"])
def test_changes_of_many_lines_are_those_of_each_pair_of_years(isle: Session, of: str) -> None:
    found = asked(isle, of=of, areas=("cape", "north"), sexes=("f", "m"))
    assert found.middle == ("2003", "2003", "2003", "")  # men of the north have but four years
    held = load(isle, "isle", 1, [PopulationYear(*line, y) for line in found.lines for y in YEARS])
    assert_array_equal(found.later.reason == Reason.NOT_AVAILABLE, [False, False, False, True])
    for change, row, first, last in (
        (found.change, 2, "2001", "2005"),
        (found.earlier, 1, "2001", "2003"),
        (found.later, 0, "2003", "2005"),
    ):
        this, that = (PopulationYear(*found.lines[row], year) for year in (last, first))
        panels = [held[one].panel for one in (this, that)]
        grid = panels[0].grid.common(panels[1].grid)
        alone = indicators.difference(
            indicators.find(of),
            *(panel.regroup(grid) for panel in panels),
            find("almanac-1"),
            streams=(stream("isle", this), stream("isle", that)),
        )
        for part in ("value", "low", "high", "reason"):
            assert_array_equal(getattr(change, part)[row], getattr(alone, part), err_msg=part)


def test_the_middle_is_that_of_the_years_not_of_their_number(session: Session) -> None:
    years = ("1950", "1990", "1998", "1999", "2000")
    edition(session, {f"north.f.{year}": gompertz_panel(people=3e6) for year in years})
    assert asked(session, first="1950", last="2000").middle == ("1990",)


@pytest.mark.parametrize(("first", "last"), [("2001", "2004"), ("2004", "2004"), ("2001", "2001")])
def test_a_newer_edition_is_measured_by_the_newest_figure(
    isle: Session, first: str, last: str
) -> None:
    """Also where there is one year only, and no change."""
    changed = gompertz_panel(sex="f", people=3e6, seed=70)
    edition(isle, {f"north.f.{year}": changed for year in ("2001", "2004")})
    found = asked(isle, first=first, last=last)
    assert found.headline == PopulationYear("north", "f", last)
    assert found.moved is not None
    again = series(isle, heading(isle, "isle", 2), found.question)
    assert again.moved is None
    assert_allclose(found.moved.value, again.estimate.value[0, -1], rtol=1e-13)
    assert found.moved.value != found.estimate.value[0, -1]


def test_the_newest_figure_may_be_of_an_earlier_year_than_the_last(isle: Session) -> None:
    found = asked(isle, sexes=("m",), last="2003")
    assert found.periods[-1] == "2003"
    assert found.headline == PopulationYear("north", "m", "2002")


def test_where_no_year_has_a_figure_the_last_one_asked_for_is_its_headline(isle: Session) -> None:
    edition(isle, {"north.f.2001": gompertz_panel(people=3e6, seed=70)})
    found = asked(isle, of="e3")
    assert found.headline == PopulationYear("north", "f", "2005")
    assert found.moved is not None
    assert np.isnan(found.moved.value)


def test_a_simulated_indicator_does_not_depend_on_what_else_is_asked(isle: Session) -> None:
    alone = asked(isle, of="mode", first="2002", last="2002")
    among = asked(isle, of="mode", areas=("cape", "north"), sexes=("f", "m"))
    assert alone.estimate.low[0, 0] == among.estimate.low[2, 1]


def test_what_the_edition_lacks_is_refused(isle: Session) -> None:
    with pytest.raises(NotInEdition, match="no area east"):
        asked(isle, areas=("east",))
    with pytest.raises(NotInEdition, match=r"holds nothing.*1900 to 1910.*2001 to 2005"):
        asked(isle, first="1900", last="1910")


def test_a_question_above_the_cap_is_refused_with_the_cap(
    isle: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(module, "MOST", 9)
    monkeypatch.setattr(module, "MOST_SIMULATED", 4)
    assert asked(isle).estimate.value.shape == (1, 5)
    with pytest.raises(TooLarge, match=r"asks for 10 .* at most 9"):
        asked(isle, sexes=("f", "m"))
    with pytest.raises(TooLarge, match=r"asks for 5 .* at most 4"):
        asked(isle, of="mode")


def test_as_many_statements_for_one_as_for_all(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    counts = []
    for choices in ({"last": "2002"}, {"areas": ("cape", "north"), "sexes": ("f", "m", "p")}):
        with count_statements() as statements:
            asked(isle, **choices)
        counts.append(len(statements))
    assert counts[0] == counts[1] <= 8
