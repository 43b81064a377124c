"""Contributions to life expectancy in closed form."""

import numpy as np
import pytest
from scipy.integrate import quad

from engine.ages import AgeGrid
from engine.chain import run
from engine.decomposition import arriaga, contributions, pollard, stepwise
from engine.indicators import INDICATORS
from engine.settings import find
from engine.tables import LifeTable, from_rates
from tests.engine.decomposition.pairs import PAIRS, PLAIN
from tests.factories import GRIDS, gompertz_panel

every_grid = pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
both_methods = pytest.mark.parametrize("method", [arriaga, pollard])


def tables(grid: AgeGrid) -> tuple[LifeTable, LifeTable]:
    this = run(gompertz_panel(grid, level=np.array([2e-5, 3e-5])), PLAIN).table
    return this, run(gompertz_panel(grid, infant=0.02), PLAIN).table


@pytest.mark.fast
@both_methods
@every_grid
def test_they_add_up_on_any_grid(grid: AgeGrid, method) -> None:
    this, that = tables(grid)
    found = method(this, that)
    np.testing.assert_allclose(found.sum(axis=-1), this.ex[..., 0] - that.ex[..., 0], rtol=1e-12)


@pytest.mark.fast
@both_methods
@pytest.mark.parametrize("pair", PAIRS.values(), ids=PAIRS)
def test_they_add_up_for_any_pair(pair, method) -> None:
    this, that = (run(panel, PLAIN).table for panel in (pair.this, pair.that))
    assert method(this, that).sum() == pytest.approx(float(this.ex[0] - that.ex[0]), abs=1e-10)


@pytest.mark.fast
def test_arriaga_and_the_line_agree_for_small_differences() -> None:
    this, that = gompertz_panel(seed=3, people=1e9), gompertz_panel(seed=4, people=1e9)
    line = contributions(INDICATORS["e0"], this, that, PLAIN).by_age
    closed = arriaga(run(this, PLAIN).table, run(that, PLAIN).table)
    np.testing.assert_allclose(line, closed, rtol=0.02, atol=2e-6)


@pytest.mark.fast
def test_pollard_turned_round_changes_its_sign_and_arriaga_does_not() -> None:
    this, that = tables(GRIDS["abridged"])
    np.testing.assert_array_equal(pollard(that, this), -pollard(this, that))
    assert np.abs(arriaga(that, this) + arriaga(this, that)).max() > 1e-3


@pytest.mark.fast
@every_grid
def test_pollard_is_the_integral_he_wrote(grid: AgeGrid) -> None:
    """Where the rate is constant in each group, l and e between its ends have a closed form; the
    integral of the difference of the forces of mortality with the mean weight, by quadrature."""
    steady = find("almanac-1-constant-rate")
    this, that = (
        run(gompertz_panel(grid, level=level, infant=infant), steady).table
        for level, infant in ((2e-5, 0.004), (6e-5, 0.05))
    )

    def weight(table: LifeTable, other: LifeTable, x: int, t: float) -> float:
        """l of one times e of the other, t years into the group."""
        survivors = table.lx[x] * np.exp(-table.mx[x] * t)
        m, left = other.mx[x], grid.widths[x] - t
        ahead = -np.expm1(-m * left) / m
        after = 0.0 if np.isinf(left) else np.exp(-m * left) * other.ex[x + 1]
        return float(survivors * (ahead + after))

    expected = [
        (that.mx[x] - this.mx[x])
        * quad(lambda t, x=x: (weight(that, this, x, t) + weight(this, that, x, t)) / 2, 0, width)[
            0
        ]
        for x, width in enumerate(grid.widths)
    ]
    np.testing.assert_allclose(pollard(this, that), expected, rtol=1e-8, atol=1e-12)


@pytest.mark.fast
def test_pollard_is_stepwise_replacement_where_ages_do_not_meet() -> None:
    """Where ax depends on the own rate only, replacing ages one by one, in both orders, gives
    Arriaga's formula both ways round."""
    this, that = (gompertz_panel(GRIDS["single"], level=level) for level in (2e-5, 3e-5))
    steps = stepwise(INDICATORS["e0"], this, that, PLAIN)
    upper, lower = (run(panel, PLAIN).table for panel in (this, that))
    np.testing.assert_allclose(steps.young_first, -arriaga(lower, upper), atol=1e-12)
    np.testing.assert_allclose(steps.old_first, arriaga(upper, lower), atol=1e-12)
    np.testing.assert_allclose(steps.by_age, pollard(upper, lower), atol=1e-12)


@pytest.mark.fast
@both_methods
def test_tables_of_unlike_grids_are_refused(method) -> None:
    grids = AgeGrid((0, 1, 5)), AgeGrid((0, 5, 10))
    this, that = (from_rates(grid, np.full(3, 0.01), np.full(3, 0.5)) for grid in grids)
    with pytest.raises(
        ValueError, match=r"tables' age groups differ .* one rule for the open group"
    ):
        method(this, that)
