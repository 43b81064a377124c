"""The laws: known parameters found again, a general optimiser agreed with, gradients, gaps."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.stats import poisson

from engine.ages import AgeGrid
from engine.laws import GOMPERTZ, KANNISTO, LAWS, MAKEHAM, MAKEHAM_INFANT, SILER, Fit, Law, fit
from engine.likelihood import Rows, climb
from tests.engine.stepping import complex_step, largest_error
from tests.published import denmark

OLD = np.arange(70.5, 100)
BOTH = pytest.mark.parametrize("law", [GOMPERTZ, KANNISTO], ids=lambda law: law.key)
WHOLE = pytest.mark.parametrize("law", [MAKEHAM, MAKEHAM_INFANT, SILER], ids=lambda law: law.key)
EVERY = pytest.mark.parametrize("law", LAWS.values(), ids=LAWS)

GRID = AgeGrid((0, 1, *range(5, 105, 5)))  # of the laws of all ages
AGES, WIDTHS = GRID.mids[:-1], GRID.widths[:-1]
CENTRE = float(AGES.mean())
TRUTH = {
    "level": -2.5 + 0.1 * (CENTRE - 85),
    "slope": 0.1,
    "background": -7.6,
    "infant": -4.6,
    "decline": 1.7,
}


def truth(law: Law) -> np.ndarray:
    return np.array([TRUTH[name] for name in law.names])


def old(level: float, slope: float) -> np.ndarray:
    return np.stack(np.broadcast_arrays(level + slope * (OLD.mean() - 85), slope), axis=-1)


def old_counts(law: Law, seed: int, batch: tuple[int, ...] = (), size: float = 4e3) -> np.ndarray:
    """Person-years that thin out, and Poisson deaths: [2, ..., age]."""
    exposure = np.broadcast_to(size * np.exp(-(((OLD - 70) / 15) ** 2)), (*batch, len(OLD)))
    hazard = law.hazard(OLD, old(-2.2, 0.11), float(OLD.mean()))
    drawn = np.random.default_rng(seed).poisson(hazard * exposure)
    return np.stack([drawn.astype(float), exposure])


def expected(law: Law, people: float = 2e7) -> np.ndarray:
    """Person-years on the grid of all ages and the deaths that the law expects of them."""
    exposure = people / 20 * WIDTHS / 5 * np.exp(-(((AGES - 20) / 60) ** 2))
    start = np.zeros(len(AGES))
    rates = replace(fit(law, AGES, start + 1, exposure, widths=WIDTHS), parameters=truth(law)).rates
    return np.stack([rates * exposure, exposure])


def without_background(law: Law) -> np.ndarray:
    """No background, and so few deaths between 5 and 50 that one only harms: [2, age]."""
    exposure = expected(law)[1]
    none = np.where(np.arange(len(law.names)) == law.position("background"), -np.inf, truth(law))
    rates = replace(fit(law, AGES, 0 * AGES + 1, exposure, widths=WIDTHS), parameters=none).rates
    return np.stack([rates * exposure * np.where((AGES > 5) & (AGES < 50), 0.3, 1.0), exposure])


def drawn(law: Law, seed: int, batch: tuple[int, ...] = (), people: float = 2e7) -> np.ndarray:
    deaths, exposure = expected(law, people)
    shape = (*batch, len(AGES))
    counts = np.random.default_rng(seed).poisson(deaths, shape).astype(float)
    return np.stack([counts, np.broadcast_to(exposure, shape)])


def fitted(law: Law, counts: np.ndarray) -> Fit:
    """To groups where a law is one of all ages, to single old ages where it is not."""
    if counts.shape[-1] == len(OLD):
        return fit(law, OLD, counts[0], counts[1])
    return fit(law, AGES, counts[0], counts[1], widths=WIDTHS)


def sample(law: Law, seed: int, batch: tuple[int, ...] = ()) -> np.ndarray:
    if len(law.terms) == 1:
        return old_counts(law, seed, batch)
    return drawn(law, seed, batch)


def mean_over_groups(law: Law, at: np.ndarray, exposure: np.ndarray) -> np.ndarray:
    """The law's rates of the groups of all ages by quadrature, written out without the engine."""
    nodes, weights = np.polynomial.legendre.leggauss(30)
    logs = np.log(exposure / WIDTHS)
    fall = np.empty(len(AGES))
    fall[1:-1] = (logs[:-2] - logs[2:]) / (AGES[2:] - AGES[:-2])
    fall[[0, -1]] = -np.diff(logs)[[0, -1]] / np.diff(AGES)[[0, -1]]
    z = nodes * WIDTHS[:, None] / 2
    present = weights * np.exp(-fall[:, None] * z)
    p, x = dict(zip(law.names, at, strict=True)), AGES[:, None] + z
    mu = np.exp(p["level"] + p["slope"] * (x - CENTRE)) + np.exp(p["background"])
    if law is SILER:
        mu = mu + np.exp(p["infant"] - p["decline"] * x)
    found = (present * mu).sum(axis=1) / present.sum(axis=1)
    if law is MAKEHAM_INFANT:
        found[0] += np.exp(p["infant"])
    return np.asarray(found)


