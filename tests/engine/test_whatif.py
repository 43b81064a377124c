"""Populations at other death rates: what changes, and nothing besides."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine.ages import AgeGrid
from engine.causes.counts import CauseCounts
from engine.chain import run
from engine.panel import Panel
from engine.settings import find
from engine.whatif import Benchmark, Change, Parts, changed, factor, years_left
from tests.factories import GRIDS, complete, gompertz_panel

ALMANAC = find("almanac-1")
FIVE = GRIDS["abridged"]


def three_causes(panel: Panel, seed: int = 3) -> CauseCounts:
    """Whole deaths dealt to three causes."""
    rng = np.random.default_rng(seed)
    dealt = rng.multinomial(panel.deaths.astype(int), [0.5, 0.3, 0.2])
    return CauseCounts(np.moveaxis(dealt, -1, -2).astype(float))


def stationary(rate: float, people: float = 1e5) -> Panel:
    """As many person-years at each age as a life table at one constant rate has."""
    grid = AgeGrid(tuple(range(0, 101, 5)))
    left = np.exp(-rate * np.array(grid.starts, float))
    lived = people * np.append(left[:-1] - left[1:], left[-1])
    return Panel.of(grid, rate * lived, lived, sex="f")


def all_cells(parts: Parts, value: float = 1.0) -> np.ndarray:
    return np.full(parts.deaths.shape, value)


def test_no_change_leaves_every_bit() -> None:
    panel = complete(gompertz_panel(seed=1))
    parts = Parts.of(panel, three_causes(panel))
    same = changed(panel, parts, Change(all_cells(parts)))
    for name in ("deaths", "exposure", "infant_weight", "infant_ratio", "births"):
        assert_array_equal(getattr(same, name), getattr(panel, name), err_msg=name)


def test_changes_that_meet_multiply_in_any_order() -> None:
    cells = np.zeros((2, 1, 4), bool)
    cells[0, :, 1:], cells[1, :, :3] = True, True
    there = factor(np.array([-20.0, 50.0]), cells)
    assert_allclose(there, [[1.5, 1.2, 1.2, 0.8]])
    assert_array_equal(there, factor(np.array([50.0, -20.0]), cells[::-1]))


def test_a_cause_that_is_gone_leaves_the_deaths_of_the_others() -> None:
    panel = gompertz_panel(seed=1)
    causes = three_causes(panel)
    parts = Parts.of(panel, causes)
    times = all_cells(parts)
    times[1] = 0
    left = changed(panel, parts, Change(times))
    assert_array_equal(left.deaths, causes.deaths[0] + causes.deaths[2])
    assert_array_equal(left.exposure, panel.exposure)


def test_where_all_are_gone_nothing_is_left_of_rounding() -> None:
    panel = gompertz_panel()
    thirds = np.stack([panel.deaths / 3, panel.deaths / 7, panel.deaths * (1 - 1 / 3 - 1 / 7)])
    parts = Parts.of(panel, CauseCounts(thirds))
    assert not changed(panel, parts, Change(all_cells(parts, 0.0))).deaths.any()


def test_deaths_before_28_days_move_with_the_first_year_and_stillbirths_stay() -> None:
    panel = complete(gompertz_panel(seed=1))
    parts = Parts.of(panel)
    times = all_cells(parts)
    times[..., 0] = 0.7
    then = changed(panel, parts, Change(times))
    assert_allclose(then.births, panel.births * np.array([1.0, 1.0, 0.7]))
    times[..., 0], times[..., 1:] = 1.0, 0.5
    assert_array_equal(changed(panel, parts, Change(times)).births, panel.births)


def test_women_and_men_changed_apart_are_those_joined_afterwards() -> None:
    women, men = (gompertz_panel(sex=sex, seed=seed) for seed, sex in enumerate("fm"))
    panel = Panel.persons(women, men)
    parts = Parts.together([Parts.of(women, sex="f"), Parts.of(men, sex="m")])
    times = all_cells(parts)
    times[1, :6] = 0.5  # men, the youngest
    then = changed(panel, parts, Change(times))
    fewer = np.where(np.arange(len(FIVE)) < 6, 0.5, 1.0)
    apart = Panel.persons(women, replace(men, deaths=men.deaths * fewer))
    for name in ("deaths", "exposure", "infant_weight", "infant_ratio"):
        assert_allclose(getattr(then, name), getattr(apart, name), rtol=1e-14, err_msg=name)


def benchmark(panel: Panel, other: Panel, where: slice) -> Benchmark:
    parts = Parts.of(other)
    cells = np.zeros(parts.deaths.shape, bool)
    cells[..., where] = True
    return Benchmark(parts, cells, np.zeros(parts.deaths.shape))


def test_a_benchmark_lends_its_rates_where_it_is_asked() -> None:
    own, other = gompertz_panel(seed=1), gompertz_panel(seed=2, level=1e-5, people=9e5)
    parts = Parts.of(own)
    lender = benchmark(own, other, slice(8, 14))
    then = run(changed(own, parts, Change(all_cells(parts), lender)), ALMANAC)
    now, theirs = run(own, ALMANAC).rates.mx, run(other, ALMANAC).rates.mx
    assert_allclose(then.rates.mx[8:14], theirs[8:14], rtol=1e-14)
    assert_array_equal(then.rates.mx[:8], now[:8])
    assert_array_equal(then.rates.mx[14:], now[14:])


def test_where_a_benchmark_has_nobody_the_own_rate_stands() -> None:
    own, other = gompertz_panel(seed=1), gompertz_panel(seed=2)
    empty = replace(other, exposure=np.where(np.arange(len(FIVE)) == 9, 0.0, other.exposure))
    parts = Parts.of(own)
    then = changed(own, parts, Change(all_cells(parts), benchmark(own, empty, slice(9, 10))))
    assert_array_equal(then.deaths, own.deaths)


def test_a_percentage_stands_on_top_of_the_benchmark() -> None:
    own, other = gompertz_panel(seed=1), gompertz_panel(seed=2)
    parts = Parts.of(own)
    then = changed(own, parts, Change(all_cells(parts, 0.9), benchmark(own, other, slice(None))))
    assert_allclose(then.deaths / then.exposure, 0.9 * other.deaths / other.exposure)


@pytest.mark.parametrize("rate", [0.01, 0.04])
def test_at_a_constant_rate_everybody_has_as_long_left(rate: float) -> None:
    grid = AgeGrid(tuple(range(0, 101, 5)))
    lived = np.full(len(grid), 1e4)
    chain = run(Panel.of(grid, rate * lived, lived, sex="f"), find("almanac-1-constant-rate"))
    assert_allclose(years_left(chain), 1 / rate, rtol=1e-12)


@pytest.mark.parametrize("key", ["almanac-1", "almanac-1-kannisto"])
def test_years_left_by_deaths_are_years_lost(key: str) -> None:
    """Weighted by the deaths of the table they are e-dagger."""
    from engine.indicators import find as indicator

    chain = run(gompertz_panel(people=3e6), find(key))
    table, groups = chain.table, len(chain.panel.grid)
    dx = np.append(table.dx[: groups - 1], table.dx[groups - 1 :].sum())
    assert_allclose(dx @ years_left(chain), indicator("edagger").value(chain), rtol=1e-12)
