"""Poisson counts by a table of their distribution."""

import numpy as np
import pytest
from numpy.testing import assert_array_equal
from scipy import stats

from engine import bulk
from engine.compiled.chance import Sampler
from engine.compiled.rules import rules
from engine.indicators import INDICATORS, estimate
from engine.settings import SETTINGS
from tests.factories import GRIDS, codes, gompertz_panel

PLAIN = SETTINGS["almanac-1"]
MEANS = (0.7, 3.0, 20.0, 120.5, 300.0, 600.0, 900.0)


def counts(mean: float, uniform: np.ndarray) -> np.ndarray:
    sampler = Sampler(rules(GRIDS["abridged"], PLAIN), len(uniform))
    found = np.empty((1, len(uniform)))
    sampler.counts(np.array([mean]), uniform[None], found)
    return found[0]


@pytest.mark.parametrize("mean", MEANS)
def test_a_count_is_the_quantile_of_its_uniform_number(mean: float) -> None:
    uniform = np.random.default_rng(1).random(20_000)
    tails = np.array([1e-12, 1e-9, 1 - 1e-9])
    uniform = np.concatenate([uniform, tails])
    assert np.array_equal(counts(mean, uniform), stats.poisson.ppf(uniform, mean))
    assert counts(mean, np.zeros(1))[0] <= stats.poisson.ppf(1e-15, mean)


@pytest.mark.parametrize("mean", MEANS)
def test_counts_follow_the_poisson_law(mean: float) -> None:
    """Chi-square over 40 streams; their p-values are uniform."""
    chances = []
    for seed in range(40):
        drawn = counts(mean, np.random.default_rng([seed, 9]).random(20_000)).astype(int)
        expected = 20_000 * stats.poisson.pmf(np.arange(drawn.max() + 2), mean)
        often = expected >= 10
        seen = np.bincount(drawn, minlength=len(expected))[often]
        seen = np.append(seen, 20_000 - seen.sum())
        hoped = np.append(expected[often], 20_000 - expected[often].sum())
        chances.append(stats.chi2.sf(((seen - hoped) ** 2 / hoped).sum(), len(seen) - 1))
    assert stats.kstest(chances, "uniform").pvalue > 1e-3
    assert min(chances) > 1e-5


def test_means_beyond_the_table_are_drawn_by_numpy() -> None:
    panel = gompertz_panel(people=5e7)
    assert panel.deaths.max() > 50 * bulk.MOST
    found = bulk.simulated(panel, PLAIN, codes(panel), draws=400, purpose="large").e0
    exact = estimate(INDICATORS["e0"], panel, PLAIN)
    assert found.std() == pytest.approx((exact.high - exact.low) / 2 / 1.96, rel=0.15)


def test_draws_do_not_depend_on_order_or_split() -> None:
    slopes = np.linspace(0.085, 0.11, 9)
    panel = gompertz_panel(slope=slopes, level=0.1 / np.exp(86 * slopes), people=40_000, seed=1)
    names = codes(panel)
    together = bulk.simulated(panel, PLAIN, names, draws=30, purpose="split").e0
    back = bulk.simulated(panel[::-1], PLAIN, names[::-1], draws=30, purpose="split").e0
    alone = bulk.simulated(panel[4:5], PLAIN, names[4:5], draws=30, purpose="split").e0
    assert_array_equal(back[:, ::-1], together)
    assert_array_equal(alone[:, 0], together[:, 4])
    other = bulk.simulated(panel, PLAIN, names, draws=30, purpose="another").e0
    assert not np.any(other == together)


def test_streams_that_do_not_match_are_refused() -> None:
    panel = gompertz_panel(slope=np.array([0.09, 0.1]))
    with pytest.raises(ValueError, match="one code for each population"):
        bulk.simulated(panel, PLAIN, np.array(["a"]), draws=2, purpose="none")
