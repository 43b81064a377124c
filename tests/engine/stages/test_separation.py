"""ax where no published table says it: bounds, open groups, the single years of a law."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import Chain, run
from engine.panel import Panel
from engine.settings import find
from tests.factories import gompertz_panel


def chain(starts: tuple[int, ...], mx: list[float], settings: str = "almanac-1") -> Chain:
    grid, count = AgeGrid(starts), np.full(len(mx), 100.0)
    return run(Panel.of(grid, count, count, sex="f"), find(settings), mx=np.array(mx))


@pytest.mark.fast
def test_half_the_width_except_where_a_rule_stands() -> None:
    table = chain((0, 1, 5, 10, 20), [0.01, 0.001, 0.001, 0.001, 0.05]).table
    np.testing.assert_allclose(table.ax[2:], [2.5, 5, 20])
    single = chain((0, 1, 2, 3), [0.01, 0.001, 0.001, 0.1]).table
    np.testing.assert_allclose(single.ax[1:], [0.5, 0.5, 10])
    coarse = chain((0, 5, 10), [0.003, 0.001, 0.1]).table
    np.testing.assert_allclose(coarse.ax, [2.5, 2.5, 10])
    np.testing.assert_allclose(chain((0,), [0.02]).table.ex, [50])


@pytest.mark.fast
def test_a_group_cannot_lose_more_than_enter_it() -> None:
    table = chain((0, 1, 5, 10, 15), [0.01, 0.001, 0.001, 0.5, 0.6]).table
    assert table.ax[3] == 2
    assert table.qx[3] == 1
    assert table.dx[3] / table.Lx[3] == pytest.approx(0.5, rel=1e-14)
    assert table.ex[4] == pytest.approx(1 / 0.6)
    just_below = chain((0, 1, 5, 10, 15), [0.01, 0.001, 0.001, 0.4 - 1e-9, 0.6]).table
    at_bound = chain((0, 1, 5, 10, 15), [0.01, 0.001, 0.001, 0.4 + 1e-9, 0.6]).table
    np.testing.assert_allclose(just_below.ex, at_bound.ex, rtol=1e-8)


@pytest.mark.fast
def test_at_the_bound_years_lived_follow_the_own_rate_alone() -> None:
    """Ages 1 to 4 with so high a rate that all die: no longer a matter of the infant rate."""
    made = chain((0, 1, 5, 10), [0.03, 0.9, 0.01, 0.1])
    assert made.table.ax[1] == pytest.approx(1 / 0.9)
    by_child = np.array([0.0, 1.0, 0.0, 0.0])
    np.testing.assert_allclose(made.separation.pull(by_child), [0, -1 / 0.9**2, 0, 0])


@pytest.mark.fast
def test_an_open_group_without_deaths_is_not_closed() -> None:
    table = chain((0, 1, 5, 10), [0.01, 0.001, 0.001, 0.0]).table
    assert np.isnan(table.ax[-1])
    assert np.isnan(table.ex).all()
    assert np.isfinite(table.lx).all()


@pytest.mark.fast
def test_a_law_runs_in_single_years_of_constant_rate_to_130() -> None:
    made = run(gompertz_panel(), find("almanac-1-gompertz"))
    grid, table = made.table.grid, made.table
    assert made.modelled
    assert grid.starts[-31:] == tuple(range(100, 131))
    np.testing.assert_allclose(table.qx[-31:-1], -np.expm1(-table.mx[-31:-1]), rtol=1e-12)
    assert table.ex[-1] == 1 / table.mx[-1]
    np.testing.assert_allclose(np.diff(np.log(table.mx[-31:])), np.log(table.mx[-1] / table.mx[-2]))
