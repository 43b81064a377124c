"""What a difference is made of: whatever it is parted into, the parts add up to it."""

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine import indicators
from engine.ages import AgeGrid
from engine.chain import run
from engine.decomposition import contribution_limits
from engine.indicators import find
from engine.panel import Panel
from engine.settings import find as named
from engine.shift import PARTS
from engine.standards import STANDARDS
from server.results.cause_parts import Years
from server.results.comparison import Comparison, comparison
from server.results.explaining import Explained, Sides, decomposable, explain
from server.results.questions import ComparisonQuestion, PopulationYear
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import GRIDS, complete, edition, gompertz_panel

FIVE = GRIDS["abridged"]
PLAIN = named("almanac-1")
GROUPS = AgeGrid((0, 1, *range(5, 100, 10), 100))
THIS = complete(gompertz_panel(people=2e6, seed=1, level=2.2e-5, accidents=1e-4))
THAT = complete(gompertz_panel(people=3e6, seed=2, level=3.0e-5, infant=0.008))
SMOOTH, STEPWISE, NONE = ("asr_esp2013", "gini"), ("lower_quartile",), ("mode", "imr")


def sides(this: Panel = THIS, that: Panel = THAT, shared: Panel | None = None) -> Sides:
    return Sides(this, that, shared, (np.array("isle/this"), np.array("isle/that")), GROUPS)


def explained(of: str, finite: set[str] | None = None, between: Panel | None = None) -> Explained:
    return explain(of, {of} if finite is None else finite, sides(), between, PLAIN)


def difference(key: str) -> float:
    return float(indicators.difference(find(key), THIS, THAT, PLAIN).value)


@pytest.mark.parametrize("of", [*SMOOTH, *STEPWISE])
def test_contributions_of_the_asked_indicator_add_up_to_its_difference(of: str) -> None:
    part = explained(of).contributions[of]
    assert part.by_age.shape == (len(FIVE),)
    assert_allclose(part.difference, difference(of), rtol=1e-12)
    assert_allclose(part.by_age.sum() + part.remainder, part.difference, rtol=1e-9)
    assert np.count_nonzero(np.abs(part.by_age) > 1e-9 * abs(part.difference)) > 5


@pytest.mark.parametrize("of", [*SMOOTH, *STEPWISE])
def test_groups_hold_the_ages_in_them_and_their_limits_hold_the_groups(of: str) -> None:
    part = explained(of).contributions[of]
    starts = np.array(FIVE.starts)
    ends = (*GROUPS.starts[1:], 999)
    for at, (begin, end) in enumerate(zip(GROUPS.starts, ends, strict=True)):
        own = part.by_age[(starts >= begin) & (starts < end)].sum()
        assert_allclose(part.by_group[at], own, rtol=1e-12, atol=1e-18)
    known = np.isfinite(part.low) & np.isfinite(part.high)
    assert known.sum() >= len(GROUPS) - 2
    assert np.all((part.low <= part.by_group)[known])
    assert np.all((part.by_group <= part.high)[known])
    moved = known & (part.by_group != 0)  # beyond the quartile no age has a part
    assert moved.sum() >= 8
    assert np.all((part.low < part.high)[moved])


def test_only_of_what_is_replaced_in_an_order_the_order_is_told() -> None:
    assert np.isnan(explained("gini").contributions["gini"].order_share)
    share = explained("lower_quartile").contributions["lower_quartile"].order_share
    assert 0 < share < 1


def test_an_age_adds_its_weight_times_what_its_rate_differs_by() -> None:
    """A weighted sum of rates needs no integral. What the open group of the standard does not tell
    apart, the people's own ages in it, is no age's: it remains."""
    standard = STANDARDS["esp2013"]
    part = explained("asr_esp2013").contributions["asr_esp2013"]
    weights = np.array(standard.weights) / sum(standard.weights)
    same = [age for age in standard.starts[:-1] if FIVE.has(age)]
    assert len(same) == len(standard.starts) - 1 >= 19
    for age in same:
        here, there = (one.deaths / one.exposure for one in (THIS, THAT))
        at = FIVE.position(age)
        by_hand = weights[standard.starts.index(age)] * (here[at] - there[at])
        assert_allclose(part.by_age[at], by_hand, rtol=1e-8)


@pytest.mark.parametrize("of", NONE)
def test_some_differences_belong_to_no_age(of: str) -> None:
    assert not decomposable(find(of))
    assert explained(of).contributions == {}
    assert set(explained(of, {"e0", "H", of}).contributions) == {"e0", "H"}


