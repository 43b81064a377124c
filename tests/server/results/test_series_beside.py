"""Trends of years added up, against a larger area, and by the ages of a population of one's own."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.chain import gradient, run
from engine.estimates import Reason
from engine.indicators import find
from engine.panel import Panel
from engine.settings import find as named
from server.results.questions import TrendQuestion
from server.results.series import Series, series
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import GRIDS, edition, gompertz_panel

FIVE = GRIDS["abridged"]
PLAIN = named("almanac-1")
POOLED = "almanac-1-3-years"
YEARS = tuple(str(year) for year in range(2001, 2007))
NORMAL = 1.959963984540054
# every year the same people, other deaths; in the south others, at higher rates
NORTH = {year: gompertz_panel(people=2e6, seed=seed) for seed, year in enumerate(YEARS)}
SOUTH = {
    year: gompertz_panel(people=1e6, seed=9 + seed, level=3e-5, slope=0.098)
    for seed, year in enumerate(YEARS)
}


@pytest.fixture
def isle(session: Session) -> Session:
    """North and south through six years; the cape lacks 2003."""
    panels = {f"north.f.{year}": panel for year, panel in NORTH.items()}
    panels |= {f"south.f.{year}": panel for year, panel in SOUTH.items()}
    panels |= {f"cape.f.{year}": panel for year, panel in NORTH.items() if year != "2003"}
    parents = {"north": "isle", "south": "isle"}
    edition(session, panels, parents=parents, provisional=("2006",))
    return session


def asked(session: Session, of: str = "e0", settings: str = POOLED, **choices: object) -> Series:
    given = {"areas": ("north",), "sexes": ("f",), "first": "2001", "last": "2006"} | choices
    question = TrendQuestion(of, settings=settings, **given)  # type: ignore[arg-type]
    return series(session, heading(session, "isle", 1), question)


def counts(panels: dict[str, Panel], *years: str) -> Panel:
    """Deaths and person-years of these years, added up by hand."""
    chosen = [panels[year] for year in years]
    deaths, exposure = (
        sum(getattr(one, part) for one in chosen) for part in ("deaths", "exposure")
    )
    return Panel.of(FIVE, np.asarray(deaths), np.asarray(exposure), sex="f")


# ---- years added up ------------------------------------------------------------------------------


def test_a_figure_is_that_of_the_years_together(isle: Session) -> None:
    found = asked(isle)
    for at, period in enumerate(found.periods):
        end = YEARS.index(period)
        chain = run(counts(NORTH, *YEARS[end - 2 : end + 1]), PLAIN)
        value = float(find("e0").value(chain))
        assert_allclose(found.estimate.value[0, at], value, rtol=1e-9)


def test_years_before_which_too_few_are_held_are_left_out(isle: Session) -> None:
    assert asked(isle).periods == ("2003", "2004", "2005", "2006")
    assert asked(isle, settings="almanac-1-5-years").periods == ("2005", "2006")
    assert asked(isle, settings="almanac-1").periods == YEARS
    alone = asked(isle, first="2001", last="2002")  # none of them: they are shown as missing
    assert alone.periods == ("2001", "2002")
    assert set(alone.estimate.reason.ravel().tolist()) == {Reason.NOT_AVAILABLE}


def test_a_year_that_one_line_lacks_is_missing_from_every_span_that_holds_it(
    isle: Session,
) -> None:
    found = asked(isle, areas=("cape", "north"))
    assert found.periods == ("2003", "2004", "2005", "2006")
    lines = dict(zip([area for area, _sex in found.lines], found.estimate.reason, strict=True))
    assert lines["cape"].tolist() == [Reason.NOT_AVAILABLE] * 3 + [Reason.NONE]
    assert lines["north"].tolist() == [Reason.NONE] * 4


def test_a_span_with_a_provisional_year_is_provisional(isle: Session) -> None:
    assert asked(isle).status == (("final", "final", "final", "provisional"),)


def test_of_a_crude_rate_only_the_years_not_shared_have_chance(isle: Session) -> None:
    """Each year has the same people: 2002 and 2003 fall out of the change between the spans 2001 to
    2003 and 2002 to 2004, and what is left is the deaths of 2004 less those of 2001."""
    found = asked(isle, "cdr", first="2003", last="2004")
    years = counts(NORTH, "2001", "2002", "2003").exposure.sum()
    gone, come = (NORTH[year].deaths.sum() for year in ("2001", "2004"))
    assert_allclose(found.change.value, [(come - gone) / years], rtol=1e-7)
    assert_allclose(found.change.se, [np.sqrt(come + gone) / years], rtol=1e-7)
    apart = np.hypot(*found.estimate.se[0])
    assert found.change.se[0] < 0.6 * apart


@pytest.mark.parametrize(("first", "last"), [("2003", "2004"), ("2003", "2005"), ("2003", "2006")])
def test_deaths_of_years_that_two_spans_share_count_once(
    isle: Session, first: str, last: str
) -> None:
    """By hand: a death moves the change by g where in the later span, by h where in the earlier,
    by g - h where in both."""
    ends = [YEARS.index(period) for period in (last, first)]
    spans = [set(YEARS[end - 2 : end + 1]) for end in ends]
    panels = [counts(NORTH, *span) for span in spans]
    moves = [gradient(find("e0"), run(one, PLAIN)) / one.exposure for one in panels]
    parts = (
        (spans[0] - spans[1], moves[0]),
        (spans[1] - spans[0], -moves[1]),
        (spans[0] & spans[1], moves[0] - moves[1]),
    )
    variance = sum((move**2 * NORTH[year].deaths).sum() for years, move in parts for year in years)
    found = asked(isle, first=first, last=last)
    assert_allclose(found.change.se, [np.sqrt(variance)], rtol=1e-6)
    half = NORMAL * np.sqrt(variance)
    assert_allclose(found.change.high - found.change.low, [2 * half], rtol=0.01)


def test_halves_of_overlapping_spans_stand_beside_those_that_share_nothing(isle: Session) -> None:
    """The cape has one span only, hence no change; the north's is what it is alone."""
    alone, among = asked(isle), asked(isle, areas=("cape", "north", "south"))
    at = [area for area, _sex in among.lines].index("north")
    cape = [area for area, _sex in among.lines].index("cape")
    for part in ("value", "low", "high", "se"):
        assert getattr(among.change, part)[at] == getattr(alone.change, part)[0]
    assert among.ends[cape] is None
    assert among.change.reason[cape] == Reason.NOT_AVAILABLE


