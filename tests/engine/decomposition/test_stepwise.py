"""Replacing the ages of one population by those of another, one after the other."""

from dataclasses import dataclass, replace

import numpy as np
import pytest

from engine.ages import Array
from engine.chain import Chain, run
from engine.decomposition import NOT_DECOMPOSED, contributions, stepwise
from engine.indicators import INDICATORS, Indicator
from engine.panel import Panel
from tests.engine.decomposition.pairs import PAIRS, PLAIN, scale
from tests.factories import GRIDS, gompertz_panel
from tests.published import denmark

every_indicator = pytest.mark.parametrize("indicator", INDICATORS.values(), ids=lambda i: i.key)


@pytest.mark.fast
@every_indicator
@pytest.mark.parametrize("pair", PAIRS.values(), ids=PAIRS)
def test_the_ages_add_up_and_change_their_sign_turned_round(pair, indicator: Indicator) -> None:
    """Nothing remains: person-years, infants' mix and births go with the ages they belong to."""
    there = stepwise(indicator, pair.this, pair.that, PLAIN)
    back = stepwise(indicator, pair.that, pair.this, PLAIN)
    value = [indicator.value(run(panel, PLAIN)) for panel in (pair.this, pair.that)]
    np.testing.assert_allclose(there.difference, value[0] - value[1], rtol=1e-12)
    if np.isnan(there.by_age).any():
        assert np.isnan(there.by_age).all()
        return
    least = 1e-9 * scale(there.by_age, there.difference)
    assert abs(there.remainder) <= least
    np.testing.assert_allclose(back.by_age, -there.by_age, rtol=0, atol=least + 1e-15)
    np.testing.assert_allclose(back.young_first, -there.old_first, rtol=0, atol=least + 1e-15)


def one_by_one(indicator: Indicator, this: Panel, that: Panel, order: range) -> Array:
    """The replacement as it is described, age by age."""
    deaths, exposure = that.deaths.copy(), that.exposure.copy()
    parts, before = np.zeros(len(this.grid)), float(indicator.value(run(that, PLAIN)))
    for age in order:
        deaths[age], exposure[age] = this.deaths[age], this.exposure[age]
        now = replace(that, deaths=deaths.copy(), exposure=exposure.copy())
        after = float(indicator.value(run(now, PLAIN)))
        parts[age], before = after - before, after
    return parts


@pytest.mark.fast
@pytest.mark.parametrize("key", ["mode", "median", "e0", "ageing_rate"])
def test_it_is_the_replacement_age_by_age(key: str) -> None:
    """The smooth mode's curve chooses its smoothness for each population passed through."""
    pair = PAIRS["Danish men 1974 to 2012"]
    ages = range(len(pair.this.grid))
    found = stepwise(INDICATORS[key], pair.this, pair.that, PLAIN)
    young = one_by_one(INDICATORS[key], pair.this, pair.that, ages)
    old = one_by_one(INDICATORS[key], pair.this, pair.that, ages[::-1])
    np.testing.assert_allclose(found.young_first, young, rtol=0, atol=1e-8)
    np.testing.assert_allclose(found.old_first, old, rtol=0, atol=1e-8)
    np.testing.assert_allclose(found.by_age, (young + old) / 2, rtol=0, atol=1e-8)


@pytest.mark.fast
@pytest.mark.parametrize("key", ["e0", "H", "45q15"])
def test_for_small_differences_it_is_the_straight_line(key: str) -> None:
    """The mean of both orders errs in the third order of the differences only."""
    this, that = gompertz_panel(level=2.000e-5), gompertz_panel(level=2.004e-5, infant=0.00501)
    line = contributions(INDICATORS[key], this, that, PLAIN).by_age
    found = stepwise(INDICATORS[key], this, that, PLAIN).by_age
    np.testing.assert_allclose(found, line, rtol=1e-4, atol=1e-6 * np.abs(line).sum())


@dataclass(frozen=True)
class SumOfRates:
    """Of no use but plain: a linear reading, to which each age contributes its own change."""

    label: str = "sum of rates"
    smooth: bool = False
    why_not_smooth: str = "for the test"

    def value(self, chain: Chain) -> Array:
        return np.asarray(chain.rates.mx.sum(axis=-1))

    def partials(self, chain: Chain) -> Array:
        raise AssertionError("not asked for")


class PerBirth(SumOfRates):
    """Infant deaths over live births."""

    def value(self, chain: Chain) -> Array:
        return np.asarray(chain.rates.deaths[..., 0] / chain.panel.births[..., 0])


