"""Brass's relation: laws of the logit, a general optimiser, chance, gaps."""

import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.special import xlogy
from scipy.stats import binom

from engine.chain import run
from engine.relational import relate, relate_counts, shift
from engine.settings import SETTINGS
from tests.factories import GRIDS, gompertz_panel
from tests.published import denmark

PLAIN = SETTINGS["almanac-1"]
STANDARD = run(gompertz_panel(), PLAIN).table.lx


def bent(alpha: float, beta: float, lx: np.ndarray = STANDARD) -> np.ndarray:
    """The implied table by its textbook formula."""
    with np.errstate(divide="ignore"):
        return 1 / (1 + np.exp(2 * alpha + beta * np.log((1 - lx) / lx)))


def entered(lx: np.ndarray, people: float = 40_000) -> np.ndarray:
    return people * lx[..., :-1]


def dying(lx: np.ndarray) -> np.ndarray:
    return 1 - lx[..., 1:] / lx[..., :-1]


@pytest.mark.parametrize("grid", ["abridged", "single", "irregular"])
def test_the_standard_is_at_level_0_and_shape_1_of_itself(grid: str) -> None:
    chain = run(gompertz_panel(GRIDS[grid], slope=np.array([0.08, 0.11])), PLAIN)
    own = relate(chain, chain.table.lx)
    np.testing.assert_allclose(own.alpha, 0, atol=1e-9)
    np.testing.assert_allclose(own.beta, 1, atol=1e-9)
    np.testing.assert_allclose(own.lx, chain.table.lx, atol=1e-10)
    np.testing.assert_allclose(own.deviance, 0, atol=1e-6)


@pytest.mark.parametrize(("alpha", "beta"), [(-0.4, 1.0), (0.3, 1.3), (0.0, 0.7), (1.2, 1.6)])
def test_a_bent_standard_gives_its_level_and_shape_back(alpha: float, beta: float) -> None:
    lx = bent(alpha, beta)
    got = relate_counts(entered(lx) * dying(lx), entered(lx), STANDARD)
    assert (got.alpha, got.beta) == (pytest.approx(alpha, abs=1e-8), pytest.approx(beta, abs=1e-8))
    np.testing.assert_allclose(got.lx, lx, atol=1e-9)
    back = relate_counts(entered(STANDARD) * dying(STANDARD), entered(STANDARD), lx)
    assert back.beta == pytest.approx(1 / beta, abs=1e-7)
    assert back.alpha == pytest.approx(-alpha / beta, abs=1e-7)


def test_estimate_and_deviance_are_those_of_a_general_optimiser() -> None:
    chain = run(denmark.one("male", 1980), PLAIN)
    standard = run(denmark.one("female", 2000), PLAIN).table.lx
    got = relate(chain, standard)
    known = np.diff(standard) < 0
    n = (chain.panel.exposure[:-1] + (1 - chain.table.ax[:-1]) * chain.panel.deaths[:-1])[known]
    dead = chain.panel.deaths[:-1][known]

    def loss(q: np.ndarray) -> float:
        return -2 * float((xlogy(dead, q) + xlogy(n - dead, 1 - q)).sum())

    best = minimize(
        lambda at: loss(dying(bent(at[0], at[1], standard))[known]),
        [0.0, 1.0],
        method="Nelder-Mead",
        options={"xatol": 1e-7, "fatol": 1e-7},
    )
    np.testing.assert_allclose([got.alpha, got.beta], best.x, atol=2e-5)
    assert got.deviance == pytest.approx(best.fun - loss(dead / n), rel=1e-5)
    assert got.freedom == known.sum() - 2


def test_chance_moves_level_and_shape_as_the_errors_say() -> None:
    lx = bent(0.2, 1.1)
    n = np.round(entered(lx))
    deaths = binom.rvs(n.astype(int), dying(lx), size=(2000, len(n)), random_state=3).astype(float)
    got = relate_counts(deaths, n, STANDARD)
    for column, truth in (("alpha", 0.2), ("beta", 1.1)):
        found, error = getattr(got, column), getattr(got, f"{column}_error")
        assert found.std() / error.mean() == pytest.approx(1, abs=0.06)
        assert found.mean() == pytest.approx(truth, abs=3 * error.mean() / np.sqrt(2000) + 1e-3)
    assert got.deviance.mean() == pytest.approx(got.freedom[0], rel=0.1)


def test_more_deaths_at_every_age_raise_the_level_and_steeper_ones_the_shape() -> None:
    chain = run(
        gompertz_panel(
            level=np.array([2e-5, 3e-5, 2e-5 * np.exp(-75 * 0.01)]),
            slope=np.array([0.1, 0.1, 0.11]),
        ),
        PLAIN,
    )
    got = relate(chain, STANDARD)
    assert got.alpha[1] > got.alpha[0] + 0.1
    assert got.beta[2] > got.beta[0] + 0.05


def test_a_shift_is_this_less_that() -> None:
    tables = [bent(0.1, 1.0), bent(-0.3, 1.2)]
    this, that = (relate_counts(entered(lx) * dying(lx), entered(lx), STANDARD) for lx in tables)
    got = shift(this, that)
    assert got.alpha == pytest.approx(0.4, abs=1e-7)
    assert got.beta == pytest.approx(-0.2, abs=1e-7)
    assert got.alpha_error**2 == pytest.approx(this.alpha_error**2 + that.alpha_error**2)
    assert got.beta_error**2 == pytest.approx(this.beta_error**2 + that.beta_error**2)
    with pytest.raises(ValueError, match="the standards differ"):
        shift(this, relate_counts(entered(tables[0]), entered(tables[0]), tables[0]))


def test_gaps() -> None:
    panel = gompertz_panel(seed=3, people=20_000, slope=np.full(5, 0.1))
    panel.deaths[1] = 0
    panel.deaths[2, 4] = np.nan
    panel.deaths[3, 2:6] = 0  # nobody died in some groups
    got = relate(run(panel, PLAIN), STANDARD)
    assert np.isnan(got.alpha).tolist() == [False, True, True, False, False]
    np.testing.assert_array_equal(np.isnan(got.beta_error), np.isnan(got.alpha))
    few = relate_counts(np.array([3.0, 1.0]), np.array([0.0, 100.0]), np.array([1.0, 0.9, 0.8]))
    assert np.isnan(few.alpha)


def test_a_group_in_which_nobody_of_the_standard_dies_is_passed_over() -> None:
    standard = np.insert(STANDARD, 3, STANDARD[3])  # the same survivors once more
    lx = bent(0.3, 1.2)
    n, deaths = entered(lx), entered(lx) * dying(lx)
    got = relate_counts(np.insert(deaths, 3, 7.0), np.insert(n, 3, n[3]), standard)
    assert (got.alpha, got.beta) == (pytest.approx(0.3, abs=1e-8), pytest.approx(1.2, abs=1e-8))
    assert got.freedom == len(n) - 2


def test_rows_do_not_know_one_another() -> None:
    chain = run(gompertz_panel(seed=3, people=50_000, slope=np.linspace(0.08, 0.11, 9)), PLAIN)
    whole = relate(chain, STANDARD)
    for where in (slice(0, 1), slice(2, 7), 8):
        part = relate(run(chain.panel[where], PLAIN), STANDARD)
        for name in ("alpha", "beta", "alpha_error", "deviance", "lx"):
            np.testing.assert_array_equal(getattr(part, name), getattr(whole, name)[where])


def test_what_is_refused() -> None:
    with pytest.raises(ValueError, match="22 ages but there are 20 groups"):
        relate_counts(np.ones(20), np.full(20, 50.0), STANDARD)
