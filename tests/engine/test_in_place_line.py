"""Pairs explained in place are explained as along the line through the chain."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine import bulk, in_place_line
from engine.ages import AgeGrid
from engine.decomposition import contributions
from engine.indicators import INDICATORS
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from tests.engine.compiled.test_equal import CHAINS
from tests.factories import GRIDS, gompertz_panel

PLAIN = SETTINGS["almanac-1"]
GRID = GRIDS["abridged"]


def flags(this: Panel, that: Panel, settings: Settings = PLAIN) -> np.ndarray:
    rows, ages = this.deaths.shape
    room = in_place_line.Room.of(this.grid, settings, rows + 3)
    return in_place_line.explain(that, this, room, np.empty((rows, ages)), np.empty(rows))


def pairs(grid: AgeGrid, infant: float, *, count: int = 40) -> tuple[Panel, Panel]:
    """Of women, men and mixes, near and far apart; some lines bend and some do not."""
    rng = np.random.default_rng(len(grid))
    found = []
    for _ in range(2):
        slope = rng.uniform(0.09, 0.1, count)
        level = 0.1 / np.exp(86 * slope) * rng.uniform(0.8, 1.25, count)
        first = infant * rng.uniform(0.95, 1.3, count)
        panel = gompertz_panel(grid, slope=slope, level=level, infant=first)
        share = rng.dirichlet((1, 1), count)
        share[::5] = (1.0, 0.0)
        ratio = rng.uniform(0.9, 1.1, (count, 2))
        found.append(replace(panel, infant_weight=share, infant_ratio=ratio))
    return found[0], found[1]


@pytest.mark.parametrize("settings", CHAINS, ids=lambda one: one.key)
@pytest.mark.parametrize("infant", [0.004, 0.016, 0.04, 0.1])
@pytest.mark.parametrize("name", ["abridged", "single", "irregular"])
def test_parts_are_those_along_the_line(name: str, infant: float, settings: Settings) -> None:
    this, that = pairs(GRIDS[name], infant)
    assert flags(this, that, settings).sum() > 0 or infant in (0.016, 0.1)
    found = bulk.contributions(this, that, settings, by="numpy").contributions
    expected = contributions(INDICATORS["e0"], this, that, settings)
    assert_allclose(found.by_age, expected.by_age, rtol=0, atol=1e-13)
    assert_allclose(found.difference, expected.difference, rtol=0, atol=1e-12)


@pytest.mark.parametrize(("settings", "level"), [(CHAINS[0], 0.01724), (CHAINS[1], 0.107)])
def test_a_line_through_a_break_of_a_rule_is_not_ordinary(settings: Settings, level: float) -> None:
    one = gompertz_panel(GRID, slope=np.array([0.09, 0.09]))
    ends = []
    for times in ((0.9, 0.7), (1.1, 0.9)):  # through it; below it
        deaths = one.deaths.copy()
        deaths[:, 0] = one.exposure[:, 0] * level * np.array(times)
        ends.append(replace(one, deaths=deaths))
    assert_array_equal(flags(ends[1], ends[0], settings), [False, True])
    assert_array_equal(flags(ends[0], ends[1], settings), [False, True])


@pytest.mark.parametrize(("age", "rate"), [(75, 0.41), (85, 0.41)])
def test_a_line_to_a_bound_or_past_a_doubling_is_not_ordinary(age: int, rate: float) -> None:
    that = gompertz_panel(GRID, slope=np.array([0.09, 0.09]))
    at = max(x for x, start in enumerate(GRID.starts[:-1]) if start <= age)
    deaths = that.deaths.copy()
    if age == 75:
        two = slice(at - 1, at + 1)  # of two negative chances to survive the product is positive
        deaths[0, two] = rate * that.exposure[0, two]  # ax mx passes 1 at 2/5
    else:
        deaths[0, -1] *= 2.05
    this = replace(that, deaths=deaths)
    assert_array_equal(flags(this, that), [False, True])
    assert_array_equal(flags(that, this), [False, True])


def test_a_pair_does_not_depend_on_the_others() -> None:
    this, that = pairs(GRIDS["single"], 0.004, count=400)
    together = bulk.contributions(this, that, PLAIN, by="numpy").contributions
    for part in (slice(0, 1), slice(250, 263)):
        alone = bulk.contributions(this[part], that[part], PLAIN, by="numpy").contributions
        assert_array_equal(alone.by_age, together.by_age[part])
        assert_array_equal(alone.difference, together.difference[part])