@pytest.mark.fast
@BOTH
@pytest.mark.parametrize(
    ("level", "slope"), [(-2.0, 0.1), (-4.0, 0.2), (-1.0, 0.03), (-3.0, -0.02)]
)
def test_the_law_itself_is_found_again(law: Law, level: float, slope: float) -> None:
    exposure = np.linspace(900, 3, len(OLD))
    hazard = law.hazard(OLD, old(level, slope), float(OLD.mean()))
    found = fit(law, OLD, hazard * exposure, exposure)
    assert found.slope == pytest.approx(slope, rel=1e-11)
    assert found.level + found.slope * (85 - found.centre) == pytest.approx(level, rel=1e-11)


@pytest.mark.fast
@BOTH
@pytest.mark.parametrize("seed", range(3))
def test_a_general_optimiser_finds_the_same(law: Law, seed: int) -> None:
    deaths, exposure = old_counts(law, seed, size=300)

    def minus_log_likelihood(at: np.ndarray) -> float:
        mu = np.exp(at[0] + at[1] * (OLD - OLD.mean()))
        mu = mu / (1 + mu) if law is KANNISTO else mu
        return float(np.sum(exposure * mu - deaths * np.log(mu)))

    best = minimize(minus_log_likelihood, [-2.0, 0.1], method="Nelder-Mead", tol=1e-13)
    found = fit(law, OLD, deaths, exposure)
    np.testing.assert_allclose([found.level, found.slope], best.x, rtol=1e-5)


@pytest.mark.fast
@BOTH
def test_steep_laws_are_found_too(law: Law) -> None:
    """Newton's own steps would run away from some of these."""
    levels, slopes = np.repeat([-6.0, -4.0, -2.0], 3), np.tile([0.1, 0.3, 0.4], 3)
    exposure = 1e4 * np.exp(-(((OLD - 70) / 12) ** 2))
    deaths = law.hazard(OLD, old(levels, slopes), float(OLD.mean())) * exposure
    np.testing.assert_allclose(fit(law, OLD, deaths, exposure).slope, slopes, rtol=1e-9)


@pytest.mark.fast
def test_shapes_of_the_two() -> None:
    """Gompertz rises without end; Kannisto's hazard stays below 1."""
    at, law = np.array([85.0, 130.0]), np.array([-2.0, 0.1])
    np.testing.assert_allclose(GOMPERTZ.hazard(at, law, 85.0), [np.exp(-2), np.exp(2.5)])
    np.testing.assert_allclose(
        KANNISTO.hazard(at, law, 85.0), [1 / (1 + np.exp(2)), 1 / (1 + np.exp(-2.5))]
    )


@pytest.mark.fast
@WHOLE
def test_parameters_of_expected_deaths_are_found_again(law: Law) -> None:
    found = fitted(law, expected(law))
    np.testing.assert_allclose(found.parameters, truth(law), rtol=1e-9)
    assert not found.at_bound.any()
    assert found.deviance == pytest.approx(0, abs=1e-9)


