"""ax inside closed groups: closed forms, Keyfitz's iteration by hand, its bounds and its slopes."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.ages import AgeGrid
from engine.stages.inside import (
    INSIDE,
    Lived,
    Neighbours,
    _at_rest,
    _graduated,
    bounds,
    constant_rate,
    has_neighbours,
    held_ends,
    iterate,
    last_of_run,
)
from tests.engine.stepping import complex_step, largest_error

pytestmark = pytest.mark.fast
FIVES = AgeGrid((0, 1, *range(5, 101, 5))).widths[:-1]
wild = st.lists(st.floats(0, 1) | st.sampled_from([0.0, 1e-9, 0.3]), min_size=21, max_size=21)


def found(m: np.ndarray, n: np.ndarray = FIVES) -> Neighbours:
    """By the iteration, with the bound of the others that the separation stage puts on them."""
    start = held_ends(n, m)
    full = np.real(start.ax * m) > 1
    with np.errstate(all="ignore"):
        ax, slope = np.where(full, 1 / m, start.ax), np.where(full, -1 / m**2, start.slope)
    neighbours = iterate(n, m, Lived(ax, slope))
    assert neighbours is not None
    return neighbours


def by_hand(m: list[float]) -> list[float]:
    """Keyfitz's iteration as printed, for one run of five-year groups, its ends given."""
    ax = [2.5] * (len(m) - 1) + [1 / m[-1] - 5 / (np.exp(5 * m[-1]) - 1)]
    for _ in range(60):
        reach, deaths = 1.0, []
        for rate, a in zip(m, ax, strict=True):
            q = 5 * rate / (1 + (5 - a) * rate)
            deaths.append(reach * q)
            reach *= 1 - q
        for x in range(1, len(m) - 1):
            ax[x] = 2.5 + 5 / 24 * (deaths[x + 1] - deaths[x - 1]) / deaths[x]
    return ax


def test_a_constant_rate_leaves_an_exponential_part() -> None:
    n, m = np.array([1.0, 4.0, 5.0, 10.0]), np.array([0.02, 0.3, 1e-6, 0.5])
    ax = constant_rate(n, m).ax
    np.testing.assert_allclose(n * m / (1 + (n - ax) * m), -np.expm1(-n * m), rtol=1e-9)
    assert constant_rate(5.0, np.array(0.0)).ax == 2.5


def test_a_constant_rate_by_series_and_by_formula_meet() -> None:
    n = np.array([1.0, 1.0, 5.0, 5.0])
    m = np.array([0.1 - 1e-12, 0.1 + 1e-12, 0.02 - 1e-13, 0.02 + 1e-13])
    lived = constant_rate(n, m)
    np.testing.assert_allclose(lived.ax[::2], lived.ax[1::2], rtol=1e-11)
    np.testing.assert_allclose(lived.slope[::2], lived.slope[1::2], rtol=1e-10)


def test_which_groups_the_iteration_is_for() -> None:
    def starts(which: np.ndarray, grid: AgeGrid) -> list[int]:
        return [start for start, held in zip(grid.starts, which, strict=False) if held]

    for grid, inner, last in (
        (AgeGrid((0, 1, 5, 10, 15, 20, 25)), [10, 15], [20]),
        (AgeGrid((0, 5, 10, 15, 20, 25)), [10, 15], [20]),
        (AgeGrid((0, 1, 5, 10, 20, 25, 30, 35, 36)), [25], [30]),
        (AgeGrid(tuple(range(50))), [], []),
        (AgeGrid((0,)), [], []),
        (AgeGrid((0, 5)), [], []),
    ):
        n = grid.widths[:-1]
        assert starts(has_neighbours(n), grid) == inner
        assert starts(last_of_run(n), grid) == last


def test_no_five_year_groups_leave_nothing_to_iterate() -> None:
    n, m = np.ones(30), np.full(30, 0.01)
    assert iterate(n, m, INSIDE["keyfitz"](n, m)) is None


def test_the_iteration_is_the_printed_one() -> None:
    """To what the bound at few deaths moves: less than a hundred-thousandth of a year per adult
    group here, where ax is within a fifth of a year of the middle."""
    m = 1e-4 + 3e-5 * np.exp(0.1 * np.arange(7.5, 100, 5))
    got = found(np.concatenate([[0.005, 0.0003], m])).ax[2:]
    expected = np.array(by_hand(list(m)))
    close = np.abs(expected - 2.5) < 0.2
    assert close.sum() > 12
    np.testing.assert_allclose(got[close], expected[close], rtol=0, atol=2e-5)
    np.testing.assert_allclose(got, expected, rtol=0, atol=2e-3)


