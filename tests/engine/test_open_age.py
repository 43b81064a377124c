"""The implied population at the open age: counts made wrong by a known factor are found out."""

from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import run
from engine.estimates import Reason
from engine.indicators import find as find_indicator
from engine.open_age import as_implied, implied_population, judged_age
from engine.panel import Panel
from engine.settings import find
from tests.factories import gompertz_panel
from tests.published import denmark

PLAIN = find("almanac-1")
GRID = AgeGrid((0, 1, *range(5, 100, 5)))
OLD = np.array(GRID.starts) >= 90
SPAN = (np.array(GRID.starts) >= 50) & (np.array(GRID.starts) < 85)
NOBODY = Panel.of(GRID, np.zeros(len(GRID)), np.ones(len(GRID)), sex="m")


def country() -> Panel:
    """Danish men of 2004 to 2008."""
    years = denmark.panel("male")[30:35].regroup(GRID)
    return Panel.of(GRID, years.deaths.sum(axis=0), years.exposure.sum(axis=0), sex="m")


def part(share: float, *, ghosts: float = 1.0) -> Panel:
    """A part of the country with its death rates, whose population at 90 and over was handed in
    `ghosts` times too large."""
    whole = country()
    exposure = share * whole.exposure * np.where(OLD, ghosts, 1.0)
    return Panel.of(GRID, share * whole.deaths, exposure, sex="m")


def stationary(
    level: float = 2e-5, slope: float = 0.1, *, levels_off: float = 0.0, growth: float = 0.0
) -> Panel:
    """People under a law, by steps of a hundredth of a year: no two rules of the engine's."""
    x = np.arange(0.005, 140, 0.01)
    mu = level * np.exp(slope * x)
    mu = mu / (1 + levels_off * mu)
    alive = 1e4 * np.exp(-np.cumsum(mu) * 0.01 - growth * x)
    starts = [100 * start for start in GRID.starts]
    deaths, exposure = (np.add.reduceat(each, starts) for each in (alive * mu, alive))
    return Panel.of(GRID, deaths, exposure, sex="m")


@pytest.mark.fast
@pytest.mark.parametrize("ghosts", [0.8, 1.0, 1.3])
def test_a_population_handed_in_too_large_is_found(ghosts: float) -> None:
    found = implied_population(part(0.1, ghosts=ghosts), country(), PLAIN)
    assert found.age == 90
    assert found.ratio.value == pytest.approx(1 / ghosts, rel=1e-9)
    assert found.ratio.low < 1 / ghosts < found.ratio.high
    assert found.observed / found.observed_whole == pytest.approx(float(found.ratio.value))


@pytest.mark.fast
def test_a_rate_as_the_law_expects_it() -> None:
    """Under a Gompertz law both ratios are 1, and so is theirs at other levels and slopes."""
    whole = stationary()
    for area in (stationary(), stationary(level=4e-5), stationary(slope=0.105)):
        found = implied_population(area, whole, PLAIN, shared=NOBODY)
        np.testing.assert_allclose([found.observed, found.observed_whole], 1, atol=5e-3)
        assert found.ratio.value == pytest.approx(1, abs=3e-3)
        ghosts = replace(area, exposure=area.exposure * np.where(OLD, 1.3, 1.0))
        found = implied_population(ghosts, whole, PLAIN, shared=NOBODY)
        assert found.ratio.value == pytest.approx(1 / 1.3, abs=3e-3)


@pytest.mark.fast
@pytest.mark.parametrize(
    ("area", "expected"),
    [
        ({"level": 2.4e-5}, 0.99),
        ({"slope": 0.105}, 0.96),
        ({"growth": 0.03}, 0.97),
    ],
    ids=str,
)
def test_what_else_moves_it(area: dict[str, float], expected: float) -> None:
    """As the docstring says, where death rates level off at the highest ages."""
    area_differs, whole = stationary(levels_off=1.0, **area), stationary(levels_off=1.0)
    found = implied_population(area_differs, whole, PLAIN, shared=NOBODY)
    assert found.observed_whole < 0.95
    assert found.ratio.value == pytest.approx(expected, abs=0.005)


