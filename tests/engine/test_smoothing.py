"""Penalised Poisson fits against a dense fit written apart, and their limits."""

import numpy as np
import pytest
from scipy.interpolate import BSpline
from scipy.stats import poisson

from engine.smoothing import PENALTIES, Basis, Curve, fit, fit_each, posterior_curves
from tests.engine.stepping import complex_step, largest_error
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


def information(deaths: np.ndarray, years: np.ndarray, weight: float) -> np.ndarray:
    b = dense_basis(AGES)
    fitted = years * np.exp(b @ dense_fit(deaths, years, weight)[0])
    d2 = np.diff(np.eye(b.shape[1]), 2, axis=0)
    return b.T @ (fitted[:, None] * b) + weight * d2.T @ d2


def test_errors_dimension_and_evidence_are_those_of_dense_algebra() -> None:
    deaths, years = counts(people=80_000)
    fine = np.linspace(11, 99, 30)
    tried = fit_each(BASIS, AGES, deaths, years)
    assert tried.penalty.tolist() == PENALTIES.tolist()
    for i, weight in enumerate(PENALTIES):
        full = information(deaths, years, weight)
        d2 = np.diff(np.eye(BASIS.size), 2, axis=0)
        data = full - weight * d2.T @ d2
        assert tried.dimension[i] == pytest.approx(np.trace(np.linalg.solve(full, data)), rel=1e-7)
        spread = dense_basis(fine) @ np.linalg.inv(full) @ dense_basis(fine).T
        np.testing.assert_allclose(
            tried.standard_errors(fine)[i], np.sqrt(np.diag(spread)), rtol=1e-6
        )
        found, bic = dense_fit(deaths, years, weight)
        assert tried.bic[i] == pytest.approx(bic, rel=1e-8)
        mu = years * np.exp(dense_basis(AGES) @ found)
        likelihood = poisson.logpmf(deaths, mu).sum() - poisson.logpmf(deaths, deaths).sum()
        prior = (BASIS.size - 2) / 2 * np.log(weight) - weight / 2 * ((d2 @ found) ** 2).sum()
        laplace = likelihood + prior - np.linalg.slogdet(full)[1] / 2
        assert tried.evidence[i] == pytest.approx(-2 * laplace, rel=1e-8)


@pytest.mark.parametrize("weight", [1.0, 1000.0])
def test_the_pullback_is_the_complex_step(weight: float) -> None:
    panel = gompertz_panel(GRID, seed=4, slope=np.array([0.09, 0.11]), people=50_000)
    deaths, years = panel.deaths[:, INSIDE], panel.exposure[:, INSIDE]
    start = Curve(BASIS, np.full(BASIS.size, -3.0), np.array(weight))
    at = np.array([10.0, 33.3, 70.0, 99.9])
    g = np.random.default_rng(1).standard_normal((2, 4))

    def value(mx: np.ndarray) -> np.ndarray:
        return (fit(BASIS, AGES, mx * years, years, start=start).log_rates(at) * g).sum(axis=-1)

    pulled = fit(BASIS, AGES, deaths, years, start=start).pull(at, g)
    assert largest_error(pulled, complex_step(value, deaths / years)) < 1e-10


def test_an_imaginary_part_settles_though_the_real_one_is_there_from_the_start() -> None:
    deaths, years = counts(people=50_000)
    there = fit(BASIS, AGES, deaths, years)
    near = Curve(BASIS, there.coefficients + 6e-8 * np.cos(np.arange(BASIS.size)), there.penalty)
    at, g = np.array([75.0]), np.ones(1)
    beside = fit(BASIS, AGES, deaths + 1e-30j * years, years, start=near).log_rates(at).imag
    assert beside / 1e-30 == pytest.approx(there.pull(at, g).sum(), rel=1e-9)


def test_complex_counts_keep_the_penalty_of_their_real_part() -> None:
    deaths, years = counts()
    real, beside = (fit(BASIS, AGES, part, years) for part in (deaths, deaths * (1 + 1e-30j)))
    assert beside.penalty == real.penalty
    np.testing.assert_allclose(beside.coefficients.real, real.coefficients, atol=1e-12)
    fitted = years * np.exp(beside.log_rates(AGES))
    assert fitted.imag.sum() == pytest.approx(1e-30 * deaths.sum(), rel=1e-9)


def test_posterior_curves_spread_by_the_inverse_information() -> None:
    deaths, years = counts(people=100_000)
    rng, draws = np.random.default_rng(6), 40_000
    tried = fit_each(BASIS, AGES, deaths, years)
    drawn = rng.poisson(deaths, (draws, len(deaths))).astype(float)
    curves = posterior_curves(tried, drawn, rng.standard_normal((draws, BASIS.size - 1)))
    likely = np.exp((tried.evidence.min() - tried.evidence) / 2)
    likely /= likely.sum()
    shares = np.array([(curves.penalty == weight).mean() for weight in PENALTIES])
    np.testing.assert_allclose(shares, likely, atol=0.01)
    for i in np.flatnonzero(likely > 0.1):
        of = curves.coefficients[curves.penalty == PENALTIES[i]]
        np.testing.assert_allclose(of.mean(axis=0), tried.coefficients[i], atol=0.05)
        full = information(deaths, years, PENALTIES[i])
        fitted = full - PENALTIES[i] * (d2 := np.diff(np.eye(BASIS.size), 2, axis=0)).T @ d2
        b, inverse = dense_basis(AGES), np.linalg.inv(full)
        by_chance = b.T @ (deaths[:, None] * b) - fitted  # around the counts, not those fitted
        spread = np.diag(inverse + inverse @ by_chance @ inverse)
        np.testing.assert_allclose(of.var(axis=0), spread, rtol=0.08)


def test_curves_of_shared_deaths_move_together() -> None:
    deaths, years = counts(people=5e6)
    rng = np.random.default_rng(6)
    tried = fit_each(BASIS, AGES, deaths, years)
    drawn = rng.poisson(deaths, (4000, len(deaths))).astype(float)
    one, other = (
        posterior_curves(tried, drawn, rng.standard_normal((4000, BASIS.size - 1))).log_rates(
            np.array([80.0])
        )
        for _ in range(2)
    )
    assert np.corrcoef(one[:, 0], other[:, 0])[0, 1] > 0.5
