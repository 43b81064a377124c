"""The most common age at death: smooth peak, parabola, and age group."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import brentq

from engine.ages import AgeGrid
from engine.chain import run
from engine.indicators import INDICATORS, estimate
from engine.indicators.modes import _noise, _peak
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.smoothing import Basis, fit
from engine.streams import poisson_draws
from tests.factories import GRIDS, codes, gompertz_panel
from tests.studies.smoothness import measure

SETTINGS_1 = SETTINGS["almanac-1"]
MODE, RAW, PARABOLA = (INDICATORS[key] for key in ("mode", "mode_raw", "mode_parabola"))


def law(level: float, slope: float, accidents: float = 0.0) -> float:
    """Mode of a Gompertz-Makeham law: where mu' = mu^2."""
    mu = lambda x: accidents + level * np.exp(slope * x)  # noqa: E731
    return float(brentq(lambda x: slope * (mu(x) - accidents) - mu(x) ** 2, 50, 110))


@pytest.mark.parametrize("slope", [0.08, 0.095, 0.12])
def test_the_smooth_peak_of_a_law_is_its_mode(slope: float) -> None:
    level = 0.1 / np.exp(82 * slope)
    single = gompertz_panel(GRIDS["single"], slope=slope, level=level, accidents=0)
    got = MODE.value(run(single, SETTINGS_1))
    assert got == pytest.approx(law(level, slope), abs=0.005)
    coarse = gompertz_panel(GRIDS["abridged"], slope=slope, level=level, accidents=0)
    assert MODE.value(run(coarse, SETTINGS_1)) == pytest.approx(law(level, slope), abs=0.005)


def test_the_peak_is_where_the_curve_of_deaths_is_highest() -> None:
    panel = gompertz_panel(GRIDS["single"], people=40_000, seed=9)
    inside = slice(10, 100)
    basis = Basis(10, 100, 18)
    curve = fit(basis, panel.grid.mids[inside], panel.deaths[inside], panel.exposure[inside])
    fine = np.linspace(10, 100, 900_001)
    mu = np.exp(curve.log_rates(fine))
    reach = np.exp(-np.append(0, np.cumsum((mu[1:] + mu[:-1]) / 2 * 1e-4)))
    assert _peak(curve) == pytest.approx(fine[np.argmax(mu * reach)], abs=0.005)
    assert MODE.value(run(panel, SETTINGS_1)) == _peak(curve)


def simulated(panel: Panel, name: str, draws: int = 200) -> Panel:
    deaths = poisson_draws(panel.deaths, codes(panel, name), draws, "example")
    shape = deaths.shape[:-1]
    parts = {
        part: np.broadcast_to(getattr(panel, part), (*shape, getattr(panel, part).shape[-1]))
        for part in ("exposure", "infant_weight", "infant_ratio")
    }
    return replace(panel, deaths=deaths, **parts)


def test_simulated_peaks_spread_as_the_counts_leave_them_open() -> None:
    panel = gompertz_panel(people=1e6, seed=4)
    observed = run(panel, SETTINGS_1)
    peaks = MODE.drawn(observed, run(simulated(panel, "isle"), SETTINGS_1))
    assert np.isfinite(peaks).all()
    assert np.median(peaks) == pytest.approx(MODE.value(observed), abs=0.3)
    again = MODE.drawn(observed, run(simulated(panel, "isle"), SETTINGS_1))
    np.testing.assert_array_equal(again, peaks)


def test_noise_is_each_populations_own() -> None:
    """Two with the same counts and streams of their own move apart; the same stream, together."""
    deaths = np.random.default_rng(3).poisson(40.0, (2000, 3, 6)).astype(float)
    deaths[:, 2] = deaths[:, 0]
    noise = _noise(deaths, 4)
    np.testing.assert_array_equal(noise[:, 2], noise[:, 0])
    np.testing.assert_array_equal(_noise(deaths[:, 1], 4), noise[:, 1])
    together = np.corrcoef(noise[:, :2].reshape(2000, -1).T)
    np.testing.assert_allclose(together, np.eye(8), atol=0.1)
    np.testing.assert_allclose(noise.std(axis=0), 1, atol=0.06)


def test_infants_and_the_open_group_are_no_adult_mode() -> None:
    panel = gompertz_panel(infant=0.4, seed=1, people=2e6)
    chain = run(panel, SETTINGS_1)
    assert chain.table.dx[0] == chain.table.dx.max()
    for indicator in (MODE, RAW, PARABOLA):
        assert 70 < indicator.value(chain) < 90
    ends = run(panel.regroup(AgeGrid((0, 1, *range(5, 76, 5)))), SETTINGS_1)
    for indicator in (MODE, RAW, PARABOLA):
        assert np.isnan(indicator.value(ends))


def test_the_parabola_passes_through_three_groups() -> None:
    panel = gompertz_panel(seed=1, people=2e6)
    chain = run(panel, SETTINGS_1)
    start, groups = int(RAW.value(chain)), panel.grid
    i = groups.position(start)
    d = chain.table.dx[i - 1 : i + 2]
    mids = np.array([-2.5, 2.5, 7.5]) + start  # a parabola through heights at the middles
    a, b, _ = np.polyfit(mids, d, 2)
    assert PARABOLA.value(chain) == pytest.approx(-b / (2 * a), abs=1e-8)


def test_wide_groups_count_by_deaths_per_year_of_age() -> None:
    grid = AgeGrid((0, 1, 5, 10, 40, 60, 70, 75, 80, 82, 85, 90, 95, 100))
    panel = gompertz_panel(GRIDS["single"], people=2e6).regroup(grid)
    chain = run(panel, SETTINGS_1)
    density = chain.table.dx[3:-1] / grid.widths[3:-1]
    assert RAW.value(chain) == grid.starts[3:-1][int(np.argmax(density))]
    assert chain.table.dx[3:-1].argmax() != density.argmax()
    assert np.isnan(PARABOLA.value(chain))  # its neighbours are of another width


@pytest.mark.parametrize("seed", range(3))
def test_the_simulated_interval_has_the_width_of_repeated_counts(seed: int) -> None:
    truth = gompertz_panel(people=1e6)
    rng = np.random.default_rng(seed)
    repeats = rng.poisson(truth.deaths, (500, len(truth.grid))).astype(float)
    mix = {
        n: np.broadcast_to(getattr(truth, n), (500, 2)) for n in ("infant_weight", "infant_ratio")
    }
    exposure = np.broadcast_to(truth.exposure, repeats.shape)
    modes = MODE.value(run(replace(truth, deaths=repeats, exposure=exposure, **mix), SETTINGS_1))
    low, high = np.quantile(modes, [0.025, 0.975])
    got = estimate(
        MODE, replace(truth, deaths=repeats[0]), SETTINGS_1, streams=codes(truth, f"isle{seed}")
    )
    assert 0.5 < (got.high - got.low) / (high - low) < 1.6


@pytest.mark.parametrize(
    ("truth", "ages", "least"), [("law", "abridged", 0.93), ("men 2008-2012", "single", 0.8)]
)
def test_the_interval_holds_the_mode_of_what_was_drawn_from(
    truth: str, ages: str, least: float
) -> None:
    """The short form of the study, in which they held 99 and 90 per cent."""
    quick = replace(SETTINGS_1, draws=100)
    (held,) = measure(["mode"], quick, truth, ages, persons=100_000, replicates=100)
    assert held.covered >= least