@pytest.mark.fast
@WHOLE
@pytest.mark.parametrize("seed", range(2))
def test_no_optimiser_finds_a_greater_likelihood(law: Law, seed: int) -> None:
    deaths, exposure = drawn(law, seed)
    found = fit(law, AGES, deaths, exposure, widths=WIDTHS)

    def minus_log_likelihood(at: np.ndarray) -> float:
        mu = mean_over_groups(law, at, exposure)
        return float(np.sum(exposure * mu - deaths * np.log(mu)))

    best = minimize(minus_log_likelihood, truth(law), method="BFGS", options={"gtol": 1e-3})
    np.testing.assert_allclose(
        found.rates, mean_over_groups(law, found.parameters, exposure), rtol=1e-9
    )
    assert minus_log_likelihood(found.parameters) <= best.fun + 1e-9
    np.testing.assert_allclose(found.parameters, best.x, atol=2e-3)


@pytest.mark.fast
@WHOLE
def test_a_danish_year_as_a_general_optimiser_fits_it(law: Law) -> None:
    """Women of 1974 in five-year groups: a law that fits badly has its greatest likelihood too."""
    panel = denmark.one("female", 1974).regroup(AgeGrid((0, 1, *range(5, 100, 5))))
    cut = slice(0 if law is not MAKEHAM else 7, len(AGES) - 1)  # to 94, or from 30
    deaths, exposure = panel.deaths[:-1], panel.exposure[:-1]
    found = fit(law, AGES[cut], deaths[cut], exposure[cut], widths=WIDTHS[cut])
    shift = AGES.mean() - found.centre

    def minus_log_likelihood(at: np.ndarray) -> float:
        moved = at.copy()
        moved[0] += at[1] * shift
        padded = np.append(exposure, exposure[-1] ** 2 / exposure[-2])  # goes on thinning out
        mu = mean_over_groups(law, moved, padded)[cut]
        return float(np.sum(exposure[cut] * mu - deaths[cut] * np.log(mu)))

    best = minimize(
        minus_log_likelihood, found.parameters + 0.01, method="Nelder-Mead",
        options={"maxiter": 4000, "maxfev": 4000, "xatol": 1e-7, "fatol": 1e-9},
    )  # fmt: skip
    reached = minus_log_likelihood(np.asarray(found.parameters))
    ends = 2e-4 * deaths.sum()  # the first and last group thin out by another rule
    assert abs(reached - best.fun) < ends
    np.testing.assert_allclose(found.parameters, best.x, atol=0.02)


@pytest.mark.fast
@WHOLE
def test_a_background_that_is_best_at_0_is_held_there(law: Law) -> None:
    """A general optimiser that is free to take any background of at least 0 ends there too."""
    deaths, exposure = without_background(law)
    at = law.position("background")
    others = np.arange(len(law.names)) != at
    found = fit(law, AGES, np.stack([deaths, expected(law)[0]]), exposure, widths=WIDTHS)
    assert found.converged.all()
    assert found.at_bound.sum(axis=0).tolist() == (~others).astype(int).tolist()
    assert np.isneginf(found.parameters[0, at])
    assert np.isnan(found.se[0, at])
    assert np.isfinite(found.se[0, others]).all()

    def minus_log_likelihood(free: np.ndarray) -> float:
        plain = free.copy()
        plain[at] = np.log(free[at] ** 2 * 1e-4 + 1e-300)
        mu = mean_over_groups(law, plain, exposure)
        return float(np.sum(exposure * mu - deaths * np.log(mu)))

    held = np.where(others, found.parameters[0], 0.0)
    begin = np.where(others, held + 0.01, 1.0)
    best = minimize(minus_log_likelihood, begin, method="Nelder-Mead", options={"maxiter": 4000})
    assert best.x[at] ** 2 < 1e-4
    assert minus_log_likelihood(held) <= best.fun + 1e-6
    assert minus_log_likelihood(np.where(others, held, 0.1)) > minus_log_likelihood(held)


