"""Penalised Poisson fits against a dense fit written apart, and their limits."""

import numpy as np
import pytest
from scipy.interpolate import BSpline

from engine.smoothing import PENALTIES, Basis, Curve, fit
from tests.factories import GRIDS, gompertz_panel

GRID = GRIDS["abridged"]
AGES, INSIDE = GRID.mids[3:-1], slice(3, -1)
BASIS = Basis(10, 100, 18)


def counts(**law: float) -> tuple[np.ndarray, np.ndarray]:
    panel = gompertz_panel(GRID, seed=11, **law)
    return panel.deaths[..., INSIDE], panel.exposure[..., INSIDE]


def dense_basis(ages: np.ndarray) -> np.ndarray:
    knots = 10 + 5.0 * np.arange(-3, 22)
    return BSpline.design_matrix(ages, knots, 3).toarray()


def dense_fit(deaths: np.ndarray, years: np.ndarray, weight: float) -> tuple[np.ndarray, float]:
    """Newton's method on full matrices: coefficients and the information criterion."""
    b = dense_basis(AGES)
    d2 = np.diff(np.eye(b.shape[1]), 2, axis=0)
    penalty = weight * d2.T @ d2
    found = np.full(b.shape[1], np.log(deaths.sum() / years.sum()))
    for _ in range(200):
        mu = years * np.exp(b @ found)
        step = np.linalg.solve(
            b.T @ (mu[:, None] * b) + penalty, b.T @ (deaths - mu) - penalty @ found
        )
        found = found + step / max(1.0, np.abs(step).max())
    mu = years * np.exp(b @ found)
    information = b.T @ (mu[:, None] * b)
    dimension = np.trace(np.linalg.solve(information + penalty, information))
    logs = np.where(deaths > 0, deaths * np.log(np.where(deaths > 0, deaths, 1) / mu), 0)
    return found, float(2 * (logs - deaths + mu).sum() + np.log(len(deaths)) * dimension)


def test_the_splines_are_those_of_the_library() -> None:
    ages = np.linspace(10, 99.99, 301)
    design = BASIS.at(ages)
    full = np.zeros((len(ages), BASIS.size))
    np.put_along_axis(full, design.first[:, None] + np.arange(4), design.local, axis=1)
    np.testing.assert_allclose(full, dense_basis(ages), atol=1e-12)
    assert BASIS.at(np.array([100.0])).local.sum() == pytest.approx(1)


@pytest.mark.parametrize("people", [20_000, 5_000_000])
def test_the_fit_and_its_penalty_are_those_of_a_dense_fit(people: float) -> None:
    deaths, years = counts(people=people, slope=0.095)
    curve = fit(BASIS, AGES, deaths, years)
    fits = [dense_fit(deaths, years, weight) for weight in PENALTIES]
    best = int(np.argmin([score for _, score in fits]))
    assert curve.penalty == PENALTIES[best]
    np.testing.assert_allclose(curve.coefficients, fits[best][0], atol=1e-7)
    np.testing.assert_allclose(curve.log_rates(AGES), dense_basis(AGES) @ fits[best][0], atol=1e-7)


def test_a_started_fit_keeps_the_penalty_and_does_not_depend_on_the_start() -> None:
    deaths, years = counts()
    far = Curve(BASIS, np.full(BASIS.size, -3.0), np.array(100.0))
    near = Curve(BASIS, dense_fit(deaths, years, 100.0)[0], np.array(100.0))
    one, two = (fit(BASIS, AGES, deaths, years, start=start) for start in (far, near))
    assert one.penalty == two.penalty == 100
    np.testing.assert_allclose(one.coefficients, two.coefficients, atol=1e-8)


def test_a_heavy_penalty_leaves_a_straight_line() -> None:
    deaths, years = counts(accidents=0.0)
    heavy = Curve(BASIS, np.full(BASIS.size, -3.0), np.array(1e7))
    curve = fit(BASIS, AGES, deaths, years, start=heavy)
    bend = np.diff(curve.log_rates(np.arange(10.0, 100.0)), 2)
    assert np.abs(bend).max() < 2e-5


def test_the_total_of_deaths_is_kept() -> None:
    deaths, years = counts()
    curve = fit(BASIS, AGES, deaths, years)
    fitted = years * np.exp(curve.log_rates(AGES))
    assert fitted.sum() == pytest.approx(deaths.sum(), rel=1e-9)


def test_rows_do_not_know_one_another() -> None:
    panel = gompertz_panel(GRID, seed=4, slope=np.linspace(0.08, 0.12, 33), people=50_000)
    deaths, years = panel.deaths[:, INSIDE].copy(), panel.exposure[:, INSIDE].copy()
    deaths[5] = 0
    deaths[9, 4] = np.nan
    together = fit(BASIS, AGES, deaths, years)
    assert np.isnan(together.coefficients).any(axis=-1).nonzero()[0].tolist() == [5, 9]
    for where in (slice(0, 1), slice(1, 14), slice(14, 33), 7, 9):
        part = fit(BASIS, AGES, deaths[where], years[where])
        np.testing.assert_array_equal(part.coefficients, together.coefficients[where])
        np.testing.assert_array_equal(part.penalty, together.penalty[where])
        again = fit(BASIS, AGES, deaths[where] + 1, years[where], start=part)
        whole = fit(BASIS, AGES, deaths + 1, years, start=together)
        np.testing.assert_array_equal(again.coefficients, whole.coefficients[where])


def test_an_age_without_person_years_has_no_weight() -> None:
    deaths, years = counts()
    years[6], deaths[6] = 0.0, 0.0
    curve = fit(BASIS, AGES, deaths, years)
    kept = np.arange(len(AGES)) != 6
    without = fit(BASIS, AGES[kept], deaths[kept], years[kept])
    np.testing.assert_allclose(curve.log_rates(AGES), without.log_rates(AGES), atol=1e-9)


def test_a_wide_last_group_leaves_the_last_spline_to_the_penalty() -> None:
    ages = np.array([12.5, 20.0, 35.0, 50.0, 65.0, 77.5, 90.0])
    years = np.full(7, 1e5)
    deaths = years * 3e-5 * np.exp(0.1 * ages)
    curve = fit(BASIS, ages, deaths, years)
    np.testing.assert_allclose(curve.log_rates(ages), np.log(3e-5) + 0.1 * ages, atol=1e-6)
    assert curve.log_rates(np.array([100.0])) == pytest.approx(np.log(3e-5) + 10, abs=1e-4)