@pytest.mark.fast
@pytest.mark.parametrize("overlap", [None, 0.0, 0.5])
def test_the_standard_error_is_what_single_deaths_move(overlap: float | None) -> None:
    """var log = sum (d log ratio / d deaths)^2 D over both, by differences; shared deaths once."""
    this, that = part(0.1, ghosts=1.1), country()
    shared = None if overlap is None else replace(this, deaths=overlap * this.deaths)
    found = implied_population(this, that, PLAIN, shared=shared).ratio

    def moved(which: int) -> np.ndarray:
        step, logs = 1e-3 * (this, that)[which].deaths, []
        for sign in (1, -1):
            counts = [np.broadcast_to(one.deaths, (21, 21)).copy() for one in (this, that)]
            counts[which] += sign * np.diag(step)
            sides = (
                Panel.of(GRID, deaths, np.broadcast_to(one.exposure, (21, 21)), sex="m")
                for deaths, one in zip(counts, (this, that), strict=True)
            )
            logs.append(np.log(implied_population(*sides, PLAIN).ratio.value))
        return np.asarray((logs[0] - logs[1]) / (2 * step))

    g, h = moved(0), moved(1)
    both = this.deaths if overlap is None else overlap * this.deaths
    variance = (g**2 * this.deaths + h**2 * that.deaths + 2 * g * h * both).sum()
    assert found.se == pytest.approx(float(found.value) * np.sqrt(variance), rel=1e-4)
    assert np.log(found.high / found.value) == pytest.approx(1.959964 * np.sqrt(variance), rel=1e-4)
    assert found.low * found.high == pytest.approx(float(found.value) ** 2)


@pytest.mark.fast
@pytest.mark.parametrize("share", [0.02, 0.3])
def test_intervals_hold_what_they_say(share: float) -> None:
    """1,000 samples of an area within its whole: 95 %, and as many on either side."""
    rng, whole = np.random.default_rng(4), country()
    area = rng.poisson(share * whole.deaths, (1000, len(GRID))).astype(float)
    rest = rng.poisson((1 - share) * whole.deaths, area.shape)
    shape = area.shape
    found = implied_population(
        Panel.of(GRID, area, np.broadcast_to(share * whole.exposure, shape), sex="m"),
        Panel.of(GRID, area + rest, np.broadcast_to(whole.exposure, shape), sex="m"),
        PLAIN,
    ).ratio
    assert np.isfinite(found.value).mean() > 0.9
    known = np.isfinite(found.value)
    assert (found.low[known] > 1).mean() == pytest.approx(0.025, abs=0.015)
    assert (found.high[known] < 1).mean() == pytest.approx(0.025, abs=0.015)


@pytest.mark.fast
def test_limits_at_the_least_size_are_a_quarter_away() -> None:
    whole = country()
    exposure = np.where(OLD, 100 / whole.deaths[OLD].sum(), 1000 / whole.deaths[SPAN].sum())
    area = Panel.of(GRID, exposure * whole.deaths, exposure * whole.exposure, sex="m")
    found = implied_population(area, whole, PLAIN).ratio
    assert found.value == pytest.approx(1, rel=1e-9)
    assert found.high / found.value == pytest.approx(1.25, abs=0.06)


@pytest.mark.fast
def test_only_areas_of_some_size() -> None:
    """100 deaths at 90 and over and 1,000 from 50 to 84 are enough; one fewer is not."""
    whole = country()
    enough = np.where(OLD, 100, 1000) / np.where(
        OLD, whole.deaths[OLD].sum(), whole.deaths[SPAN].sum()
    )
    enough = enough * (1 + 1e-9)
    few_old, few_below = enough * np.where(OLD, 0.99, 1), enough * np.where(SPAN, 0.999, 1)
    factors = np.stack([enough, few_old, few_below])
    areas = Panel.of(GRID, factors * whole.deaths, factors * whole.exposure, sex="m")
    wholes = Panel.stack([whole] * 3)
    found = implied_population(areas, wholes, PLAIN)
    few = Reason.TOO_FEW_DEATHS
    assert found.ratio.reason.tolist() == [Reason.NONE, few, few]
    for told in (found.ratio.value, found.ratio.low, found.observed, found.observed_whole):
        assert np.isnan(told).tolist() == [False, True, True]
    small_wholes = implied_population(wholes, areas, PLAIN, shared=NOBODY)
    assert small_wholes.ratio.reason.tolist() == [Reason.NONE, few, few]


