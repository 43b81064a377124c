"""Deaths that were shared out among those counted: laws for every indicator, and what holds how
often."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from scipy.stats import chi2

from engine import bulk, shift
from engine.ages import Array
from engine.chain import run
from engine.chance import chances, told
from engine.decomposition import contribution_limits
from engine.estimates import Estimate
from engine.indicators import INDICATORS, differences, estimates
from engine.open_age import implied_population
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.simulation import pair_redrawn, redrawn
from tests.factories import GRIDS, codes, complete, gompertz_panel

PLAIN = SETTINGS["almanac-1"]
ALL = list(INDICATORS.values())
SMOOTH = [one for one in ALL if one.smooth]


def population(seed: int = 3, **law: object) -> Panel:
    return complete(gompertz_panel(people=900_000, seed=seed, **law))  # type: ignore[arg-type]


def shared_out(panel: Panel, worth: Array | float) -> Panel:
    """The same deaths, each one counted worth so many."""
    return replace(panel, counted=panel.deaths / worth)


def assert_same(these: dict[str, Estimate], those: dict[str, Estimate], rtol: float = 0) -> None:
    for key, this in these.items():
        for name in ("value", "low", "high", "se", "reason"):
            one, other = getattr(this, name), getattr(those[key], name)
            assert_allclose(one, other, rtol=rtol, atol=1e-300, err_msg=f"{key} {name}")


def test_where_all_deaths_are_counted_nothing_changes() -> None:
    this, that = population(), population(4, level=4e-5)
    part = replace(this, deaths=np.floor(np.minimum(this.deaths, that.deaths) / 3))
    told_so = [replace(panel, counted=panel.deaths) for panel in (this, that, part)]
    names = (codes(this, "this"), codes(that, "that"))
    plain = estimates(ALL, this, PLAIN, streams=names[0])
    assert_same(plain, estimates(ALL, told_so[0], PLAIN, streams=names[0]))
    plain = differences(ALL, this, that, PLAIN, shared=part, streams=names)
    again = differences(ALL, *told_so[:2], PLAIN, shared=told_so[2], streams=names)
    assert_same(plain, again)


@pytest.mark.parametrize("error", [(), ((65, 2.0),)], ids=["known", "miscounted"])
def test_each_death_counted_weighs_as_much_as_those_it_stands_for(error) -> None:
    """The variance is k times that of as many deaths counted: sum (w k)^2 D / k."""
    settings, panel = replace(PLAIN, population_error=error), population()
    worth = np.linspace(1.0, 1.6, len(panel.grid))
    plain, counted = (
        chances(SMOOTH, run(one, settings)) for one in (panel, shared_out(panel, worth))
    )
    for key, chance in plain.items():
        if INDICATORS[key].unit.limits == "count":
            assert_array_equal(counted[key].variance, chance.variance)
            continue
        by_age = chance.weights**2 * chance.counts * worth
        assert_allclose(counted[key].variance, by_age.sum(axis=-1), rtol=1e-12, err_msg=key)
        assert_array_equal(counted[key].astray, chance.astray)


def test_a_rate_has_the_exact_limits_of_the_deaths_counted() -> None:
    panel = population()
    own = replace(shared_out(panel, 1.25), counted=np.round(panel.deaths / 1.25))
    own = replace(own, deaths=1.25 * own.counts)
    count, years = own.counts.sum(), own.exposure.sum()
    found = estimates([INDICATORS["cdr"]], own, PLAIN)["cdr"]
    limits = 0.5 * chi2.ppf(0.025, 2 * count), 0.5 * chi2.ppf(0.975, 2 * count + 2)
    assert_allclose((found.low, found.high), 1.25 * np.array(limits) / years, rtol=1e-9)


def test_only_the_deaths_counted_tell_how_sure_a_rate_is() -> None:
    """Twice the deaths and the person-years by sharing out, and nobody else counted: the same."""
    panel = population()
    some = [one for one in SMOOTH if told(one) and one.unit.limits != "count"]
    some = [one for one in some if not (one.needs.standard or one.key in ("smr", "isr"))]
    double = replace(
        panel, deaths=2 * panel.deaths, exposure=2 * panel.exposure, counted=panel.deaths
    )
    assert_same(estimates(some, panel, PLAIN), estimates(some, double, PLAIN), rtol=1e-9)


def test_what_is_drawn_are_the_deaths_counted() -> None:
    panel = shared_out(population(), 1.5)
    drawn = redrawn(panel, codes(panel), 4_000, "drawn")
    assert_allclose(np.remainder(drawn / 1.5 + 1e-6, 1), 1e-6, atol=2e-6)
    assert_allclose(drawn.mean(axis=0), panel.deaths, rtol=0.02, atol=0.5)
    assert_allclose(drawn.var(axis=0), 1.5 * panel.deaths, rtol=0.15, atol=0.5)
    other = shared_out(population(4), 1.25)
    both = np.minimum(panel.counts, other.counts)
    pair = pair_redrawn(panel, other, both, (codes(panel), codes(other)), 4_000, "pair")
    apart = np.array(
        [
            ((a - a.mean()) * (b - b.mean())).mean()
            for a, b in zip(pair.this.T, pair.that.T, strict=True)
        ]
    )
    assert_allclose(apart, 1.5 * 1.25 * both, atol=0.15 * 1.5 * 1.25 * both.max())


def test_simulated_tables_in_bulk_draw_the_deaths_counted() -> None:
    panel = Panel.stack([population(seed) for seed in range(3)])
    names = codes(panel)
    plain, once, shared = (
        bulk.simulated(one, PLAIN, names, draws=400, by="numpy", purpose="bulk").e0.std(axis=0)
        for one in (panel, replace(panel, counted=panel.deaths), shared_out(panel, 2.0))
    )
    assert_array_equal(plain, once)
    assert_allclose(shared / plain, np.sqrt(2), rtol=0.12)


def test_contributions_and_kinds_of_change_know_the_deaths_counted() -> None:
    this, that = population(), population(4, level=4e-5)
    wide = [shared_out(panel, 4.0) for panel in (this, that)]
    plain = contribution_limits(INDICATORS["e0"], this, that, PLAIN)
    same = [replace(panel, counted=panel.deaths) for panel in (this, that)]
    assert_array_equal(plain, contribution_limits(INDICATORS["e0"], *same, PLAIN))
    found = contribution_limits(INDICATORS["e0"], *wide, PLAIN)
    assert_allclose((found.high - found.low)[8:20] / (plain.high - plain.low)[8:20], 2, rtol=0.05)
    causes = tuple(panel.deaths[..., None, :] * np.array([[0.3], [0.7]]) for panel in (this, that))
    by_cause = contribution_limits(INDICATORS["e0"], this, that, PLAIN, causes=causes)
    found = contribution_limits(INDICATORS["e0"], *wide, PLAIN, causes=causes)
    ratio = (found.high - found.low)[:, 10:20] / (by_cause.high - by_cause.low)[:, 10:20]
    assert_allclose(ratio, 2, rtol=0.08)
    kinds, wider = (shift.shift_squeeze(*pair, PLAIN) for pair in ((this, that), wide))
    for name in shift.VALUES:
        assert_allclose(getattr(wider, name).se, 2 * getattr(kinds, name).se, rtol=1e-9)
    mode = contribution_limits(
        INDICATORS["mode_raw"], *wide, PLAIN, streams=(codes(this), codes(that)), draws=50
    )
    narrow = contribution_limits(
        INDICATORS["mode_raw"], this, that, PLAIN, streams=(codes(this), codes(that)), draws=50
    )
    assert np.nansum(mode.high - mode.low) > 1.2 * np.nansum(narrow.high - narrow.low)


def test_of_two_that_share_deaths_those_counted_cancel() -> None:
    """A part, and the whole it is of: one more death counted in both moves them by what it is
    worth in either."""
    part, rest = shared_out(population(), 1.5), population(4)
    whole = Panel.pooled([part, rest])
    found = differences([INDICATORS["e0"]], part, whole, PLAIN, shared=part)["e0"]
    upper = chances([INDICATORS["e0"]], run(part, PLAIN))["e0"]
    lower = chances([INDICATORS["e0"]], run(whole, PLAIN))["e0"]
    assert_array_equal(whole.counts, part.counts + rest.deaths)
    in_both = (upper.weights - lower.weights) ** 2 * part.counts
    variance = in_both + lower.weights**2 * rest.deaths
    assert_allclose(found.se, np.sqrt(variance.sum()), rtol=1e-9)


def test_the_implied_population_knows_the_deaths_counted() -> None:
    grid = GRIDS["single"]
    panel, whole = (gompertz_panel(grid, people=size, seed=2) for size in (2e6, 9e6))
    plain = implied_population(panel, whole, PLAIN).ratio
    wide = implied_population(shared_out(panel, 4.0), shared_out(whole, 4.0), PLAIN).ratio
    assert_allclose(wide.se, 2 * plain.se, rtol=1e-9)


def test_an_age_to_which_all_deaths_were_shared_out_counts_them_themselves() -> None:
    panel = population()
    counted = panel.deaths.copy()
    counted[7] = 0.0
    own = replace(panel, counted=counted)
    assert_array_equal(own.counts, panel.deaths)
    assert_array_equal(own.worth, np.ones(len(panel.grid)))
    none = replace(panel, deaths=np.where(np.arange(len(panel.grid)) == 7, 0.0, panel.deaths))
    thinned = shared_out(none, 1.3)
    assert thinned.worth is not None
    assert_allclose(thinned.worth, 1.3)  # also where nobody died: the next one would be worth 1.3


def test_intervals_hold_the_truth_where_a_fifth_of_the_ages_is_unknown() -> None:
    """Poisson deaths, a fifth of them without their age, shared out by the rest. Taken for counted
    the limits are too narrow; those of the deaths counted hold the truth in 95 of 100, or in a
    little more, since that the total is known in full is not made use of."""
    truth, rng = gompertz_panel(people=1_000_000), np.random.default_rng(11)
    e0 = INDICATORS["e0"]
    happened = rng.poisson(truth.deaths, (10_000, len(truth.grid))).astype(float)
    stated = rng.binomial(happened.astype(int), 0.8).astype(float)
    worth = happened.sum(axis=-1, keepdims=True) / stated.sum(axis=-1, keepdims=True)
    many = truth.over(lambda array: np.broadcast_to(array, (10_000, array.shape[-1])))
    naive = replace(many, deaths=stated * worth)
    known = float(e0.value(run(truth, PLAIN)))
    found, narrow = (
        estimates([e0], panel, PLAIN)["e0"] for panel in (replace(naive, counted=stated), naive)
    )
    held = np.mean((found.low <= known) & (known <= found.high))
    assert 0.94 < held < 0.97
    assert np.mean((narrow.low <= known) & (known <= narrow.high)) < 0.945
    spread = found.value.std()
    assert np.mean(narrow.se) < 0.97 * spread < spread < 1.02 * np.mean(found.se)
