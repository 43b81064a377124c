"""Laws that hold for every entry of the registry under every named settings.

All indicators of a chain are read together: a table is made once, and one law is one test a chain.
"""

from collections.abc import Iterator
from dataclasses import fields, replace

import numpy as np
import pytest
from hypothesis import HealthCheck, Phase, given
from hypothesis import settings as how
from numpy.testing import assert_allclose, assert_array_equal
from numpy.typing import NDArray

from engine.chain import gradient, run
from engine.estimates import Estimate, Reason
from engine.indicators import (
    INDICATORS,
    Indicator,
    differences,
    estimate,
    estimates,
    find,
)
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from tests.factories import GRIDS, codes, complete, gompertz_panel, panels, persons_panel

MADE = [find(key) for key in ("e80", "e1", "e0_45", "yll40", "asr75_esp2013", "asr_by_isle.p.2010")]
EVERY = [*INDICATORS.values(), *MADE]
SMOOTH = [one for one in EVERY if one.smooth]
CHAINS = {key: replace(settings, draws=20) for key, settings in SETTINGS.items()}
# Years are pooled before the engine is asked, so that a chain of several is that of one.
APART = {replace(one, key="", label="", years=1): one for one in reversed(CHAINS.values())}.values()

every_indicator = pytest.mark.parametrize("indicator", INDICATORS.values(), ids=lambda i: i.key)
every_chain = pytest.mark.parametrize("settings", APART, ids=lambda s: s.key)
drawn = how(  # a failing example is told as it was drawn: to shrink one takes minutes
    max_examples=3,
    deadline=None,
    suppress_health_check=list(HealthCheck),
    phases=(Phase.explicit, Phase.generate),
)

PARTS = [field.name for field in fields(Estimate)]


def read(
    panel: Panel, settings: Settings, *, streams: NDArray[np.str_] | None = None
) -> Iterator[tuple[Indicator, Estimate]]:
    """Every indicator with what is estimated of it."""
    found = estimates(EVERY, panel, settings, streams=codes(panel) if streams is None else streams)
    return ((one, found[one.key]) for one in EVERY)


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


def test_chains_that_calculate_otherwise_are_all_tried() -> None:
    assert len(APART) == sum(one.years == 1 for one in SETTINGS.values())


@pytest.mark.slow
@every_chain
@drawn
@given(panel=panels(batch=5))
def test_a_batch_is_its_rows_bit_for_bit(settings: Settings, panel: Panel) -> None:
    streams = codes(panel)
    together = estimates(EVERY, panel, settings, streams=streams)
    square = Panel.stack([panel, panel[::-1]])
    for one, got in read(square, settings, streams=np.stack([streams, streams[::-1]])):
        for part in PARTS:
            whole = getattr(together[one.key], part)
            assert_array_equal(getattr(got, part), np.stack([whole, whole[::-1]]), one.key)
    for where in (slice(1, 5), slice(None, None, 2), 4):
        for one, got in read(panel[where], settings, streams=streams[where]):
            for part in PARTS:
                whole = getattr(together[one.key], part)
                assert_array_equal(getattr(got, part), whole[where], one.key)


@pytest.mark.parametrize("one", EVERY, ids=lambda i: i.key)
def test_an_indicator_is_the_same_alone_as_among_others(one: Indicator) -> None:
    panel, settings = some("irregular")[:3], CHAINS["almanac-2"]
    among = {other.key: got for other, got in read(panel, settings)}[one.key]
    alone = estimate(one, panel, settings, streams=codes(panel))
    for part in PARTS:
        assert_array_equal(getattr(alone, part), getattr(among, part))


@every_chain
def test_a_split_of_many_populations_changes_no_bit(settings: Settings) -> None:
    slopes = np.linspace(0.08, 0.11, 60)
    level = 0.1 / np.exp(86 * slopes)
    panel = complete(gompertz_panel(seed=1, slope=slopes, level=level, people=60_000))
    streams = codes(panel)
    together = estimates(EVERY, panel, settings, streams=streams)
    for where in (slice(0, 25), slice(25, 60), slice(1, None, 7)):
        for one, part in read(panel[where], settings, streams=streams[where]):
            for name in PARTS:
                whole = getattr(together[one.key], name)
                assert_array_equal(getattr(part, name), whole[where], one.key)


