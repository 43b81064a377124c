"""Laws that hold for every entry of the registry under every named settings."""

from dataclasses import fields, replace

import numpy as np
import pytest
from hypothesis import HealthCheck, given
from hypothesis import settings as how
from numpy.testing import assert_allclose, assert_array_equal

from engine.chain import gradient, run
from engine.estimates import Estimate, Reason
from engine.indicators import INDICATORS, Indicator, difference, estimate, find
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from tests.factories import GRIDS, codes, complete, gompertz_panel, panels, persons_panel

CHAINS = {key: replace(settings, draws=20) for key, settings in SETTINGS.items()}
every_indicator = pytest.mark.parametrize("indicator", INDICATORS.values(), ids=lambda i: i.key)
MADE = [find(key) for key in ("e80", "e1", "e0_45", "yll40", "asr_by_isle.p.2010")]
SMOOTH = [i for i in (*INDICATORS.values(), *MADE) if i.smooth]
smooth = pytest.mark.parametrize("indicator", SMOOTH, ids=lambda i: i.key)
read_off_rates = pytest.mark.parametrize(  # a count over births is not
    "indicator", [i for i in SMOOTH if i.unit.limits != "count"], ids=lambda i: i.key
)
every_chain = pytest.mark.parametrize("settings", CHAINS.values(), ids=lambda s: s.key)
drawn = how(max_examples=5, deadline=None, suppress_health_check=list(HealthCheck))

PARTS = [field.name for field in fields(Estimate)]


def some(grid: str = "abridged", *, people: float = 4_000_000) -> Panel:
    slopes = np.linspace(0.085, 0.11, 7)
    return complete(
        gompertz_panel(
            GRIDS[grid], seed=8, slope=slopes, level=0.1 / np.exp(86 * slopes), people=people
        )
    )


@every_indicator
def test_an_entry_says_what_it_is(indicator: Indicator) -> None:
    assert len(fields(indicator)) <= 12
    for part in ("key", "symbol", "label", "definition", "formula", "source"):
        assert getattr(indicator, part).strip() == getattr(indicator, part) != ""
    assert indicator.unit.label
    assert any(letter.isdigit() for letter in indicator.source)  # a year of publication
    assert indicator.definition.endswith(".")
    assert bool(indicator.why_not_smooth) is not indicator.smooth
    assert find(indicator.key) is indicator


def test_keys_and_labels_are_told_apart() -> None:
    assert list(INDICATORS) == [indicator.key for indicator in INDICATORS.values()]
    assert len({indicator.label for indicator in INDICATORS.values()}) == len(INDICATORS)


@pytest.mark.slow
@every_chain
@every_indicator
@drawn
@given(panel=panels(batch=5))
def test_a_batch_is_its_rows_bit_for_bit(
    indicator: Indicator, settings: Settings, panel: Panel
) -> None:
    streams = codes(panel)
    together = estimate(indicator, panel, settings, streams=streams)
    square = Panel.stack([panel, panel[::-1]])
    reshaped = estimate(indicator, square, settings, streams=np.stack([streams, streams[::-1]]))
    for part in PARTS:
        whole = getattr(together, part)
        assert_array_equal(getattr(reshaped, part), np.stack([whole, whole[::-1]]))
        for where in (slice(0, 1), slice(1, 5), slice(None, None, 2), 4):
            alone = estimate(indicator, panel[where], settings, streams=streams[where])
            assert_array_equal(getattr(alone, part), whole[where])


@every_chain
@every_indicator
def test_a_split_of_many_populations_changes_no_bit(
    indicator: Indicator, settings: Settings
) -> None:
    slopes = np.linspace(0.08, 0.11, 120)
    level = 0.1 / np.exp(86 * slopes)
    panel = complete(gompertz_panel(seed=1, slope=slopes, level=level, people=60_000))
    streams = codes(panel)
    together = estimate(indicator, panel, settings, streams=streams)
    for where in (slice(0, 49), slice(49, 51), slice(51, 120), slice(1, None, 7)):
        part = estimate(indicator, panel[where], settings, streams=streams[where])
        for name in PARTS:
            assert_array_equal(getattr(part, name), getattr(together, name)[where])


@every_chain
@every_indicator
@pytest.mark.parametrize("measure", ["deaths", "exposure"])
def test_a_missing_count_is_a_missing_value_with_its_reason(
    indicator: Indicator, settings: Settings, measure: str
) -> None:
    panel = some()
    counts = getattr(panel, measure).copy()
    holes, ages = np.array([0, 2, 3, 6]), np.array([0, 3, 14, -1])
    counts[holes, ages] = np.nan
    holed = replace(panel, **{measure: counts})
    got = estimate(indicator, holed, settings, streams=codes(panel))
    assert np.isnan([got.value[holes], got.low[holes], got.high[holes]]).all()
    assert np.all(got.reason[holes] == Reason.NOT_AVAILABLE)
    sound = estimate(indicator, panel, settings, streams=codes(panel))
    others = np.array([1, 4, 5])
    for part in PARTS:
        assert_array_equal(getattr(got, part)[others], getattr(sound, part)[others])


