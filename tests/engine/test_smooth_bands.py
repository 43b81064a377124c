"""Curves averaged over their penalties, and bands that hold what they say."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine.ages import AgeGrid, Array
from engine.panel import Panel
from engine.smooth_bands import averaged
from engine.smoothing import Basis, Fit, fit, fit_each
from tests.factories import GRIDS, gompertz_panel, gompertz_rates

FIVE = GRIDS["abridged"]
ADULT = slice(3, len(FIVE) - 1)  # closed groups from 10
AGES = FIVE.mids[ADULT]
BASIS = Basis(10, 100, 18)


def tried(*panels: Panel) -> Fit:
    deaths, exposure = (
        np.stack([getattr(panel, name)[ADULT] for panel in panels])
        for name in ("deaths", "exposure")
    )
    return fit_each(BASIS, AGES, deaths, exposure)


def drawn(people: float, seeds: range, grid: AgeGrid = FIVE) -> list[Panel]:
    return [gompertz_panel(grid, people=people, seed=seed) for seed in seeds]


def by_hand(one: Fit, at: Array) -> tuple[Array, Array]:
    """Mean and standard deviation of the mixture, written out penalty by penalty."""
    weights = np.exp(-(one.evidence - one.evidence.min()) / 2)
    weights /= weights.sum()
    logs, errors = one.log_rates(at), one.standard_errors(at)
    mean = sum(w * curve for w, curve in zip(weights, logs, strict=True))
    square = sum(w * (e**2 + c**2) for w, e, c in zip(weights, errors, logs, strict=True))
    return np.asarray(mean), np.sqrt(np.asarray(square - mean**2))


def test_mean_and_spread_are_those_of_a_mixture() -> None:
    for panel in drawn(2e5, range(3)):
        one = tried(panel)
        found = averaged(one, AGES)
        single = fit_each(BASIS, AGES, panel.deaths[ADULT], panel.exposure[ADULT])
        mean, spread = by_hand(single, AGES)
        assert_allclose(found.log_rates[0], mean, rtol=1e-9)
        assert_allclose(found.standard_errors[0], spread, rtol=1e-6)


def test_the_spread_is_at_least_what_the_penalties_agree_on() -> None:
    one = tried(*drawn(1e5, range(8)))
    found = averaged(one, AGES)
    each = one.standard_errors(AGES)
    assert (found.standard_errors > each.min(axis=-2)).all()


def test_the_band_holds_the_rates_behind_the_counts_about_as_often_as_it_says() -> None:
    truth = np.log(gompertz_rates(FIVE)[ADULT])
    for people in (2e4, 1e6):
        panels = drawn(people, range(100))
        found = averaged(tried(*panels), AGES)
        held = np.abs(found.log_rates - truth) < 1.959964 * found.standard_errors
        assert 0.88 < held.mean() < 0.975
        plain = [
            fit(BASIS, AGES, panel.deaths[ADULT], panel.exposure[ADULT]) for panel in panels[:30]
        ]
        known = [
            np.abs(one.log_rates(AGES) - truth) < 1.959964 * one.standard_errors(AGES)
            for one in plain
        ]
        assert held[:30].mean() > np.mean(known)


def test_many_deaths_leave_no_doubt() -> None:
    panel = gompertz_panel(people=1e9)
    found = averaged(tried(panel), AGES)
    assert_allclose(found.log_rates[0], np.log(gompertz_rates(FIVE)[ADULT]), atol=0.005)
    assert found.standard_errors.max() < 0.01


def test_rows_do_not_know_one_another() -> None:
    panels = drawn(2e5, range(4))
    together = averaged(tried(*panels), AGES)
    for row, panel in enumerate(panels):
        alone = averaged(tried(panel), AGES)
        assert_array_equal(together.log_rates[row], alone.log_rates[0])
        assert_array_equal(together.standard_errors[row], alone.standard_errors[0])


def test_what_cannot_be_fitted_is_a_gap_and_an_unsettled_penalty_has_no_weight() -> None:
    panel = gompertz_panel(people=2e5, seed=1)
    nobody = replace(panel, deaths=np.zeros(len(FIVE)))
    found = averaged(tried(panel, nobody), AGES)
    assert np.isfinite(found.log_rates[0]).all()
    assert np.isnan(found.log_rates[1]).all()
    assert np.isnan(found.standard_errors[1]).all()
    one = tried(panel)
    coefficients = one.coefficients.copy()
    coefficients[0, 0] = np.nan
    without = averaged(replace(one, coefficients=coefficients), AGES)
    assert without.log_rates[0] == pytest.approx(averaged(one, AGES).log_rates[0], abs=0.05)
