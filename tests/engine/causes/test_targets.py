"""The published formula of the target of chronic diseases, and crude rates, by hand."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.stats import chi2

from engine.ages import AgeGrid
from engine.causes.counts import CauseCounts
from engine.causes.targets import chance_30_to_70, crude_rate
from engine.estimates import Reason
from engine.settings import SETTINGS
from tests.engine.stepping import STEP
from tests.factories import GRIDS, gompertz_panel, parted

pytestmark = pytest.mark.fast
PLAIN = SETTINGS["almanac-1"]


@pytest.mark.parametrize("grid", ["abridged", "single"])
def test_the_published_formula(grid: str) -> None:
    panel = gompertz_panel(GRIDS[grid], seed=7)
    causes = parted(panel)
    found = chance_30_to_70(panel, CauseCounts(causes.deaths[:2]), PLAIN)
    alive, starts = 1.0, np.array(panel.grid.starts)
    for age in range(30, 70, 5):
        some = (starts >= age) & (starts < age + 5)
        m = causes.deaths[:2, some].sum() / panel.exposure[some].sum()
        alive *= 1 - 5 * m / (1 + 2.5 * m)
    assert found.value == pytest.approx(1 - alive, rel=1e-12)
    assert found.low < found.value < found.high


def test_its_standard_error_by_complex_step() -> None:
    panel = gompertz_panel(seed=7)
    causes = parted(panel).deaths[:2]
    variance = 0.0
    for cause, x in np.ndindex(causes.shape):
        stepped = causes.astype(complex)
        stepped[cause, x] += 1j * STEP
        mx = np.array(
            [stepped[:, i].sum() / panel.exposure[i] for i in range(*_between(panel.grid))]
        )
        slope = (1 - np.prod(1 - 5 * mx / (1 + 2.5 * mx))).imag / STEP
        variance += slope**2 * causes[cause, x]
    found = chance_30_to_70(panel, CauseCounts(causes), PLAIN)
    assert found.se == pytest.approx(np.sqrt(variance), rel=1e-10)


def _between(grid: AgeGrid) -> tuple[int, int]:
    return grid.position(30), grid.position(70)


def test_ages_that_make_no_five_year_groups_give_none() -> None:
    panel = gompertz_panel(AgeGrid((0, 1, 5, 15, 25, 35, 45, 55, 65, 75, 85)), seed=7)
    found = chance_30_to_70(panel, parted(panel), PLAIN)
    assert found.reason == Reason.AGE_NOT_ON_GRID


def test_a_crude_rate_has_exact_limits_and_counts_by_what_was_counted() -> None:
    panel = gompertz_panel(seed=7)
    few = np.zeros((1, len(panel.grid)))
    few[0, 5:9] = 4.0
    found = crude_rate(panel, CauseCounts(few), PLAIN)
    years = panel.exposure.sum()
    assert_allclose(found.value * years, 16, rtol=1e-12)
    assert_allclose(found.low * years, chi2.ppf(0.025, 32) / 2, rtol=1e-9)
    assert_allclose(found.high * years, chi2.ppf(0.975, 34) / 2, rtol=1e-9)
    twice = crude_rate(panel, CauseCounts(few, few / 2), PLAIN)
    assert_allclose(twice.se, np.sqrt(2) * found.se, rtol=1e-12)
    none = crude_rate(panel, CauseCounts(0 * few), PLAIN)
    assert none.value == 0 < none.high


def test_too_few_people_and_miscounted_ones() -> None:
    small = gompertz_panel(seed=7, people=3000)
    assert crude_rate(small, parted(small), PLAIN).reason == Reason.TOO_FEW_PERSON_YEARS
    panel = gompertz_panel(seed=7)
    plain = chance_30_to_70(panel, parted(panel), PLAIN)
    wide = chance_30_to_70(panel, parted(panel), SETTINGS["almanac-1-population-2"])
    assert wide.high - wide.low > plain.high - plain.low
    batch = replace(panel).over(lambda array: np.stack([array, array]))
    both = parted(panel).over(lambda array: np.stack([array, array]))
    assert (chance_30_to_70(batch, both, PLAIN).value == plain.value).all()