@every_chain
@pytest.mark.parametrize("measure", ["deaths", "exposure"])
def test_a_missing_count_is_a_missing_value_with_its_reason(
    settings: Settings, measure: str
) -> None:
    panel = some()
    counts = getattr(panel, measure).copy()
    holes, ages = np.array([0, 2, 3, 6]), np.array([0, 3, 14, -1])
    others = np.array([1, 4, 5])
    counts[holes, ages] = np.nan
    sound = estimates(EVERY, panel, settings, streams=codes(panel))
    for one, got in read(replace(panel, **{measure: counts}), settings):
        assert np.isnan([got.value[holes], got.low[holes], got.high[holes]]).all(), one.key
        assert np.all(got.reason[holes] == Reason.NOT_AVAILABLE), one.key
        for part in PARTS:
            whole = getattr(sound[one.key], part)
            assert_array_equal(getattr(got, part)[others], whole[others], one.key)


@every_chain
@drawn
@given(panel=panels())
def test_a_missing_value_has_a_reason_and_an_interval_has_a_value(
    settings: Settings, panel: Panel
) -> None:
    for one, got in read(panel, settings):
        assert np.all(got.reason[np.isnan(got.value)] != Reason.NONE), one.key
        assert np.all(got.reason[np.isnan(got.low)] != Reason.NONE), one.key
        assert_array_equal(np.isnan(got.low), np.isnan(got.high), one.key)
        assert np.all(np.isfinite(got.value[np.isfinite(got.low)])), one.key


@every_chain
@pytest.mark.parametrize("grid", ["abridged", "single"])
def test_the_interval_contains_the_value(settings: Settings, grid: str) -> None:
    for one, got in read(some(grid), settings):
        assert np.all(got.reason == Reason.NONE), one.key
        assert np.all((got.low <= got.value) & (got.value <= got.high)), one.key
        assert not one.smooth or np.all(got.low < got.high), one.key


@every_chain
@pytest.mark.parametrize("grid", GRIDS)
@pytest.mark.parametrize("sex", ["f", "m", "p"])
def test_the_gradient_is_the_complex_step(settings: Settings, grid: str, sex: str) -> None:
    infant = np.array([0.004, 0.05, 0.12])  # on three pieces of the first-year rules
    panel = complete(gompertz_panel(GRIDS[grid], seed=3, infant=infant, sex=sex, people=2e6))
    if sex == "p":
        weight, ratio = np.array([0.42, 0.58]), np.array([0.87, 1.12])
        panel = replace(panel, infant_weight=weight + 0 * panel.infant_weight,
                        infant_ratio=ratio * panel.infant_ratio)  # fmt: skip
    chain = run(panel, settings)
    ages, tiny = len(panel.grid), 1e-30
    mx = chain.rates.mx + 1j * tiny * np.eye(ages)[:, None]  # [age stepped, population, age]
    stepped = run(panel[np.newaxis][np.zeros(ages, int)], settings, mx=mx)
    for one in SMOOTH:
        if one.unit.limits == "count":  # over births, not read off rates
            continue
        got, value = gradient(one, chain), np.moveaxis(one.value(stepped).imag / tiny, 0, -1)
        scale = np.abs(got).max(axis=-1, keepdims=True)
        assert np.all(scale > 0), one.key
        assert_allclose(got / scale, value / scale, rtol=0, atol=1e-10, err_msg=one.key)