@every_chain
@every_indicator
@drawn
@given(panel=panels())
def test_a_missing_value_has_a_reason_and_an_interval_has_a_value(
    indicator: Indicator, settings: Settings, panel: Panel
) -> None:
    got = estimate(indicator, panel, settings, streams=codes(panel))
    assert np.all(got.reason[np.isnan(got.value)] != Reason.NONE)
    assert np.all(got.reason[np.isnan(got.low)] != Reason.NONE)
    assert_array_equal(np.isnan(got.low), np.isnan(got.high))
    assert np.all(np.isfinite(got.value[np.isfinite(got.low)]))


@every_chain
@every_indicator
@pytest.mark.parametrize("grid", ["abridged", "single"])
def test_the_interval_contains_the_value(
    indicator: Indicator, settings: Settings, grid: str
) -> None:
    panel = some(grid)
    got = estimate(indicator, panel, settings, streams=codes(panel))
    assert np.all(got.reason == Reason.NONE)
    assert np.all((got.low <= got.value) & (got.value <= got.high))
    assert not indicator.smooth or np.all(got.low < got.high)


@every_chain
@read_off_rates
@pytest.mark.parametrize("grid", GRIDS)
@pytest.mark.parametrize("sex", ["f", "m", "p"])
def test_the_gradient_is_the_complex_step(
    indicator: Indicator, settings: Settings, grid: str, sex: str
) -> None:
    infant = np.array([0.004, 0.05, 0.12])  # on three pieces of the first-year rules
    panel = complete(gompertz_panel(GRIDS[grid], seed=3, infant=infant, sex=sex, people=2e6))
    if sex == "p":
        weight, ratio = np.array([0.42, 0.58]), np.array([0.87, 1.12])
        panel = replace(panel, infant_weight=weight + 0 * panel.infant_weight,
                        infant_ratio=ratio * panel.infant_ratio)  # fmt: skip
    chain = run(panel, settings)
    got = gradient(indicator, chain)
    ages, tiny = len(panel.grid), 1e-30
    stepped = chain.rates.mx + 1j * tiny * np.eye(ages)[:, None]  # [age stepped, population, age]
    copies = panel[np.newaxis][np.zeros(ages, int)]
    value = np.moveaxis(indicator.value(run(copies, settings, mx=stepped)).imag / tiny, 0, -1)
    scale = np.abs(got).max(axis=-1, keepdims=True)
    assert np.all(scale > 0)
    assert_allclose(got / scale, value / scale, rtol=0, atol=1e-10)


@every_chain
@smooth
@drawn
@given(panel=panels())
def test_a_hundred_times_the_people_is_a_tenth_of_the_standard_error(
    indicator: Indicator, settings: Settings, panel: Panel
) -> None:
    counts = {name: 100 * getattr(panel, name) for name in ("deaths", "exposure", "births")}
    small, large = (estimate(indicator, one, settings) for one in (panel, replace(panel, **counts)))
    known = np.isfinite(small.se)
    assert_allclose(large.value[known], small.value[known], rtol=1e-9)
    assert_allclose(large.se[known], small.se[known] / 10, rtol=1e-9)


@pytest.mark.parametrize("key", ["45q15", "5q0"])
def test_limits_of_a_part_of_a_whole_lie_between_0_and_1(key: str) -> None:
    few = gompertz_panel(GRIDS["abridged"], people=6_000)  # the deaths expected, parts of one
    got = estimate(find(key), few, SETTINGS["almanac-1"])
    assert 0 < got.low < got.value < got.high < 1


@every_chain
@every_indicator
def test_a_difference_turned_round_changes_its_sign(
    indicator: Indicator, settings: Settings
) -> None:
    this, that = some(), some()[::-1]
    streams = codes(this, "this"), codes(that, "that")
    third = {
        name: np.floor(np.minimum(getattr(this, name), getattr(that, name)) / 3)
        for name in ("deaths", "births")
    }
    shared = replace(this, **third)
    one = difference(indicator, this, that, settings, shared=shared, streams=streams)
    two = difference(indicator, that, this, settings, shared=shared, streams=streams[::-1])
    assert_array_equal(one.value, -two.value)
    assert_allclose(one.low, -two.high, rtol=1e-9)
    assert_allclose(one.high, -two.low, rtol=1e-9)
    assert np.all(one.reason == Reason.NONE)
    values = (
        estimate(indicator, side, settings, streams=streams[0]).value for side in (this, that)
    )
    assert_array_equal(one.value, np.subtract(*values))


@every_chain
@every_indicator
def test_deaths_counted_in_both_narrow_the_interval(
    indicator: Indicator, settings: Settings
) -> None:
    settings = replace(settings, draws=400)
    part, rest = some("single"), some("single")[::-1]
    sums = {
        name: getattr(part, name) + getattr(rest, name) for name in ("deaths", "exposure", "births")
    }
    whole = replace(part, **sums)
    streams = codes(part, "part"), codes(part, "whole")
    naive = difference(indicator, part, whole, settings, streams=streams)
    right = difference(indicator, part, whole, settings, shared=part, streams=streams)
    assert_array_equal(naive.value, right.value)
    assert np.all(right.reason == Reason.NONE)
    narrower = (right.high - right.low).sum() / (naive.high - naive.low).sum()
    assert narrower < (0.7 if indicator.smooth else 1)


@every_chain
@every_indicator
def test_persons_are_read_as_any_other(indicator: Indicator, settings: Settings) -> None:
    panel = complete(persons_panel(seed=6))
    got = estimate(indicator, panel, settings, streams=codes(panel))
    assert got.reason == Reason.NONE
    assert got.low <= got.value <= got.high