def test_what_has_no_value_has_no_parts() -> None:
    found = explained("e0", finite=set())
    assert found.contributions == {}
    assert (found.path, found.unevenness, found.crude) == (None, None, None)


def test_the_two_parts_of_unevenness_are_those_of_its_logarithm() -> None:
    """H is one number over another, so ln H is a difference of two logarithms."""
    parts = explained("e0", {"H"}).unevenness
    assert parts is not None
    lost, lived, uneven = (
        [float(find(key).value(run(one, PLAIN))) for one in (THIS, THAT)]
        for key in ("edagger", "e0", "H")
    )
    mean = (uneven[0] - uneven[1]) / np.log(uneven[0] / uneven[1])
    assert_allclose(parts.first, mean * np.log(lost[0] / lost[1]), rtol=1e-9)
    assert_allclose(parts.second, -mean * np.log(lived[0] / lived[1]), rtol=1e-9)
    assert_allclose(parts.first + parts.second, difference("H"), rtol=1e-9)


def test_the_two_parts_of_the_crude_rate() -> None:
    parts = explained("e0", {"cdr"}).crude
    assert parts is not None
    rates = [one.deaths / one.exposure for one in (THIS, THAT)]
    shares = [one.exposure / one.exposure.sum() for one in (THIS, THAT)]
    older = ((shares[0] - shares[1]) * (rates[0] + rates[1]) / 2).sum()
    assert_allclose(parts.first, older, rtol=1e-12)
    crude = [one.deaths.sum() / one.exposure.sum() for one in (THIS, THAT)]
    assert_allclose(parts.first + parts.second, crude[0] - crude[1], rtol=1e-10)
    assert parts.first > 0 > parts.second  # older people, at lower rates


def test_kinds_of_change_add_up_and_their_limits_hold_them() -> None:
    kinds = explained("e0").kinds
    every = [getattr(kinds, name) for name in (*PARTS, "unexplained")]
    assert_allclose(sum(float(one.value) for one in every), difference("e0"), rtol=1e-9)
    assert_allclose(kinds.difference.value, difference("e0"), rtol=1e-12)
    for one in (*every, kinds.difference):
        assert one.low < one.value < one.high
    # the two laws differ in level, background and first year, and not in slope
    assert min(kinds.shift.low, kinds.background.low, kinds.infant.low) > 0
    assert kinds.squeeze.low < 0 < kinds.squeeze.high


def test_deaths_that_both_count_move_the_kinds_but_once() -> None:
    apart = explain("e0", {"e0"}, sides(), None, PLAIN).kinds
    whole = Panel.of(FIVE, THIS.deaths + THAT.deaths, THIS.exposure + THAT.exposure, sex="f")
    twice = explain("e0", {"e0"}, sides(THIS, whole), None, PLAIN).kinds
    once = explain("e0", {"e0"}, sides(THIS, whole, THIS), None, PLAIN).kinds
    assert once.shift.value == twice.shift.value
    assert once.shift.high - once.shift.low < 0.9 * (twice.shift.high - twice.shift.low)
    assert apart.shift.value > once.shift.value > 0


# ---- the path through the years ------------------------------------------------------------------

YEARS = ("2010", "2011", "2012", "2013")
COURSE = {  # infants gain first, the old later
    year: gompertz_panel(people=3e6, seed=seed, infant=infant, level=level)
    for year, seed, infant, level in (
        ("2010", 0, 0.02, 3e-5),
        ("2011", 1, 0.006, 3e-5),
        ("2012", 2, 0.004, 2.6e-5),
        ("2013", 3, 0.004, 2.0e-5),
    )
}


def along(of: str, *years: str) -> Explained:
    panels = [COURSE[year] for year in years]
    return explain(of, {of}, sides(panels[-1], panels[0]), Years(Panel.stack(panels), None), PLAIN)


@pytest.mark.parametrize("of", ["e0", "H"])
def test_the_path_through_the_years_sums_to_the_difference(of: str) -> None:
    found = along(of, *YEARS)
    part, path = found.contributions[of], found.path
    assert path is not None
    assert path.shape == part.by_age.shape
    assert_allclose(path.sum(), part.difference, rtol=1e-9)
    # infants gained while the old still died early, which the straight line does not know
    assert abs(path[0] - part.by_age[0]) > 1e-5 * abs(part.by_age[0])


