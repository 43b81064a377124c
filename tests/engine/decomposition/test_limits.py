"""Limits of contributions: against other ways to the same, and how often they hold the truth."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.special import ndtri

from engine.ages import AgeGrid, Array
from engine.chain import Chain
from engine.decomposition import (
    contribution_limits,
    contributions,
    contributions_by_cause,
    stepwise,
)
from engine.indicators import INDICATORS, difference
from engine.panel import Panel
from engine.settings import find
from tests.engine.decomposition.pairs import PAIRS, PLAIN, Pair
from tests.factories import GRIDS, codes, gompertz_panel


def both(panel: Panel) -> tuple[NDArray[np.str_], NDArray[np.str_]]:
    """Codes of the two sides of a comparison."""
    return codes(panel, "this"), codes(panel, "that")


def many(panel: Panel) -> Panel:
    """So many people that limits lie evenly, at z standard errors."""
    return replace(panel, deaths=1e8 * panel.deaths, exposure=1e8 * panel.exposure)


def large(pair: Pair) -> Pair:
    return Pair(many(pair.this), many(pair.that))


def copies(panel: Panel, times: int) -> Panel:
    return panel.over(lambda array: np.broadcast_to(array, (times, array.shape[-1])))


def standard_errors(key: str, pair: Pair, settings) -> Array:
    """By brute force: every count of each side moved a little up and down, one by one."""
    ages = len(pair.this.grid)
    variance = np.zeros(ages)
    for side in (0, 1):
        sides = [copies(panel, ages) for panel in (pair.this, pair.that)]
        counted = sides[side].deaths
        aside = 1e-4 * counted * np.eye(ages)
        moved = []
        for sign in (1, -1):
            sides[side] = replace(sides[side], deaths=counted + sign * aside)
            moved.append(contributions(INDICATORS[key], *sides, settings).by_age)
        step = 2 * np.diag(aside)[:, None]
        slope = np.where(step > 0, (moved[0] - moved[1]) / np.where(step > 0, step, 1), 0)
        variance += (slope**2 * counted[0][:, None]).sum(axis=0)
    return np.sqrt(variance)


def widths(limits) -> Array:
    return (limits.high - limits.low) / (2 * ndtri(0.975))


@pytest.mark.fast
@pytest.mark.parametrize("key", ["e0", "H", "edagger", "ageing_rate"])
@pytest.mark.parametrize("name", [name for name in PAIRS if name != "far apart"])
def test_the_standard_error_is_that_of_every_count_moved_by_itself(name: str, key: str) -> None:
    pair = large(PAIRS[name])
    found = widths(contribution_limits(INDICATORS[key], pair.this, pair.that, PLAIN))
    expected = standard_errors(key, pair, PLAIN)
    read = expected > 1e-6 * expected.max()
    np.testing.assert_allclose(found[read], expected[read], rtol=0.005)
    assert np.isnan(found[~read]).all()


@pytest.mark.fast
@pytest.mark.parametrize("empty", [(1, 0), (0, 1), (1, 1)])
def test_the_standard_error_where_groups_are_joined(empty: tuple[int, int]) -> None:
    """Nobody counted at 85-89: deaths there and at 80-84 move the rates of both ages."""
    laws = (gompertz_panel(level=level, slope=0.09) for level in (2e-5, 3e-5))
    pair = large(Pair(*laws))
    for panel, is_empty in zip((pair.this, pair.that), empty, strict=True):
        panel.exposure[18] *= 1 - is_empty
    found = widths(contribution_limits(INDICATORS["e0"], pair.this, pair.that, PLAIN))
    np.testing.assert_allclose(found, standard_errors("e0", pair, PLAIN), rtol=0.02)


@pytest.mark.fast
@pytest.mark.parametrize(
    "settings", ["almanac-1-gompertz", "almanac-1-keyfitz", "almanac-1-constant-rate"]
)
def test_the_standard_error_under_other_chains(settings: str) -> None:
    pair, chain = large(PAIRS["Danish men 1974 to 2012"]), find(settings)
    for key in ("e0", "H"):
        found = widths(contribution_limits(INDICATORS[key], pair.this, pair.that, chain))
        expected = standard_errors(key, pair, chain)
        read = expected > 1e-6 * expected.max()
        np.testing.assert_allclose(found[read], expected[read], rtol=0.02)


@pytest.mark.fast
@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-population-2"])
@pytest.mark.parametrize("key", ["e0", "H", "40q30"])
def test_limits_of_all_ages_together_are_those_of_the_difference(key: str, settings: str) -> None:
    """An error of the population, too: all that is left where there is hardly any chance."""
    pair, chain = large(PAIRS["Danish men 1974 to 2012"]), find(settings)
    one = AgeGrid((0,))
    found = contribution_limits(INDICATORS[key], pair.this, pair.that, chain, groups=one)
    expected = difference(INDICATORS[key], pair.this, pair.that, chain)
    assert found.low.shape == (1,)
    np.testing.assert_allclose(widths(found)[0], widths(expected), rtol=1e-3)
    np.testing.assert_allclose(
        found.low[0] + found.high[0], expected.low + expected.high, rtol=1e-6
    )


@pytest.mark.fast
def test_no_death_moves_a_borrowed_rate() -> None:
    """It is taken as known, so it is all one how many people there are at these ages."""
    grid, settings = AgeGrid((0, 1, *range(5, 86, 5))), find("almanac-1-borrow")
    whole = gompertz_panel(people=2e6).regroup(grid)
    this, that = (
        replace(gompertz_panel(people=people).regroup(grid), whole=whole) for people in (5e3, 1e5)
    )
    this.deaths[-1] = 0
    fewer = replace(this, exposure=np.append(this.exposure[:-1], this.exposure[-1] / 10))
    for pair in ((this, that), (that, this)):
        found = contribution_limits(INDICATORS["e0"], *pair, settings)
        beside = (fewer if one is this else one for one in pair)
        expected = contribution_limits(INDICATORS["e0"], *beside, settings)
        np.testing.assert_allclose(found.low, expected.low, rtol=1e-9)
        np.testing.assert_allclose(found.high, expected.high, rtol=1e-9)


@pytest.mark.fast
def test_limits_count_shared_deaths_once() -> None:
    """Against a whole it is part of; taken as independent, the interval would be too wide."""
    part = many(gompertz_panel(seed=11, people=3e6, level=2e-5, slope=0.095))
    rest = many(gompertz_panel(seed=12, people=1e6, level=4e-5, slope=0.095))
    whole = replace(part, deaths=part.deaths + rest.deaths, exposure=part.exposure + rest.exposure)
    one = AgeGrid((0,))

    def width(shared: Array | None) -> float:
        return float(
            widths(
                contribution_limits(INDICATORS["e0"], part, whole, PLAIN, shared=shared, groups=one)
            )[0]
        )

    expected = difference(INDICATORS["e0"], part, whole, PLAIN, shared=part)
    assert width(part.deaths) == pytest.approx(float(widths(expected)), rel=1e-3)
    assert width(None) > 1.5 * width(part.deaths)


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS)
def test_limits_of_groups_are_those_of_their_sums(grid: str) -> None:
    """By brute force: the sums of simulated contributions, many times drawn."""
    this, that = (
        gompertz_panel(GRIDS[grid], seed=seed, people=3e7, level=level)
        for seed, level in ((5, 2e-5), (6, 3e-5))
    )
    groups = AgeGrid((0, 40, 60, 80))
    found = widths(contribution_limits(INDICATORS["H"], this, that, PLAIN, groups=groups))
    rng = np.random.default_rng(7)
    drawn = [
        replace(copies(side, 700), deaths=rng.poisson(side.deaths, (700, len(side.grid))) * 1.0)
        for side in (this, that)
    ]
    sums = this.grid.regroup(contributions(INDICATORS["H"], *drawn, PLAIN).by_age, groups)
    np.testing.assert_allclose(found, sums.std(axis=0), rtol=0.1)


@pytest.mark.fast
@pytest.mark.parametrize("key", ["e0", "H"])
def test_limits_hold_the_truth_as_often_as_they_say(key: str) -> None:
    """Contributions between two known laws, at ages with at least 30 deaths on either side."""
    this = gompertz_panel(level=2e-5, infant=0.004, people=2e5)
    that = gompertz_panel(level=3.2e-5, slope=0.097, infant=0.012, people=2e5)
    truth = contributions(INDICATORS[key], this, that, PLAIN).by_age
    rng, times = np.random.default_rng(3), 600
    drawn = [
        replace(copies(side, times), deaths=rng.poisson(side.deaths, (times, 22)) * 1.0)
        for side in (this, that)
    ]
    limits = contribution_limits(INDICATORS[key], *drawn, PLAIN)
    held = ((limits.low <= truth) & (truth <= limits.high)).mean(axis=0)
    enough = np.minimum(this.deaths, that.deaths) >= 30
    assert 10 <= enough.sum() <= 12
    assert 0.935 < held[enough].mean() < 0.965
    assert 0.93 < held[~enough].mean() < 0.975  # of few deaths, rather too wide
    assert held.min() > 0.91
    below, above = (truth < limits.low).mean(axis=0), (truth > limits.high).mean(axis=0)
    assert abs(below[enough].mean() - above[enough].mean()) < 0.015


@pytest.mark.fast
@pytest.mark.parametrize("key", ["H", "median"])
def test_limits_do_not_depend_on_what_else_is_drawn(key: str) -> None:
    this = gompertz_panel(seed=7, level=np.array([2e-5, 3e-5, 4e-5]))
    that = gompertz_panel(seed=8, level=np.array([3e-5, 3e-5, 3e-5]))
    names = both(this)
    low, high = contribution_limits(INDICATORS[key], this, that, PLAIN, streams=names, draws=50)
    for row in range(3):
        alone = contribution_limits(
            INDICATORS[key],
            this[row],
            that[row],
            PLAIN,
            streams=(names[0][row], names[1][row]),
            draws=50,
        )
        np.testing.assert_array_equal(alone.low, low[row])
        np.testing.assert_array_equal(alone.high, high[row])


def split(pair: Pair, shares: tuple[float, float, float]) -> tuple[Array, Array]:
    """Deaths by three causes, whose shares change with age and differ between the two."""
    ages = np.linspace(0, 1, len(pair.this.grid))
    weights = np.stack([1 - ages, ages, 0.2 + ages * (1 - ages)])
    first, second = weights, weights * np.array(shares)[:, None]
    return (
        pair.this.deaths * first / first.sum(axis=0),
        pair.that.deaths * second / second.sum(axis=0),
    )


def cause_errors(key: str, pair: Pair, causes: tuple[Array, Array], shared: Array) -> Array:
    """By brute force: every count of a cause and an age moved a little, those of both in both."""
    own = [side - shared for side in causes]
    base = np.zeros_like(shared)

    def by_cause(ours: Array, theirs: Array) -> Array:
        sides = [
            replace(copies(panel, len(ours)), deaths=side.sum(axis=-2))
            for panel, side in zip((pair.this, pair.that), (ours, theirs), strict=True)
        ]
        return contributions_by_cause(
            INDICATORS[key], *sides, PLAIN, causes=(ours, theirs)
        ).by_cause

    variance = base.copy()
    cells = np.eye(base.size).reshape(-1, *base.shape)
    for counted, moves in ((own[0], (1, 0)), (own[1], (0, 1)), (shared, (1, 1))):
        aside = 1e-4 * np.maximum(counted, 1e-3) * cells
        up, down = (
            by_cause(causes[0] + sign * moves[0] * aside, causes[1] + sign * moves[1] * aside)
            for sign in (1, -1)
        )
        slope = (up - down) / (2 * aside.sum(axis=(-2, -1)))[:, None, None]
        variance += (slope**2 * counted.reshape(-1)[:, None, None]).sum(axis=0)
    return np.sqrt(variance)


@pytest.mark.fast
@pytest.mark.parametrize("part", [0.0, 0.4])
@pytest.mark.parametrize("key", ["e0", "H"])
def test_limits_by_cause_are_those_of_every_count_moved_by_itself(key: str, part: float) -> None:
    pair = large(PAIRS["Danish men 1974 to 2012"])
    causes = split(pair, (1.0, 2.0, 0.5))
    shared = part * np.minimum(*causes)
    found = widths(
        contribution_limits(
            INDICATORS[key], pair.this, pair.that, PLAIN, causes=causes, shared=shared
        )
    )
    expected = cause_errors(key, pair, causes, shared)
    read = expected > 1e-6 * expected.max()
    assert read.sum() > 50
    np.testing.assert_allclose(found[read], expected[read], rtol=0.005)


@pytest.mark.fast
def test_a_death_counted_that_stands_for_others_of_its_cause_moves_it_by_as_many() -> None:
    """Ill-defined deaths were moved to the first cause: of 5 of its deaths 4 were counted there.
    By brute force, a row of its own keeping all causes together at those counted."""
    pair = large(PAIRS["Danish men 1974 to 2012"])
    counted = split(pair, (2.0, 1.0, 0.5))
    causes = tuple(
        np.stack([side[0] + side[2], side[1], np.zeros_like(side[2])]) for side in counted
    )
    found = widths(
        contribution_limits(
            INDICATORS["e0"], pair.this, pair.that, PLAIN, causes=causes, counted=counted
        )
    )
    stands_for = [
        np.divide(side[0], count[0], out=np.ones_like(count[0]), where=count[0] > 0)
        for side, count in zip(causes, counted, strict=True)
    ]

    def by_cause(ours: Array, theirs: Array) -> Array:
        rows, sides = [], []
        for panel, count, each in zip(
            (pair.this, pair.that), (ours, theirs), stands_for, strict=True
        ):
            total, first = count.sum(axis=-2), each * count[..., 0, :]
            rest = total - first - count[..., 1, :]
            rows.append(np.stack([first, count[..., 1, :], rest], axis=-2))
            sides.append(replace(copies(panel, len(count)), deaths=total))
        return contributions_by_cause(INDICATORS["e0"], *sides, PLAIN, causes=tuple(rows)).by_cause

    variance = np.zeros_like(counted[0])
    cells = np.eye(variance.size).reshape(-1, *variance.shape)
    still = np.broadcast_to(1.0, (variance.size, 1, 1))
    for at in (0, 1):
        aside = 1e-4 * np.maximum(counted[at], 1e-3) * cells
        ends = []
        for sign in (1, -1):
            moved = [side * still for side in counted]
            moved[at] = moved[at] + sign * aside
            ends.append(by_cause(*moved))
        slope = (ends[0] - ends[1]) / (2 * aside.sum(axis=(-2, -1)))[:, None, None]
        variance += (slope**2 * counted[at].reshape(-1)[:, None, None]).sum(axis=0)
    expected = np.sqrt(variance)[:2]
    read = expected > 1e-6 * expected.max()
    np.testing.assert_allclose(found[:2][read], expected[read], rtol=0.005)


@pytest.mark.fast
@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-population-2"])
def test_limits_of_one_cause_that_holds_all_deaths_are_those_of_the_ages(settings: str) -> None:
    pair, chain = PAIRS["men across the break of a0"], find(settings)
    causes = pair.this.deaths[None], pair.that.deaths[None]
    groups, sides = AgeGrid((0, 1, 50, 80)), (pair.this, pair.that)
    ages = contribution_limits(INDICATORS["H"], *sides, chain, groups=groups)
    found = contribution_limits(INDICATORS["H"], *sides, chain, groups=groups, causes=causes)
    assert found.low.shape == (1, 4)
    np.testing.assert_allclose(found.low[0], ages.low, rtol=1e-9)
    np.testing.assert_allclose(found.high[0], ages.high, rtol=1e-9)


@pytest.mark.fast
def test_limits_by_cause_in_a_batch_are_its_rows_bit_for_bit() -> None:
    levels = np.array([2e-5, 3e-5, 4e-5])
    pair = Pair(gompertz_panel(seed=1, level=levels), gompertz_panel(seed=2, level=levels[::-1]))
    causes = tuple(
        np.ascontiguousarray(np.moveaxis(np.stack([0.3 * side.deaths, 0.7 * side.deaths]), 0, -2))
        for side in (pair.this, pair.that)
    )
    sides = pair.this, pair.that
    low, high = contribution_limits(INDICATORS["e0"], *sides, PLAIN, causes=causes)
    assert low.shape == (3, 2, 22)
    for row in range(3):
        one = tuple(side[row] for side in causes)
        alone = contribution_limits(
            INDICATORS["e0"], pair.this[row], pair.that[row], PLAIN, causes=one
        )
        np.testing.assert_array_equal(alone.low, low[row])
        np.testing.assert_array_equal(alone.high, high[row])


@pytest.mark.fast
@pytest.mark.parametrize("pair", PAIRS.values(), ids=PAIRS)
def test_no_limits_at_ages_that_a_number_does_not_read(pair: Pair) -> None:
    """The chance of dying between 15 and 60 reads nine age groups."""
    low, high = contribution_limits(INDICATORS["45q15"], pair.this, pair.that, PLAIN)
    starts = np.array(pair.this.grid.starts)
    read = (starts >= 15) & (starts < 60)
    np.testing.assert_array_equal(np.isfinite(low), read)
    np.testing.assert_array_equal(np.isfinite(high), read)


@pytest.mark.fast
def test_an_age_at_which_nobody_died_has_limits_on_both_sides_of_0() -> None:
    """That no one died says little of chance: half a death more on either side might have been."""
    this, that = gompertz_panel(people=1e5), gompertz_panel(people=1e5, level=4e-5)
    for panel in (this, that):
        panel.deaths[3] = 0
    low, high = contribution_limits(INDICATORS["e0"], this, that, PLAIN)
    assert low[3] < 0 < high[3]
    that.deaths[-1] = 0
    assert np.isnan(contribution_limits(INDICATORS["e0"], this, that, PLAIN).low).all()


@pytest.mark.fast
@pytest.mark.parametrize("key", ["median", "mode"])
def test_stepwise_contributions_have_simulated_limits(key: str) -> None:
    """They hold the contributions; those of all ages together are the simulated limits of the
    difference, with choices made on the observed counts, such as of a smoothing, kept."""
    pair = Pair(*(gompertz_panel(people=4e6, level=level) for level in (2e-5, 3e-5)))
    indicator = INDICATORS[key]
    names, groups = both(pair.this), AgeGrid((0, 60, 80))
    value = pair.this.grid.regroup(stepwise(indicator, pair.this, pair.that, PLAIN).by_age, groups)
    found = contribution_limits(
        indicator, pair.this, pair.that, PLAIN, streams=names, draws=60, groups=groups
    )
    assert ((found.low < value) & (value < found.high)).all()
    whole = contribution_limits(
        indicator, pair.this, pair.that, PLAIN, streams=names, draws=150, groups=AgeGrid((0,))
    )
    expected = difference(indicator, pair.this, pair.that, PLAIN, streams=names)
    np.testing.assert_allclose(widths(whole)[0], widths(expected), rtol=0.25)


@pytest.mark.fast
def test_simulated_limits_allow_for_persons_counted_wrongly() -> None:
    """Where hardly any chance is left, the sum of the ages has the limits of the difference."""
    pair, settings = large(PAIRS["Danish men 1974 to 2012"]), find("almanac-1-population-2")
    one, median = AgeGrid((0,)), INDICATORS["median"]
    streams = both(pair.this)
    known, wrong = (
        contribution_limits(median, pair.this, pair.that, chain, streams=streams, groups=one)
        for chain in (find("almanac-1"), settings)
    )
    expected = difference(median, pair.this, pair.that, settings, streams=streams)
    assert widths(known)[0] < 0.01 * widths(expected)
    np.testing.assert_allclose(widths(wrong)[0], widths(expected), rtol=0.2)


@pytest.mark.fast
def test_choices_are_made_on_the_populations_passed_through_as_observed() -> None:
    """What is read off simulated counts is given the same steps of the observed ones."""
    this, that = gompertz_panel(level=2e-5), gompertz_panel(level=3e-5)
    seen: list[Array] = []

    def redraw(observed: Chain, simulated: Chain) -> Array:
        seen.append(observed.panel.deaths)
        return INDICATORS["median"].value(simulated)

    choosing = replace(INDICATORS["median"], redraw=redraw)
    contribution_limits(choosing, this, that, PLAIN, streams=both(this), draws=20)
    for given in seen:
        np.testing.assert_array_equal(given[0, 0, 0], that.deaths)
        np.testing.assert_array_equal(given[1, -1, 0], this.deaths)
        np.testing.assert_array_equal(given[0, 5, 0], [*this.deaths[:5], *that.deaths[5:]])
    assert seen


@pytest.mark.fast
def test_what_is_simulated_needs_streams() -> None:
    panel = gompertz_panel()
    with pytest.raises(ValueError, match="are simulated, and no streams were given"):
        contribution_limits(INDICATORS["median"], panel, panel, PLAIN)
    causes = panel.deaths[None], panel.deaths[None]
    with pytest.raises(ValueError, match="has no derivative"):
        contribution_limits(INDICATORS["median"], panel, panel, PLAIN, causes=causes)