@pytest.mark.fast
def test_why_there_is_none() -> None:
    whole, area = country(), part(0.2)
    gap, falling = area.deaths.copy(), area.deaths.copy()
    gap[3] = np.nan
    falling[SPAN] = 0.02 * area.exposure[SPAN] * np.exp(-0.01 * np.arange(SPAN.sum()))
    areas = Panel.stack([replace(area, deaths=deaths) for deaths in (gap, falling)])
    found = implied_population(areas, Panel.stack([whole] * 2), PLAIN)
    assert found.ratio.reason.tolist() == [Reason.NOT_AVAILABLE, Reason.NO_LAW]
    low = AgeGrid((0, 1, 5, *range(20, 85, 5)))
    closed = implied_population(area.regroup(low), whole.regroup(low), PLAIN)
    assert closed.ratio.reason == Reason.AGE_NOT_ON_GRID
    same = implied_population(whole, whole, PLAIN)
    assert same.ratio.value == pytest.approx(1)
    assert same.ratio.reason == Reason.NO_SAMPLING_INTERVAL


@pytest.mark.fast
def test_what_is_refused() -> None:
    with pytest.raises(ValueError, match="the age groups differ"):
        implied_population(part(0.1), country().regroup(AgeGrid((0, 50, 85))), PLAIN)
    with pytest.raises(ValueError, match="no age group starts at 92"):
        implied_population(part(0.1), country(), PLAIN, age=92)


@pytest.mark.fast
def test_the_ages_that_are_judged() -> None:
    assert judged_age(AgeGrid((0, 50, 85, 90, 100))) == 90
    assert judged_age(AgeGrid((0, 50, 85, 100))) == 85
    assert judged_age(AgeGrid((0, 50, 80))) == 80
    ghosts = np.where(np.array(GRID.starts) >= 85, 1.25, 1.0)
    area = part(0.3)
    area = replace(area, exposure=area.exposure * ghosts)
    found = implied_population(area, country(), PLAIN, age=85)
    assert found.age == 85
    assert found.ratio.value == pytest.approx(0.8, rel=1e-9)


@pytest.mark.fast
def test_figures_with_the_population_implied() -> None:
    """They are those of the area before its population was made wrong."""
    indicators = [find_indicator(key) for key in ("e65", "H", "mode", "45q15")]
    wrong, right = part(0.2, ghosts=1.3), part(0.2)
    implied = implied_population(wrong, country(), PLAIN)
    told = as_implied(indicators, wrong, implied, PLAIN)
    for one in indicators:
        found = told[one.key]
        assert found.value == pytest.approx(float(one.value(run(right, PLAIN))), rel=1e-9)
        assert np.isnan(found.se)
        assert found.reason == Reason.NONE
        assert found.low <= found.value <= found.high
    for key in ("e65", "H"):
        as_handed = find_indicator(key).value(run(wrong, PLAIN))
        assert told[key].value < as_handed
        assert told[key].low < told[key].value < told[key].high
    ends = [replace(wrong, exposure=wrong.exposure * np.where(OLD, ratio, 1.0))
            for ratio in (implied.ratio.high, implied.ratio.low)]  # fmt: skip
    e65 = [float(find_indicator("e65").value(run(end, PLAIN))) for end in ends]
    np.testing.assert_allclose(sorted(e65), [told["e65"].low, told["e65"].high], rtol=1e-12)


@pytest.mark.fast
def test_figures_that_may_not_be_read_stay_so() -> None:
    small, large = part(0.002), part(0.2)
    areas = Panel.stack([small, large])
    implied = implied_population(areas, Panel.stack([country()] * 2), PLAIN)
    told = as_implied([find_indicator("e65"), find_indicator("e93")], areas, implied, PLAIN)
    assert told["e65"].reason.tolist() == [Reason.TOO_FEW_DEATHS, Reason.NONE]
    assert np.isnan(told["e65"].value).tolist() == [True, False]
    assert told["e93"].reason.tolist() == [Reason.TOO_FEW_DEATHS, Reason.AGE_NOT_ON_GRID]


@pytest.mark.fast
def test_each_area_for_itself() -> None:
    drawn = [gompertz_panel(GRID, seed=seed, people=2e6) for seed in range(6)]
    whole = gompertz_panel(GRID, people=2e7)
    shared = Panel.stack([NOBODY] * 6)
    together = implied_population(
        Panel.stack(drawn), Panel.stack([whole] * 6), PLAIN, shared=shared
    ).ratio
    for row, area in enumerate(drawn):
        alone = implied_population(area, whole, PLAIN, shared=NOBODY).ratio
        for name in ("value", "low", "high", "se"):
            np.testing.assert_array_equal(getattr(alone, name), getattr(together, name)[row])
