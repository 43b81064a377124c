"""The life table against closed forms, and its adjoint against complex steps."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.tables import LifeTable, Partials, from_rates, pull
from tests.engine.stepping import complex_step, largest_error
from tests.factories import GRIDS, gompertz_rates, survivors_table

COLUMNS = ("mx", "ax", "lx", "dx", "Lx", "ex")


def midpoints(grid: AgeGrid, mx: np.ndarray) -> np.ndarray:
    return np.append(np.minimum(grid.widths[:-1] / 2, 1 / mx[:-1]), 1 / mx[-1])


def years_lost(table: LifeTable) -> np.ndarray:
    """e-dagger = sum d [e(x+n) + (1 - a/n)(e(x) - e(x+n))] + d(w) e(w)."""
    share, e = table.ax[..., :-1] / table.grid.widths[:-1], table.ex
    inside = table.dx[..., :-1] * (e[..., 1:] + (1 - share) * (e[..., :-1] - e[..., 1:]))
    return np.asarray(inside.sum(axis=-1) + table.dx[..., -1] * e[..., -1])


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
def test_a_constant_rate_leaves_the_same_years_at_every_age(grid: AgeGrid) -> None:
    rate, n = 0.0125, grid.widths[:-1]
    ax = np.append(1 / rate - n / np.expm1(n * rate), 1 / rate)
    table = from_rates(grid, np.full(len(grid), rate), ax)
    np.testing.assert_allclose(table.ex, 80, rtol=1e-13)
    np.testing.assert_allclose(table.lx, np.exp(-rate * np.array(grid.starts)), rtol=1e-13)


@pytest.mark.fast
def test_survivors_on_a_straight_line() -> None:
    """l = 1 - x/100: e(x) = (100 - x)/2, a = n/2, H = 1/2."""
    grid = AgeGrid((*range(0, 100, 5), 99))
    starts = np.array(grid.starts, float)
    table = survivors_table(grid, 1e5 * (1 - starts / 100), np.append(grid.widths[:-1] / 2, 0.5))
    np.testing.assert_allclose(table.ex, (100 - starts) / 2, rtol=1e-13)
    np.testing.assert_allclose(table.mx, 1 / table.ex, atol=0.5)
    assert table.lx[0] == 1
    assert years_lost(table) / table.ex[0] == pytest.approx(0.5, abs=1e-3)


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
def test_columns_hold_together(grid: AgeGrid) -> None:
    mx = gompertz_rates(grid)
    table = from_rates(grid, mx, midpoints(grid, mx))
    np.testing.assert_allclose(table.Tx, table.ex * table.lx, rtol=1e-12)
    np.testing.assert_allclose(table.dx, table.mx * table.Lx, rtol=1e-12)
    assert table.dx.sum() == pytest.approx(1, abs=1e-14)


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
def test_rates_and_survivors_give_one_table(grid: AgeGrid) -> None:
    mx = gompertz_rates(grid)
    mx[-2] = 0.05  # so that somebody reaches the open group on every grid
    table = from_rates(grid, mx, midpoints(grid, mx))
    other = survivors_table(grid, 7 * table.lx, table.ax)
    for column in LifeTable.__slots__[1:]:
        np.testing.assert_allclose(
            getattr(other, column), getattr(table, column), rtol=1e-10, err_msg=column
        )


@pytest.mark.fast
def test_a_rate_at_which_more_die_than_enter_has_no_table() -> None:
    grid = AgeGrid((0, 1, 5, 10))
    table = from_rates(grid, np.array([0.01, 0.41, 0.001, 0.1]), np.array([0.1, 2.5, 2.5, 10.0]))
    assert np.isnan(table.qx[1])
    assert np.isnan(table.ex[:2]).all()
    np.testing.assert_array_equal(table.lx[:2], [1, 1 - table.qx[0]])


@pytest.mark.fast
def test_ages_nobody_reaches_keep_an_expectation() -> None:
    grid = AgeGrid((0, 5, 10))
    mx = np.array([0.1, 0.4, 0.5])
    table = from_rates(grid, mx, np.array([2.5, 2.5, 2.0]))
    assert table.qx[1] == 1
    assert table.lx[2] == 0
    np.testing.assert_allclose(table.ex[1:], [2.5, 2.0])


@pytest.mark.fast
def test_a_missing_rate_spreads_upwards_in_survivors_and_everywhere_in_expectation() -> None:
    table = from_rates(AgeGrid((0, 1, 2)), np.array([0.1, np.nan, 0.2]), np.array([0.5, 0.5, 5]))
    np.testing.assert_array_equal(np.isnan(table.lx), [False, False, True])
    assert np.isnan(table.ex[:2]).all()
    assert table.ex[2] == 5


@pytest.mark.fast
def test_refusals_say_what_was_found() -> None:
    grid = AgeGrid((0, 1))
    with pytest.raises(ValueError, match="mx ends in 3 age groups but the grid has 2"):
        from_rates(grid, np.ones(3), np.ones(3))


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
@pytest.mark.parametrize("by", ["mx", "ax"])
@pytest.mark.parametrize("column", COLUMNS)
def test_the_adjoint_of_every_column(grid: AgeGrid, by: str, column: str) -> None:
    """Any weighted sum of a column: its gradient against complex steps in mx and in ax."""
    rng = np.random.default_rng(7)
    mx = gompertz_rates(grid) * np.exp(rng.normal(0, 0.1, (2, len(grid))))
    mx[..., -2] = 0.05
    given = {"mx": mx, "ax": np.stack([midpoints(grid, row) for row in mx]) * 0.9}
    weights = rng.normal(size=mx.shape)

    def value(at: np.ndarray) -> np.ndarray:
        table = from_rates(grid, **{**given, by: at})
        return np.asarray((weights * getattr(table, column)).sum(axis=-1))

    found = getattr(pull(from_rates(grid, **given), Partials(**{column: weights})), by)
    expected = complex_step(value, given[by])
    if not expected.any():
        np.testing.assert_array_equal(found, 0)
    else:
        assert largest_error(found, expected) < 1e-13


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
@pytest.mark.parametrize("share", [0.3, 0.5, 0.7])
def test_one_per_cent_off_every_rate_gains_e_dagger_in_per_cent(
    grid: AgeGrid, share: float
) -> None:
    """-sum m de0/dm = e-dagger exactly, for any fixed ax, the open group's 1/m moving with m."""
    mx = gompertz_rates(grid)
    ax = np.append(share * np.minimum(grid.widths[:-1], 2 / mx[:-1]), 1 / mx[-1])
    table = from_rates(grid, np.where(ax * mx > 1, 1 / ax, mx), ax)
    g = pull(table, Partials(ex=np.eye(len(grid))[0]))
    g.mx[-1] -= g.ax[-1] / table.mx[-1] ** 2
    assert -(table.mx * g.mx).sum() == pytest.approx(float(years_lost(table)), rel=1e-12)
