"""The change that reaches a target: it inverts the way forward."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine.indicators import find
from engine.sensitivity import deaths_to_avoid
from engine.settings import find as settings
from engine.whatif import Change, Parts
from engine.whatif_numbers import what_if
from engine.whatif_reach import uniform
from tests.engine.test_whatif import stationary, three_causes
from tests.factories import gompertz_panel

ALMANAC = settings("almanac-1")
CLOSED = replace(ALMANAC, open_share=1.0)  # however many reach the open group
E0 = find("e0")


def cells_of(parts: Parts, causes: slice, ages: slice) -> np.ndarray:
    cells = np.zeros(parts.deaths.shape, bool)
    cells[..., causes, ages] = True
    return cells


@pytest.mark.parametrize("key", ["e0", "H", "edagger", "asr_esp2013", "45q15", "e65"])
@pytest.mark.parametrize("factor", [0.13, 0.5, 0.97, 1.4])
def test_it_inverts_the_way_forward(key: str, factor: float) -> None:
    panel, one = gompertz_panel(seed=1), find(key)
    parts = Parts.of(panel, three_causes(panel))
    cells = cells_of(parts, slice(0, 2), slice(4, 18))
    times = np.where(cells, factor, 1.0)
    there = what_if([one], panel, parts, Change(times), ALMANAC).then[key].value
    found = uniform(one, panel, parts, cells, there, ALMANAC)
    assert float(found.factor) == pytest.approx(factor, rel=1e-8)
    assert found.low < found.factor < found.high


def test_a_target_that_is_met_asks_for_nothing() -> None:
    panel = gompertz_panel(seed=1)
    parts = Parts.of(panel)
    cells = cells_of(parts, slice(None), slice(None))
    now = what_if([E0], panel, parts, Change(np.ones(cells.shape)), ALMANAC).now["e0"].value
    assert float(uniform(E0, panel, parts, cells, now, ALMANAC).factor) == pytest.approx(1.0)


def test_out_of_reach_is_told_with_what_can_be_reached() -> None:
    panel = gompertz_panel(seed=1)
    parts = Parts.of(panel, three_causes(panel))
    cells = cells_of(parts, slice(1, 2), slice(4, 10))
    found = uniform(E0, panel, parts, cells, np.array(90.0), ALMANAC)
    assert np.isnan(found.factor)
    assert np.isnan(found.low)
    gone = what_if([E0], panel, parts, Change(np.where(cells, 0.0, 1.0)), ALMANAC)
    assert_allclose(found.without, gone.then["e0"].value)
    assert_allclose(found.now, gone.now["e0"].value)


def test_at_a_constant_rate_the_factor_is_a_ratio() -> None:
    panel = stationary(0.02)
    parts = Parts.of(panel)
    cells = cells_of(parts, slice(None), slice(None))
    chain = settings("almanac-1-constant-rate")
    found = uniform(E0, panel, parts, cells, np.array([60.0, 55.0, 40.0]), chain)
    assert_allclose(found.factor, [50 / 60, 50 / 55, 50 / 40], rtol=1e-10)
    # the factor is 1 / (60 m), and m rests on all deaths
    se = float(found.factor[0]) / np.sqrt(parts.deaths.sum())
    assert (found.high[0] - found.low[0]) / 2 == pytest.approx(1.96 * se, rel=0.02)


def test_counted_from_now_chance_moves_both_ends() -> None:
    """At a constant rate a gain of g takes the factor k = 1 / (1 + g m). One death more at x moves
    what is gained by the years L(x) lived there at both rates, over the person-years."""
    panel, rate, gain = stationary(0.02), 0.02, 0.1
    parts = Parts.of(panel)
    cells = cells_of(parts, slice(None), slice(None))
    chain = settings("almanac-1-constant-rate")
    found = uniform(E0, panel, parts, cells, np.array(gain), chain, from_now=True)
    factor = 1 / (1 + gain * rate)
    assert_allclose(found.factor, factor, rtol=1e-10)
    lived = [stationary(of, 1.0).exposure / of for of in (rate, factor * rate)]
    moved = -(lived[1] - lived[0]) / rate / panel.exposure
    slope = -1 / (factor * rate) / factor
    se = np.sqrt(((moved / slope) ** 2 * panel.deaths).sum())
    assert (found.high - found.low) / 2 == pytest.approx(1.96 * se, rel=0.05)
    there = uniform(E0, panel, parts, cells, found.now + 0.1, chain)
    assert_allclose(there.factor, found.factor, rtol=1e-9)


def test_at_one_age_it_is_the_deaths_to_avoid() -> None:
    panel = gompertz_panel(seed=1, people=3e6)
    parts = Parts.of(panel)
    from engine.chain import run

    avoid = deaths_to_avoid(E0, run(panel, ALMANAC))
    age = panel.grid.position(65)
    cells = cells_of(parts, slice(None), slice(age, age + 1))
    target = E0.value(run(panel, ALMANAC)) + 1 / 12
    found = uniform(E0, panel, parts, cells, target, ALMANAC)
    assert_allclose((1 - found.factor) * panel.deaths[age], avoid.deaths[age], rtol=1e-7)


@pytest.mark.parametrize("factor", [0.7, 0.45])
def test_of_two_ways_the_smaller_change_is_taken(factor: float) -> None:
    """Closed by its own rate e-dagger falls to a factor of 0.54 on all rates, and rises again."""
    one, panel = find("edagger"), gompertz_panel(people=3e6)
    parts = Parts.of(panel)
    cells = cells_of(parts, slice(None), slice(None))

    def value(times: float) -> np.ndarray:
        change = Change(np.full(cells.shape, times))
        return what_if([one], panel, parts, change, CLOSED).then["edagger"].value

    assert value(0.54) < min(value(0.45), value(0.7))
    found = uniform(one, panel, parts, cells, value(factor), CLOSED)
    assert 0.54 < found.factor < 1
    assert_allclose(value(float(found.factor)), value(factor), rtol=1e-9)


def test_numbers_that_jump_and_counts_are_refused() -> None:
    panel = gompertz_panel(seed=1)
    parts = Parts.of(panel)
    cells = cells_of(parts, slice(None), slice(None))
    with pytest.raises(ValueError, match="jumps"):
        uniform(find("mode"), panel, parts, cells, np.array(85.0), ALMANAC)
    with pytest.raises(ValueError, match="count over births"):
        uniform(find("imr"), panel, parts, cells, np.array(0.003), ALMANAC)


def test_a_batch_is_its_rows_to_the_last_bit() -> None:
    panel = gompertz_panel(seed=5, level=np.array([2e-5, 3e-5, 2.5e-5]))
    parts = Parts.of(panel, three_causes(panel))
    cells = cells_of(parts, slice(0, 1), slice(4, 18))
    target = np.array([79.0, 77.0, 95.0])
    together = uniform(E0, panel, parts, cells, target, ALMANAC)
    for row in range(3):
        alone = uniform(
            E0, panel[row], parts.over(lambda a, row=row: a[row]), cells[row], target[row], ALMANAC
        )
        for name in ("factor", "low", "high", "now", "without"):
            assert_array_equal(getattr(together, name)[row], getattr(alone, name), err_msg=name)
