"""The integral along the straight line against a plain sum of 8,000 steps.

The plain sum knows nothing of gradients: at the middle of each step along the straight line of
rates it moves one age's rate by its share of the step and reads the indicator before and after.
"""

from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import Reading, run
from engine.decomposition import contributions
from engine.indicators import INDICATORS
from engine.panel import Panel
from engine.settings import Settings, find
from tests.engine.decomposition.pairs import GRID, PAIRS, PLAIN, Pair
from tests.factories import gompertz_panel

AT_ONCE = 200


def between(pair: Pair, t: np.ndarray) -> Panel:
    """Panels [node, age] on the line from that to this, rates still to be given."""
    line = {
        name: getattr(pair.that, name) + t * (getattr(pair.this, name) - getattr(pair.that, name))
        for name in ("exposure", "infant_weight", "infant_ratio")
    }
    bare = replace(pair.this, whole=None, standard=None)
    return replace(bare, deaths=line["exposure"] * 0, **line)


def step_sums(pair: Pair, settings: Settings, steps: int, *readings: Reading) -> list[np.ndarray]:
    ends = [run(panel, settings).mx for panel in (pair.that, pair.this)]
    step = (ends[1] - ends[0]) / steps
    sums = [np.zeros_like(step) for _ in readings]
    aside = np.eye(len(step)) * step / 2  # one age moved, [age, age]
    for first in range(0, steps, AT_ONCE):
        t = ((np.arange(first, first + AT_ONCE) + 0.5) / steps)[:, None]
        panel, middle = between(pair, t)[:, None], (ends[0] + t * (ends[1] - ends[0]))[:, None]
        after, before = (run(panel, settings, mx=middle + side * aside) for side in (1, -1))
        for total, reading in zip(sums, readings, strict=True):
            total += (reading.value(after) - reading.value(before)).sum(axis=0)
    return sums


@pytest.mark.slow
@pytest.mark.parametrize("pair", PAIRS.values(), ids=PAIRS)
def test_every_age_against_8_000_steps(pair: Pair) -> None:
    readings = [INDICATORS[key] for key in ("e0", "H")]
    for reading, expected in zip(readings, step_sums(pair, PLAIN, 8_000, *readings), strict=True):
        found = contributions(reading, pair.this, pair.that, PLAIN)
        np.testing.assert_allclose(found.by_age, expected, rtol=0, atol=3e-6)  # the sum's own error


@pytest.mark.fast
@pytest.mark.parametrize("settings", ["almanac-1-gompertz", "almanac-1-kannisto"])
def test_every_age_against_steps_through_a_fitted_law(settings: str) -> None:
    chain, pair = find(settings), PAIRS["Danish men 1974 to 2012"]
    (expected,) = step_sums(pair, chain, AT_ONCE, INDICATORS["e0"])
    found = contributions(INDICATORS["e0"], pair.this, pair.that, chain)
    np.testing.assert_allclose(found.by_age, expected, rtol=0, atol=2e-6)
    assert found.by_age[-1] == 0  # the law takes the place of the open group's own rate
    assert 0 < abs(found.remainder) < 1e-3 * abs(found.difference)  # moved by person-years


@pytest.mark.fast
@pytest.mark.parametrize("empty", [(0, 1), (1, 0), (1, 1)])
def test_each_age_of_a_join_has_its_own_part(empty: tuple[int, int]) -> None:
    """Nobody counted at 95-99 on one side or on both: its deaths share the rate of 90-94, and its
    part is still its own."""
    this, that = gompertz_panel(GRID, seed=1), gompertz_panel(GRID, seed=2, level=3e-5)
    for panel, is_empty in zip((this, that), empty, strict=True):
        panel.exposure[-2] *= 1 - is_empty
    found = contributions(INDICATORS["e0"], this, that, PLAIN)
    (expected,) = step_sums(Pair(this, that), PLAIN, AT_ONCE, INDICATORS["e0"])
    np.testing.assert_allclose(found.by_age, expected, rtol=0, atol=3e-6)  # the sum's own error
    assert abs(found.by_age[-2]) > 1e-4


@pytest.mark.fast
def test_a_borrowed_open_rate_counts_as_the_rate_there() -> None:
    """Nobody died in the open group of this: table and line have the rate of the whole."""
    borrowing, short = replace(PLAIN, borrow=True), AgeGrid((0, 1, *range(5, 90, 5)))
    whole = gompertz_panel(people=1e7, level=3e-5).regroup(short)
    this = replace(gompertz_panel(people=5e4, level=2.5e-5).regroup(short), whole=whole)
    this.deaths[-1] = 0
    that = replace(gompertz_panel(people=1e6, level=4e-5).regroup(short), whole=whole)
    found = contributions(INDICATORS["e0"], this, that, borrowing)
    mx = run(this, borrowing).mx
    lent = replace(this, deaths=mx * this.exposure)
    expected = contributions(INDICATORS["e0"], lent, that, borrowing)
    np.testing.assert_allclose(found.by_age, expected.by_age, rtol=1e-9, atol=1e-12)
    assert found.by_age[-1] > 0.1
    assert abs(found.remainder) < 1e-9 * np.abs(found.by_age).sum()


@pytest.mark.fast
@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-kannisto"])
def test_a_batch_is_its_rows_bit_for_bit(settings: str) -> None:
    """Also where rows need different cuts."""
    infants = np.geomspace(0.002, 0.15, 6)
    this = gompertz_panel(sex="f", seed=1, infant=infants, people=5e6)
    that = gompertz_panel(sex="f", seed=2, infant=infants[::-1], people=5e6)
    together = contributions(INDICATORS["e0"], this, that, find(settings))
    for row in range(6):
        alone = contributions(INDICATORS["e0"], this[row], that[row], find(settings))
        np.testing.assert_array_equal(alone.by_age, together.by_age[row])
        np.testing.assert_array_equal(alone.remainder, together.remainder[row])