def test_what_is_simulated_draws_shared_deaths_once(isle: Session) -> None:
    """The median of two spans that share two of three years moves with them."""
    near, far = (asked(isle, "median", first="2003", last=last) for last in ("2004", "2006"))
    width = [float(one.change.high[0] - one.change.low[0]) for one in (near, far)]
    assert 0 < width[0] < 0.8 * width[1]


# ---- a larger area, a standard -------------------------------------------------------------------


@pytest.mark.parametrize("settings", ["almanac-1", POOLED])
def test_deaths_are_set_against_those_the_larger_area_expects(isle: Session, settings: str) -> None:
    found = asked(isle, "smr", settings, areas=("isle", "north", "south"), first="2004")
    own = {"north": NORTH, "south": SOUTH}
    for line, (area, _sex) in enumerate(found.lines):
        if area == "isle":
            assert set(found.estimate.reason[line].tolist()) == {Reason.NO_WHOLE}
            assert np.isnan(found.change.value[line])
            continue
        for at, period in enumerate(found.periods):
            end = YEARS.index(period)
            years = YEARS[end - named(settings).years + 1 : end + 1]
            parts = {name: counts(panels, *years) for name, panels in own.items()}
            rates = sum(one.deaths for one in parts.values()) / sum(
                one.exposure for one in parts.values()
            )
            expected = (rates * parts[area].exposure).sum()
            ratio = parts[area].deaths.sum() / expected
            assert_allclose(found.estimate.value[line, at], ratio, rtol=1e-6)


@pytest.mark.parametrize("settings", ["almanac-1", POOLED])
def test_rates_are_weighted_by_the_people_of_one_year(isle: Session, settings: str) -> None:
    """Of the one named, also where the rates are those of years added up."""
    found = asked(isle, "asr_by_south.f.2002", settings, first="2004")
    people = SOUTH["2002"].exposure
    for at, period in enumerate(found.periods):
        end = YEARS.index(period)
        own = counts(NORTH, *YEARS[end - named(settings).years + 1 : end + 1])
        by_hand = (people * own.deaths / own.exposure).sum() / people.sum()
        assert_allclose(found.estimate.value[0, at], by_hand, rtol=1e-6)


def test_a_standard_that_is_not_held_is_the_reason(isle: Session) -> None:
    found = asked(isle, "asr_by_south.m.1950", "almanac-1")
    assert set(found.estimate.reason.ravel().tolist()) == {Reason.NO_STANDARD}
