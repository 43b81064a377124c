"""ax where no published table says it: bounds, open groups, the single years of a law."""

from itertools import product

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import Chain, gradient, run
from engine.indicators import find as indicator
from engine.panel import Panel
from engine.settings import Settings, find
from engine.stages.inside import INSIDE
from engine.stages.separation import CHILD, COALE_DEMENY, COALE_DEMENY_FIRST, FIRST_YEAR
from tests.engine.stepping import complex_step, largest_error
from tests.factories import GRIDS, gompertz_panel


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


RULES = [Settings("x", "X", "one_over_m", *two, inside=i) for *two, i in product(
    FIRST_YEAR, CHILD, INSIDE)]  # fmt: skip


@pytest.mark.fast
@pytest.mark.parametrize("settings", RULES, ids=lambda s: f"{s.first_year} {s.child} {s.inside}")
def test_the_gradient_under_every_rule(settings: Settings) -> None:
    """Of e0, on both sides of the breaks, for persons, on grids with and without five-year groups;
    and a batch is its rows."""
    infant = np.array([0.004, 0.05, 0.1069, 0.1071])
    for grid in GRIDS.values():
        panel = gompertz_panel(grid, seed=3, infant=infant, sex="p", people=5e6)
        panel.infant_ratio[:] = (0.9, 1.1)
        chain = run(panel, settings)
        found = gradient(indicator("e0"), chain)
        expected = complex_step(
            lambda mx, panel=panel: indicator("e0").value(run(panel, settings, mx=mx)),
            chain.rates.mx,
        )
        assert largest_error(found, expected) < 1e-12
        np.testing.assert_array_equal(run(panel[2], settings).table.ex, chain.table.ex[2])
        np.testing.assert_array_equal(gradient(indicator("e0"), run(panel[2], settings)), found[2])


@pytest.mark.fast
@pytest.mark.parametrize(
    ("rule", "steps", "slopes"),
    [
        (COALE_DEMENY_FIRST, (-0.0026, -0.002188), (2.8, 2.684)),
        (COALE_DEMENY, (0.001426, 0.002312), (-1.518, -2.816)),
    ],
    ids=["first year", "ages 1 to 4"],
)
def test_what_happens_at_the_break_of_coale_and_demeny(
    rule: tuple, steps: tuple[float, float], slopes: tuple[float, float]
) -> None:
    """The value steps, the slope falls to 0, and the break itself belongs to the piece above it."""
    settings = Settings("x", "X", "one_over_m", "coale_demeny")
    first = rule is COALE_DEMENY_FIRST
    for sex, step, slope in zip("fm", steps, slopes, strict=True):
        count, grid = np.full(4, 100.0), AgeGrid((0, 1, 5, 10))
        below, at, above = (
            run(Panel.of(grid, count, count, sex=sex), settings, mx=np.array([m0, 0.01, 1e-3, 0.1]))
            for m0 in (0.107 - 1e-12, 0.107, 0.107 + 1e-12)
        )
        group = 0 if first else 1
        assert at.table.ax[group] == above.table.ax[group]
        assert at.table.ax[group] - below.table.ax[group] == pytest.approx(step, abs=1e-9)
        slope_of = (lambda s: s.own[0]) if first else (lambda s: s.child)
        assert slope_of(below.separation) == pytest.approx(slope, rel=1e-12)
        assert slope_of(at.separation) == slope_of(above.separation) == 0


@pytest.mark.fast
def test_the_first_years_in_plain_terms() -> None:
    mx = [0.3, 0.1, 0.001, 0.001, 0.05]
    grid, count = AgeGrid((0, 1, 5, 10, 20)), np.full(5, 100.0)

    def ax(rule: str) -> np.ndarray:
        settings = Settings("x", "X", "one_over_m", rule, rule)
        return run(Panel.of(grid, count, count, sex="f"), settings, mx=np.array(mx)).table.ax

    np.testing.assert_allclose(ax("midpoint")[:2], [0.5, 2])
    np.testing.assert_allclose(
        ax("constant_rate")[:2], [1 / 0.3 - 1 / np.expm1(0.3), 10 - 4 / np.expm1(0.4)]
    )
