"""Every indicator at changed death rates: laws, closed forms, and chance."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine.causes.counts import CauseCounts
from engine.chain import run
from engine.indicators import INDICATORS, estimates, find
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.settings import find as settings
from engine.whatif import Benchmark, Change, Parts
from engine.whatif_numbers import what_if
from tests.engine.test_whatif import stationary, three_causes
from tests.factories import GRIDS, codes, complete, gompertz_panel

ALMANAC = settings("almanac-1")
EVERY = list(INDICATORS.values())
SMOOTH = [one for one in EVERY if one.smooth and one.unit.limits != "count"]
E0, H = find("e0"), find("H")


def lived_at(rate: float) -> np.ndarray:
    """Years that one born lives in each group of `stationary` at a constant rate."""
    return stationary(rate, 1.0).exposure / rate


def some_fewer(parts: Parts, share: float = 0.8, where: slice = slice(8, 14)) -> Change:
    times = np.ones(parts.deaths.shape)
    times[..., where] = share
    return Change(times)


@pytest.mark.parametrize("key", SETTINGS)
def test_no_change_gives_nothing(key: str) -> None:
    panel = complete(gompertz_panel(seed=1))
    parts = Parts.of(panel, three_causes(panel))
    found = what_if(
        EVERY, panel, parts, Change(np.ones(parts.deaths.shape)), settings(key),
        streams=np.array("isle.f.2001"),
    )  # fmt: skip
    for one in EVERY:
        change = found.change[one.key]
        if np.isfinite(change.value):
            assert change.value == 0, one.key
            assert abs(change.low) < 1e-12, one.key
            assert abs(change.high) < 1e-12, one.key
            assert not found.first_order[one.key] > 0, one.key
    assert not found.fewer.any()
    assert not found.years.any()


def test_then_is_what_the_changed_counts_alone_give() -> None:
    panel = complete(gompertz_panel(seed=1))
    parts = Parts.of(panel)
    change = some_fewer(parts)
    found = what_if(EVERY, panel, parts, change, ALMANAC)
    alone = estimates(
        EVERY, replace(panel, deaths=panel.deaths * change.factor[0], counted=None), ALMANAC
    )
    now = estimates(EVERY, panel, ALMANAC)
    for one in EVERY:
        assert_array_equal(found.then[one.key].value, alone[one.key].value, err_msg=one.key)
        gap = alone[one.key].value - now[one.key].value
        assert_array_equal(found.change[one.key].value, gap, err_msg=one.key)


@pytest.mark.parametrize("one", SMOOTH, ids=lambda one: one.key)
def test_a_small_change_is_the_first_order_one(one) -> None:  # type: ignore[no-untyped-def]
    panel = complete(gompertz_panel(seed=1))
    parts = Parts.of(panel, three_causes(panel))
    times = np.ones(parts.deaths.shape)
    errors = []
    for step in (1e-3, 1e-4):
        times[1, 5:15] = 1 - step
        found = what_if([one], panel, parts, Change(times), ALMANAC)
        exact, first = found.change[one.key].value, found.first_order[one.key]
        errors.append(float(abs(exact - first) / max(abs(first), 1e-300)))
    assert errors[0] < 2e-3
    assert errors[1] < max(0.2 * errors[0], 1e-8)


def test_of_numbers_without_a_gradient_there_is_no_first_order() -> None:
    panel = complete(gompertz_panel(seed=1))
    parts = Parts.of(panel)
    found = what_if(EVERY, panel, parts, some_fewer(parts), ALMANAC)
    none = {key for key, value in found.first_order.items() if np.isnan(value)}
    assert none == {one.key for one in EVERY if one not in SMOOTH}


@pytest.mark.parametrize("percent", [-40.0, -5.0, 30.0])
def test_at_a_constant_rate_life_expectancy_is_its_inverse(percent: float) -> None:
    rate, panel = 0.02, stationary(0.02)
    parts, times = Parts.of(panel), 1 + percent / 100
    change = Change(np.full(parts.deaths.shape, times))
    found = what_if([E0, H], panel, parts, change, settings("almanac-1-constant-rate"))
    gained = 1 / (rate * times) - 1 / rate
    assert_allclose(found.change["e0"].value, gained, rtol=1e-12)
    assert_allclose(found.first_order["e0"], -(times - 1) / rate, rtol=1e-12)
    # one death more at an age moves 1 / r by minus the years lived there over its person-years
    lived = panel.exposure
    weights = [-lived_at(r) * r_by / r / lived for r, r_by in ((rate, 1.0), (rate * times, times))]
    se = np.sqrt(((weights[1] - weights[0]) ** 2 * panel.deaths).sum())
    assert_allclose(found.change["e0"].se, se, rtol=1e-9)
    count = parts.deaths.sum()
    assert_allclose(found.fewer.sum(), (1 - times) * count)
    assert_allclose(found.years.sum(), (1 - times) * count / rate, rtol=1e-12)


def test_parts_of_a_population_do_not_move_the_limits() -> None:
    """All causes changed alike: the same numbers and limits as all deaths at once."""
    panel = complete(gompertz_panel(seed=1))
    whole, by_cause = Parts.of(panel), Parts.of(panel, three_causes(panel))
    first, second = (
        what_if(EVERY, panel, parts, some_fewer(parts), ALMANAC) for parts in (whole, by_cause)
    )
    for one in EVERY:
        a, b = first.change[one.key], second.change[one.key]
        for name in ("value", "low", "high", "se"):
            assert_allclose(getattr(a, name), getattr(b, name), rtol=1e-9, atol=1e-15)


def redrawn(one, panel: Panel, parts: Parts, change: Change, other=None):  # type: ignore[no-untyped-def]
    """Standard deviation of the change over 4,000 tables of simulated deaths."""
    rng = np.random.default_rng(7)
    worth = parts.worth
    deaths = worth * rng.poisson(parts.counts, (4000, *parts.counts.shape))
    if other is not None:
        lender = change.benchmark
        both = rng.poisson(lender.shared, deaths.shape)
        deaths = worth * (rng.poisson(parts.counts - lender.shared, deaths.shape) + both)
        theirs = rng.poisson(lender.parts.counts - lender.shared, deaths.shape) + both
        moved = replace(lender.parts, deaths=theirs.astype(float))
        change = replace(change, benchmark=replace(lender, parts=moved))
    drawn = replace(parts, deaths=deaths)
    sums = deaths.sum(axis=-2)
    many = panel.over(lambda array: np.broadcast_to(array, (4000, array.shape[-1])))
    many = replace(many, deaths=sums, counted=None)
    now = one.value(run(many, ALMANAC))
    then = one.value(run(replace(many, deaths=change.deaths(drawn).sum(axis=-2)), ALMANAC))
    return float(np.std(then - now))


@pytest.mark.parametrize("key", ["e0", "H", "asr_esp2013", "45q15"])
def test_the_standard_error_is_that_of_deaths_drawn_anew(key: str) -> None:
    panel, one = gompertz_panel(seed=1, people=2e6), find(key)
    parts = Parts.of(panel, three_causes(panel))
    times = np.ones(parts.deaths.shape)
    times[0, 4:], times[2, :12] = 0.6, 0.0
    found = what_if([one], panel, parts, Change(times), ALMANAC).change[key]
    assert float(found.se) == pytest.approx(redrawn(one, panel, parts, Change(times)), rel=0.06)


@pytest.mark.parametrize("overlap", [0.0, 1.0])
@pytest.mark.parametrize("key", ["e0", "asr_esp2013"])
def test_a_benchmark_brings_its_own_chance_and_shared_deaths_count_once(
    key: str, overlap: float
) -> None:
    panel, one = gompertz_panel(seed=1, people=2e6), find(key)
    rest = gompertz_panel(seed=2, people=4e6, level=1.2e-5)
    other = replace(
        rest, deaths=rest.deaths + panel.deaths, exposure=rest.exposure + panel.exposure
    )
    parts, theirs = Parts.of(panel), Parts.of(other)
    cells = np.zeros(parts.deaths.shape, bool)
    cells[..., 4:18] = True
    change = Change(np.ones(parts.deaths.shape), Benchmark(theirs, cells, overlap * parts.deaths))
    found = what_if([one], panel, parts, change, ALMANAC).change[key]
    drawn = redrawn(one, panel, parts, change, other)
    assert float(found.se) == pytest.approx(drawn, rel=0.06)


def test_shared_out_deaths_carry_the_chance_of_those_counted() -> None:
    panel = gompertz_panel(seed=1)
    halves = CauseCounts(panel.deaths[None], panel.deaths[None] / 2)
    one = what_if([E0], panel, Parts.of(panel), some_fewer(Parts.of(panel)), ALMANAC)
    two = Parts.of(panel, halves)
    other = what_if([E0], panel, two, some_fewer(two), ALMANAC)
    ratio = other.change["e0"].se / one.change["e0"].se
    assert_allclose(ratio, np.sqrt(2), rtol=1e-12)


def test_counts_over_births_move_as_their_own_count() -> None:
    panel = complete(gompertz_panel(seed=1, infant=0.02))
    parts = Parts.of(panel)
    of_births = [one for one in EVERY if one.unit.limits == "count"]
    found = what_if(of_births, panel, parts, some_fewer(parts, 0.75, slice(0, 1)), ALMANAC)
    for key in ("imr", "nmr", "pnmr"):
        change, now = found.change[key], found.now[key]
        assert_allclose(change.value, -0.25 * now.value, rtol=1e-12)
        assert change.low < change.value < change.high < 0
    assert found.change["sbr"].value == 0


def batch() -> tuple[Panel, Parts, Change]:
    panel = complete(gompertz_panel(seed=5, level=np.array([[2e-5], [3e-5]]), slope=[0.1, 0.09]))
    parts = Parts.of(panel, three_causes(panel))
    rng = np.random.default_rng(1)
    other = Parts.of(gompertz_panel(seed=6), three_causes(gompertz_panel(seed=6)))
    lender = Benchmark(
        other, rng.random(parts.deaths.shape) < 0.3, np.minimum(parts.counts, other.counts) / 2
    )
    return panel, parts, Change(rng.random(parts.deaths.shape), lender.over(
        lambda array: np.broadcast_to(array, parts.deaths.shape)
    ))  # fmt: skip


def test_a_batch_is_its_rows_to_the_last_bit() -> None:
    panel, parts, change = batch()
    some = replace(ALMANAC, draws=20)
    streams = codes(panel)
    together = what_if(EVERY, panel, parts, change, some, streams=streams)
    for where in np.ndindex(panel.batch_shape):

        def cut(array, where=where):  # type: ignore[no-untyped-def]
            return array[where]

        alone = what_if(
            EVERY, panel[where], parts.over(cut), change.over(cut), some, streams=streams[where]
        )
        for one in EVERY:
            a, b = together.change[one.key][where], alone.change[one.key]
            for name in ("value", "low", "high", "se", "reason"):
                assert_array_equal(getattr(a, name), getattr(b, name), err_msg=one.key)
            assert_array_equal(together.first_order[one.key][where], alone.first_order[one.key])
        assert_array_equal(together.years[where], alone.years)


def test_without_deaths_in_the_open_group_the_number_is_gone_and_says_why() -> None:
    panel = gompertz_panel(seed=1)
    parts = Parts.of(panel)
    found = what_if([E0], panel, parts, some_fewer(parts, 0.0, slice(-1, None)), ALMANAC)
    assert np.isnan(found.change["e0"].value)
    assert found.change["e0"].reason == 3
    whole = replace(panel, deaths=4 * panel.deaths, exposure=4 * panel.exposure)
    lent = what_if(
        [E0], replace(panel, whole=whole), parts, some_fewer(parts, 0.0, slice(-1, None)),
        settings("almanac-1-borrow"),
    )  # fmt: skip
    assert np.isnan(lent.change["e0"].value), "another population's rate is no gain"


def test_persons_counted_wrongly_widen_the_change() -> None:
    panel = gompertz_panel(seed=1)
    parts = Parts.of(panel)
    narrow, wide = (
        what_if([E0], panel, parts, some_fewer(parts), settings(key)).change["e0"]
        for key in ("almanac-1", "almanac-1-population-2")
    )
    assert narrow.value == wide.value
    assert wide.high - wide.low > narrow.high - narrow.low


def test_an_open_group_on_single_ages_works_too() -> None:
    panel = gompertz_panel(GRIDS["single"], seed=1)
    parts = Parts.of(panel)
    found = what_if([E0, H], panel, parts, some_fewer(parts, 0.9, slice(0, None)), ALMANAC)
    # all rates 10 % lower: to first order H times as much of e0
    now = found.now
    assert_allclose(found.first_order["e0"], 0.1 * now["H"].value * now["e0"].value, rtol=5e-3)