def test_where_deaths_lie_on_a_parabola_ax_is_exact() -> None:
    """Density a + b x + c x^2 of ages at death: the true ax is a fixed point of the iteration."""
    edges = np.arange(0, 105, 5.0)
    a, b, c = 0.004, 1e-4, 0.5e-6

    def to(x: np.ndarray, power: int) -> np.ndarray:
        """The integral of x^power times the density, from 0."""
        k = power + 1
        return a * x**k / k + b * x ** (k + 1) / (k + 1) + c * x ** (k + 2) / (k + 2)

    deaths, moments = np.diff(to(edges, 0)), np.diff(to(edges, 1))
    true = moments / deaths - edges[:-1]
    reach = 1.2 - to(edges, 0)  # of whom some outlive the last group
    mx = deaths / (5 * reach[1:] + true * deaths)
    once = _graduated(np.full(20, 5.0), mx, true)
    np.testing.assert_allclose(once[2:-1], true[2:-1], rtol=0, atol=2e-6)
    assert np.abs(true - 2.5).max() > 0.03


@given(wild)
@settings(max_examples=60, deadline=None)
def test_whatever_the_rates_some_survive_and_ax_lies_in_the_group(rates: list[float]) -> None:
    m = np.array(rates)
    neighbours, inner = found(m), has_neighbours(FIVES)
    ax = neighbours.ax[inner]
    assert np.all((ax > -1e-14) & (ax <= 5))
    assert np.all(ax * m[inner] <= 1 + 1e-15)
    with np.errstate(all="ignore"):
        again = _graduated(FIVES, m, neighbours.ax)[inner]
    np.testing.assert_allclose(again, ax, rtol=0, atol=1e-12)  # it has come to rest


@given(wild, st.integers(0, 2**31))
@settings(max_examples=30, deadline=None)
def test_the_pullback_is_the_complex_step_whatever_the_rates(rates: list[float], seed: int) -> None:
    m = np.maximum(np.array(rates), 1e-6)
    inner = has_neighbours(FIVES)
    g = np.where(inner, np.random.default_rng(seed).normal(size=21), 0.0)
    expected = complex_step(lambda rates: (found(rates).ax * g).sum(axis=-1), m)
    assert largest_error(found(m).pull(g), expected) < 1e-9


def test_a_row_rests_with_its_derivative_and_for_itself() -> None:
    """The value of the first row rests at once, its derivative halves its way; the second row has
    its own way, which the first does not lengthen."""
    start, seen = np.array([[1.0 + 1j], [4.0 + 0j]]), []

    def once(values: np.ndarray, some: np.ndarray) -> np.ndarray:
        seen.append(list(some))
        return (1 + values.real) / 2 + 1j * values.imag / 2 + 1j

    found = _at_rest(once, start)
    np.testing.assert_allclose(found, [[1 + 2j], [1 + 2j]], rtol=1e-14)
    alone = _at_rest(once, start[:1])
    np.testing.assert_array_equal(alone, found[:1])
    assert seen[0] == [0, 1]


def test_a_group_that_is_not_read_passes_no_gap_on() -> None:
    m = np.full((2, 21), 0.01)
    m[0, 12] = np.nan
    neighbours = found(m)
    assert not neighbours.pull(np.zeros((2, 21))).any()
    assert np.isfinite(neighbours.ax[1]).all()


@pytest.mark.parametrize("rule", INSIDE)
def test_where_a_rule_reaches_the_bound(rule: str) -> None:
    """ax mx passes 1 at the stated rate and nowhere below; where none is stated, never."""
    grid = AgeGrid((0, 1, *range(5, 101, 5)))
    stated = bounds(grid, rule)[2:]
    for rate in (0.39, 0.41, 2.0):
        m = np.full(21, rate)
        ax = INSIDE[rule](FIVES, m).ax
        ax = np.where(has_neighbours(FIVES), found(m).ax, ax) if rule == "keyfitz" else ax
        np.testing.assert_array_equal((ax * m > 1)[2:], rate > stated)