@pytest.mark.fast
def test_of_a_sum_each_age_has_its_own_change_and_the_order_decides_nothing() -> None:
    this, that = gompertz_panel(), gompertz_panel(level=4e-5)
    found = stepwise(SumOfRates(), this, that, PLAIN)
    step = this.deaths / this.exposure - that.deaths / that.exposure
    np.testing.assert_allclose(found.by_age, step, rtol=1e-9, atol=1e-15)
    assert found.order_share < 1e-9


STEPPED = [one for one in INDICATORS.values() if not one.smooth]


@pytest.mark.fast
@pytest.mark.parametrize("indicator", STEPPED, ids=lambda i: i.key)
def test_the_order_decides_what_is_not_decomposed_and_no_other_number(indicator) -> None:
    """Four comparisons of Danes, in single years and in groups: the modes' ages depend on the
    order in the middle of them, those of all other numbers less in every one."""
    shares = []
    for grid in (denmark.GRID, denmark.ABRIDGED):
        for sex, years in (("male", (2012, 1974)), ("female", (1994, 1974))):
            sides = (denmark.one(sex, year).regroup(grid) for year in years)
            shares.append(float(stepwise(indicator, *sides, PLAIN).order_share))
    if indicator.key in NOT_DECOMPOSED:
        assert np.nanmedian(shares) > 0.6
    else:
        assert max(shares) < 0.5


@pytest.mark.fast
def test_what_is_not_decomposed_is_a_number_that_is_not_smooth() -> None:
    assert set(NOT_DECOMPOSED) <= {one.key for one in STEPPED}
    assert all(words.endswith(".") for words in NOT_DECOMPOSED.values())


@pytest.mark.fast
def test_the_whole_goes_with_its_ages() -> None:
    """Nobody died in the open group: the rate borrowed there is that of this side's whole once the
    open group is replaced, and not before."""
    borrowing = replace(PLAIN, borrow=True)
    wholes = [gompertz_panel(people=1e7, level=level) for level in (3e-5, 5e-5)]
    this, that = (replace(gompertz_panel(people=5e4), whole=whole) for whole in wholes)
    for panel in (this, that):
        panel.deaths[-1] = 0
    found = stepwise(INDICATORS["e0"], this, that, borrowing)
    np.testing.assert_allclose(found.by_age[:-1], 0, atol=1e-12)
    assert found.by_age[-1] == pytest.approx(float(found.difference), rel=1e-9)
    assert found.difference > 0.001
    bare = replace(that, whole=None)
    assert np.isnan(stepwise(INDICATORS["e0"], this, bare, borrowing).by_age).all()


@pytest.mark.fast
def test_births_go_with_the_first_age() -> None:
    """Infant deaths over births: all of the difference is the first age's."""
    births = (np.array([live, 100.0, 20.0]) for live in (5_000.0, 6_000.0))
    this, that = (
        replace(gompertz_panel(infant=infant), births=own)
        for infant, own in zip((0.004, 0.009), births, strict=True)
    )
    found = stepwise(PerBirth(), this, that, PLAIN)
    np.testing.assert_allclose(found.by_age[1:], 0, atol=1e-15)
    assert found.difference != 0
    assert found.by_age[0] == pytest.approx(float(found.difference), rel=1e-12)


@pytest.mark.fast
@pytest.mark.parametrize("key", ["median", "mode_parabola", "e0"])
def test_a_batch_is_its_rows_bit_for_bit(key: str) -> None:
    levels = np.array([2e-5, 3e-5, 4e-5])
    this, that = gompertz_panel(seed=1, level=levels), gompertz_panel(seed=2, level=levels[::-1])
    together = stepwise(INDICATORS[key], this, that, PLAIN)
    for row in range(3):
        alone = stepwise(INDICATORS[key], this[row], that[row], PLAIN)
        np.testing.assert_array_equal(alone.by_age, together.by_age[row])


@pytest.mark.fast
def test_one_population_against_many() -> None:
    this, that = gompertz_panel(level=np.array([2e-5, 3e-5])), gompertz_panel(level=4e-5)
    together = stepwise(INDICATORS["e0"], this, that, PLAIN).by_age
    assert together.shape == (2, len(this.grid))
    alone = stepwise(INDICATORS["e0"], this[1], that, PLAIN).by_age
    np.testing.assert_array_equal(together[1], alone)


@pytest.mark.fast
def test_unlike_grids_are_refused() -> None:
    with pytest.raises(ValueError, match=r"age groups differ .* regroup both"):
        stepwise(INDICATORS["mode"], gompertz_panel(), gompertz_panel(GRIDS["single"]), PLAIN)