def test_the_path_is_that_of_each_year_to_the_next() -> None:
    path, back = along("e0", *YEARS).path, along("e0", *reversed(YEARS)).path
    steps = [along("e0", *pair).contributions["e0"].by_age for pair in pairwise(YEARS)]
    assert path is not None
    assert back is not None
    assert_allclose(path, sum(steps), rtol=1e-9, atol=1e-12)
    assert_allclose(back, -path, rtol=1e-9, atol=1e-12)


def test_what_steps_counts_births_or_has_no_value_between_has_no_path() -> None:
    assert along("lower_quartile", *YEARS).path is None
    births = [complete(COURSE[year]) for year in YEARS]
    ends = sides(births[-1], births[0])
    assert explain("imr", {"imr"}, ends, Years(Panel.stack(births), None), PLAIN).path is None
    gone = replace(COURSE["2011"], deaths=np.full(len(FIVE), np.nan))
    between = Years(Panel.stack([COURSE["2010"], gone, COURSE["2013"]]), None)
    ends = sides(COURSE["2013"], COURSE["2010"])
    assert explain("e0", {"e0"}, ends, between, PLAIN).path is None


@pytest.fixture
def isle(session: Session, monkeypatch: pytest.MonkeyPatch) -> Session:
    """Women of the north through four years; men lack one, the cape has coarser groups in one."""
    monkeypatch.setattr("server.results.compared.COMPARED", ("e0",))  # no other figure is read
    panels = {f"{who}.{year}": COURSE[year] for year in YEARS for who in ("north.f", "cape.f")}
    panels |= {f"north.m.{year}": as_men(COURSE[year]) for year in YEARS if year != "2011"}
    panels["north.f.2014"] = COURSE["2013"]
    panels["cape.f.2012"] = panels["cape.f.2012"].regroup(AgeGrid(FIVE.starts[:-4]))
    edition(session, panels)
    return session


def as_men(women: Panel) -> Panel:
    return Panel.of(women.grid, women.deaths, women.exposure, sex="m")


def compared(
    session: Session, this: str, that: str, settings: str = "almanac-1", of: str = "e0"
) -> Comparison:
    both = (PopulationYear.parse(this), PopulationYear.parse(that))
    question = ComparisonQuestion(*both, of, settings=settings)
    return comparison(session, heading(session, "isle", 1), question)


def test_years_between_are_those_that_the_edition_holds(isle: Session) -> None:
    found = compared(isle, "north.f.2013", "north.f.2010")
    path = along("e0", *YEARS).path
    assert found.explained.path is not None
    assert path is not None
    assert_allclose(found.explained.path, path, rtol=1e-6, atol=1e-9)  # counts are kept to 1e-6
    back = compared(isle, "north.f.2010", "north.f.2013").explained.path
    assert back is not None
    assert_allclose(back, -path, rtol=1e-6, atol=1e-9)


@pytest.mark.parametrize(
    ("this", "that", "settings"),
    [
        ("north.f.2011", "north.f.2010", "almanac-1"),  # no year between
        ("north.f.2013", "north.m.2010", "almanac-1"),  # two sexes
        ("north.f.2013", "cape.f.2010", "almanac-1"),  # two areas
        ("north.m.2013", "north.m.2010", "almanac-1"),  # a year is not held
        ("cape.f.2013", "cape.f.2010", "almanac-1"),  # a year in coarser groups
        ("north.f.2014", "north.f.2012", "almanac-1-3-years"),  # years added up
        ("north.f.2013", "north.f.2013", "almanac-1"),
    ],
)
def test_without_all_years_of_one_people_there_is_no_path(
    isle: Session, this: str, that: str, settings: str
) -> None:
    assert compared(isle, this, that, settings).explained.path is None


def test_deaths_counted_in_both_cancel_as_they_were_counted() -> None:
    """A part with deaths shared out, and the whole of it and a rest: the limits of contributions
    are those of as many deaths counted."""
    part = replace(THIS, counted=THIS.deaths / 4)
    whole = complete(Panel.pooled([part, THAT]))
    found = explain("e0", {"e0"}, sides(part, whole, part), None, PLAIN).contributions["e0"]
    limits = contribution_limits(
        find("e0"), part, whole, PLAIN, shared=THIS.deaths / 4, groups=GROUPS
    )
    assert_allclose((found.low, found.high), limits, rtol=1e-12)