@pytest.mark.fast
def test_an_excess_of_the_first_year_that_is_best_at_0_is_held_there() -> None:
    """The law is then the one without infants, or without both."""
    deaths, exposure = expected(MAKEHAM)
    deaths[0] = 0.0
    few = without_background(MAKEHAM)[0]
    few[0] = 0.0
    found = fit(MAKEHAM_INFANT, AGES, np.stack([deaths, few]), exposure, widths=WIDTHS)
    assert found.at_bound.tolist() == [[False, False, False, True], [False, False, True, True]]
    for row, (law, counts) in enumerate(((MAKEHAM, deaths), (GOMPERTZ, few))):
        without = fit(law, AGES, counts, exposure, widths=WIDTHS)
        size = len(law.names)
        np.testing.assert_allclose(found.parameters[row, :size], without.parameters, rtol=1e-9)
        np.testing.assert_allclose(found.se[row, :size], without.se, rtol=1e-9)
        assert np.isneginf(found.parameters[row, size:]).all()
        assert found.aic[row] == pytest.approx(float(without.aic))


@pytest.mark.fast
@pytest.mark.parametrize("name", ["background", "infant"])
def test_a_rate_lost_on_the_way_is_no_rate_at_its_bound(
    name: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A search begun where the rate is nearly 0 holds it at 0; as the likelihood rises when it
    leaves 0, that is no maximum and is not given out as one."""
    law = MAKEHAM_INFANT
    deaths, exposure = drawn(law, 9)
    assert fit(law, AGES, deaths, exposure, widths=WIDTHS).converged
    start = np.where(np.arange(4) == law.position(name), -60.0, truth(law))[None]
    monkeypatch.setattr("engine.laws._start", lambda rows: start)
    found = fit(law, AGES, deaths, exposure, widths=WIDTHS)
    assert not found.converged
    assert not found.at_bound.any()


@pytest.mark.fast
def test_infant_deaths_without_a_best_decline_leave_no_siler_law() -> None:
    """Danish men of 2012: the likelihood grows with the decline for ever, towards infants' deaths
    all in the first year; the law with those has its maximum there."""
    panel = denmark.one("male", 2012).regroup(AgeGrid((0, 1, *range(5, 100, 5))))
    counts = AGES[:20], panel.deaths[:20], panel.exposure[:20]
    siler, infants = (fit(law, *counts, widths=WIDTHS[:20]) for law in (SILER, MAKEHAM_INFANT))
    assert not siler.converged
    assert infants.converged

    groups = replace(siler.groups, thinning=siler.groups.thinning[None])
    rows = Rows(SILER, groups, panel.deaths[None, :20], panel.exposure[None, :20])
    deviances = []
    for decline in (2.0, 5.0, 10.0, 30.0):
        level, slope, background, infant = infants.parameters
        start = np.array([[level, slope, background, infant + np.log(decline), decline]])
        best = climb(rows, start, np.array([[False, False, False, False, True]])).parameters
        deviances.append(float(replace(siler, parameters=best[0]).deviance))
    assert (np.diff(deviances) < 0).all()
    assert deviances[-1] == pytest.approx(float(infants.deviance), rel=1e-6)


@pytest.mark.fast
@pytest.mark.parametrize("growth", [0.0, 0.015])
def test_groups_of_five_years_tell_slope_and_mode(growth: float) -> None:
    """People thin out in a group, by death and by fewer births before: counted, the slope is right
    to 0.1 % and the mode to 0.01 of a year; at the middle of groups the slope is 1 % too low."""
    a, b = 2e-5, 0.105
    x = np.arange(0.005, 125, 0.01)
    alive = np.exp(-a / b * np.expm1(b * x) - growth * x)
    starts = np.arange(30.0, 100, 5)
    cells = (x[:, None] >= starts) & (x[:, None] < starts + 5)
    exposure = 1e6 * 0.01 * (alive[:, None] * cells).sum(axis=0)
    deaths = 1e6 * 0.01 * ((alive * a * np.exp(b * x))[:, None] * cells).sum(axis=0)
    wide = fit(GOMPERTZ, starts + 2.5, deaths, exposure, widths=np.full(14, 5.0))
    middle = fit(GOMPERTZ, starts + 2.5, deaths, exposure)
    mode = wide.centre + (np.log(wide.slope) - wide.level) / wide.slope
    assert wide.slope == pytest.approx(b, rel=1e-3)
    assert mode == pytest.approx(np.log(b / a) / b, abs=0.01)
    assert middle.slope < 0.99 * b


@pytest.mark.fast
@EVERY
def test_standard_errors_hold_what_they_say(law: Law) -> None:
    """1,500 samples: each parameter's limits hold the truth in 95 %, within chance (3.4 sd)."""
    counts = sample(law, 11, (1500,))
    found = fitted(law, counts)
    true = truth(law) if len(law.terms) > 1 else old(-2.2, 0.11)
    inside = np.abs(found.parameters - true) < 1.96 * found.se
    assert found.converged.mean() > 0.99
    held = inside[found.converged & ~found.at_bound.any(axis=-1)].mean(axis=0)
    np.testing.assert_allclose(held, 0.95, atol=0.019)


@pytest.mark.fast
@EVERY
def test_a_hundred_times_as_many_deaths(law: Law) -> None:
    counts = sample(law, 3)
    small, large = fitted(law, counts), fitted(law, 100 * counts)
    np.testing.assert_allclose(large.parameters, small.parameters, rtol=1e-9)
    np.testing.assert_allclose(large.se, small.se / 10, rtol=1e-7)
    np.testing.assert_allclose(large.residuals, 10 * small.residuals, rtol=1e-6, atol=1e-4)
    assert large.deviance == pytest.approx(100 * small.deviance, rel=1e-9)


@pytest.mark.fast
@EVERY
def test_deviance_and_criterion_by_scipy(law: Law) -> None:
    counts = sample(law, 8)
    found = fitted(law, counts)
    deaths, mean = counts[0], counts[1] * found.rates
    at, own = poisson.logpmf(deaths, mean), poisson.logpmf(deaths, deaths)
    assert found.deviance == pytest.approx(2 * np.sum(own - at), rel=1e-9)
    assert found.aic == pytest.approx(2 * len(law.names) - 2 * at.sum(), rel=1e-11)
    np.testing.assert_allclose(found.residuals**2, 2 * (own - at), atol=1e-9)
    np.testing.assert_array_equal(found.residuals > 0, deaths > mean)


@pytest.mark.fast
def test_a_background_held_at_0_is_no_parameter_to_the_criterion() -> None:
    deaths, exposure = without_background(MAKEHAM)
    with_it = fit(MAKEHAM, AGES, deaths, exposure, widths=WIDTHS)
    without = fit(GOMPERTZ, AGES, deaths, exposure, widths=WIDTHS)
    np.testing.assert_allclose(with_it.parameters[:2], without.parameters, rtol=1e-9)
    np.testing.assert_allclose(with_it.se[:2], without.se, rtol=1e-9)
    assert with_it.aic == pytest.approx(float(without.aic), rel=1e-12)


@pytest.mark.fast
@EVERY
def test_the_information_is_minus_the_curvature(law: Law) -> None:
    """Of the log likelihood, whose first derivative is taken by complex step and the second by
    differences of that."""
    counts = sample(law, 5)
    found = fitted(law, counts)

    def score(at: np.ndarray) -> np.ndarray:
        slopes = np.empty(len(at))
        for j in range(len(at)):
            beside = at.astype(complex)
            beside[j] += 1e-30j
            mu = replace(found, parameters=beside).rates
            slopes[j] = np.sum(counts[0] * np.log(mu) - counts[1] * mu).imag / 1e-30
        return slopes

    steps = 1e-5 * np.eye(len(law.names))
    curvature = [
        (score(found.parameters - step) - score(found.parameters + step)) / 2e-5 for step in steps
    ]
    scale = np.sqrt(np.diag(found.information))
    relative = (np.array(curvature) - found.information) / np.outer(scale, scale)
    np.testing.assert_allclose(relative, 0, atol=1e-5)
    np.testing.assert_allclose(found.covariance @ found.information, np.eye(len(scale)), atol=1e-9)


@pytest.mark.fast
@EVERY
def test_the_pullback_is_the_derivative(law: Law) -> None:
    counts = sample(law, 2, (3,))
    mx, beyond = counts[0] / counts[1], np.arange(90.5, 131)
    weights = np.random.default_rng(0).normal(size=(3, len(beyond)))

    def value(at: np.ndarray) -> np.ndarray:
        there = fitted(law, np.stack([at * counts[1], counts[1]]))
        return np.asarray((weights * there.hazard(beyond)).sum(axis=-1))

    found = fitted(law, counts).pull(beyond, weights)
    assert largest_error(found, complex_step(value, mx)) < 1e-12


@pytest.mark.fast
@WHOLE
def test_the_pullback_where_the_background_is_held(law: Law) -> None:
    deaths, exposure = without_background(law)
    weights = np.random.default_rng(3).normal(size=len(law.names))

    def value(at: np.ndarray) -> np.ndarray:
        found = fit(law, AGES, at * exposure, exposure, widths=WIDTHS)
        assert found.at_bound.any()
        return np.asarray((weights * np.where(found.at_bound, 0.0, found.parameters)).sum(-1))

    mx = deaths / exposure
    found = fit(law, AGES, deaths, exposure, widths=WIDTHS).pull_parameters(weights)
    assert largest_error(found, complex_step(value, mx)) < 1e-12


@pytest.mark.fast
@EVERY
def test_each_population_is_fitted_for_itself(law: Law) -> None:
    """Bit for bit, though small and large ones need different numbers of steps."""
    deaths, exposure = sample(law, 1, (40,)).copy()
    deaths[:10], exposure[:10] = deaths[:10] // 40, exposure[:10] / 40
    deaths[3] = 0
    together = fitted(law, np.stack([deaths, exposure]))
    for row in range(40):
        alone = fitted(law, np.stack([deaths[row], exposure[row]]))
        np.testing.assert_array_equal(alone.parameters, together.parameters[row])
        np.testing.assert_array_equal(alone.se, together.se[row])
        np.testing.assert_array_equal(alone.at_bound, together.at_bound[row])
    halves = [fitted(law, np.stack([deaths[part], exposure[part]])) for part in np.s_[:17, 17:]]
    np.testing.assert_array_equal(
        np.concatenate([half.parameters for half in halves]), together.parameters
    )
    assert np.isnan(together.parameters[3]).all()
    assert together.converged[10:].all()


@pytest.mark.fast
@EVERY
def test_no_fit_where_there_is_nothing_to_fit(law: Law) -> None:
    deaths, exposure = sample(law, 4)
    no_years, gap = exposure * 0, deaths.copy()
    no_years[: len(law.names) - 1 if len(law.names) > 2 else 2] = 10
    gap[3] = np.nan
    found = fitted(
        law,
        np.stack(
            [
                np.stack([deaths * 0, deaths, gap, deaths]),
                np.stack([exposure, no_years, exposure, exposure]),
            ]
        ),
    )
    np.testing.assert_array_equal(found.converged, [False, False, False, True])
    for gone in (found.se, found.deviance, found.aic, found.residuals, found.hazard(OLD)):
        assert np.isnan(gone[:3]).all()


@pytest.mark.fast
@BOTH
def test_deaths_at_one_age_alone_have_no_law(law: Law) -> None:
    """The likelihood rises for ever with the slope."""
    deaths, exposure = old_counts(law, 4)
    deaths[:] = 0
    deaths[-1] = 5
    assert np.isnan(fit(law, OLD, deaths, exposure).slope)


@pytest.mark.fast
@WHOLE
def test_rates_that_fall_with_age_are_no_law_of_several_terms(law: Law) -> None:
    exposure = expected(law)[1]
    rates = 0.02 * np.exp(-0.03 * AGES)
    assert not fit(law, AGES, rates * exposure, exposure, widths=WIDTHS).converged


@pytest.mark.fast
@EVERY
def test_an_age_without_person_years_is_left_out(law: Law) -> None:
    deaths, exposure = sample(law, 6)
    empty, years = deaths.copy(), exposure.copy()
    empty[12], years[12] = 7.0, 0.0
    with_it = fitted(law, np.stack([empty, years]))
    empty[12] = 0.0
    np.testing.assert_array_equal(
        with_it.parameters, fitted(law, np.stack([empty, years])).parameters
    )
    assert with_it.residuals[12] == 0
    moved = with_it.per_death(np.ones(len(law.names)))
    assert moved[12] == 0
    np.testing.assert_allclose(
        moved * years, with_it.pull_parameters(np.ones(len(law.names))), rtol=1e-12
    )
    assert with_it.converged