@every_chain
@drawn
@given(panel=panels())
def test_a_hundred_times_the_people_is_a_tenth_of_the_standard_error(
    settings: Settings, panel: Panel
) -> None:
    if settings.population_error or settings.smoothing != "none":
        return  # the one does not shrink with the people, the other follows more of what they show
    counts = {name: 100 * getattr(panel, name) for name in ("deaths", "exposure", "births")}
    found, more = (estimates(SMOOTH, one, settings) for one in (panel, replace(panel, **counts)))
    for one in SMOOTH:
        small, large = found[one.key], more[one.key]
        known = np.isfinite(small.se)
        assert_allclose(large.value[known], small.value[known], rtol=1e-9, err_msg=one.key)
        assert_allclose(large.se[known], small.se[known] / 10, rtol=1e-9, err_msg=one.key)


@pytest.mark.parametrize("key", ["45q15", "5q0"])
def test_limits_of_a_part_of_a_whole_lie_between_0_and_1(key: str) -> None:
    few = gompertz_panel(GRIDS["abridged"], people=6_000)  # the deaths expected, parts of one
    got = estimate(find(key), few, SETTINGS["almanac-1"])
    assert 0 < got.low < got.value < got.high < 1


@every_chain
def test_a_difference_turned_round_changes_its_sign(settings: Settings) -> None:
    this, that = some(), some()[::-1]
    streams = codes(this, "this"), codes(that, "that")
    third = {
        name: np.floor(np.minimum(getattr(this, name), getattr(that, name)) / 3)
        for name in ("deaths", "births")
    }
    shared = replace(this, **third)
    ones = differences(EVERY, this, that, settings, shared=shared, streams=streams)
    twos = differences(EVERY, that, this, settings, shared=shared, streams=streams[::-1])
    sides = [estimates(EVERY, side, settings, streams=streams[0]) for side in (this, that)]
    for key, one in ones.items():
        two = twos[key]
        assert_array_equal(one.value, -two.value, key)
        assert_allclose(one.low, -two.high, rtol=1e-9, err_msg=key)
        assert_allclose(one.high, -two.low, rtol=1e-9, err_msg=key)
        assert np.all(one.reason == Reason.NONE), key
        assert_array_equal(one.value, sides[0][key].value - sides[1][key].value, key)


def narrowed(
    indicators: list[Indicator], settings: Settings, *, simulated: bool
) -> dict[str, float]:
    """Width of the interval of a part less its whole over the width as if they shared no deaths."""
    part, rest = some("single"), some("single")[::-1]
    sums = {
        name: getattr(part, name) + getattr(rest, name) for name in ("deaths", "exposure", "births")
    }
    whole, found = replace(part, **sums), {}
    streams = (codes(part, "part"), codes(part, "whole")) if simulated else None
    naives = differences(indicators, part, whole, settings, streams=streams)
    rights = differences(indicators, part, whole, settings, shared=part, streams=streams)
    for key, right in rights.items():
        naive = naives[key]
        assert_array_equal(naive.value, right.value, key)
        assert np.all(right.reason == Reason.NONE), key
        found[key] = (right.high - right.low).sum() / (naive.high - naive.low).sum()
    return found


@every_chain
def test_deaths_counted_in_both_narrow_the_interval(settings: Settings) -> None:
    # errors of person-years widen both alike
    least = 1 if settings.population_error else 0.7
    found = narrowed(SMOOTH, settings, simulated=False)
    assert {key: share for key, share in found.items() if share >= least} == {}


def test_deaths_counted_in_both_narrow_a_simulated_interval() -> None:
    stepped = [one for one in EVERY if not one.smooth]
    found = narrowed(stepped, replace(CHAINS["almanac-1"], draws=400), simulated=True)
    # the highest of many single ages leaps with chance, shared or not
    most = {key: 1.1 if key.startswith("mode") else 0.7 for key in found}
    assert {key: share for key, share in found.items() if share >= most[key]} == {}


@every_chain
def test_persons_are_read_as_any_other(settings: Settings) -> None:
    for one, got in read(complete(persons_panel(seed=6)), settings):
        assert got.reason == Reason.NONE, one.key
        assert got.low <= got.value <= got.high, one.key
