"""Intervals against simulation, counts that overlap, and what is said where there is none."""

from dataclasses import fields, replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from scipy.stats import chi2

from engine.chain import gradient, run
from engine.chance import miscount
from engine.estimates import Estimate, Reason
from engine.indicators import INDICATORS, difference, differences, estimate, estimates, find
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from engine.streams import poisson_draws
from tests.factories import GRIDS, codes, complete, gompertz_panel

SETTINGS_1 = SETTINGS["almanac-1"]
SMOOTH = [one for one in INDICATORS.values() if one.smooth and one.unit.limits != "count"]
E0, MODE, MEDIAN = INDICATORS["e0"], INDICATORS["mode"], INDICATORS["median"]


@pytest.mark.parametrize("settings", SETTINGS.values(), ids=lambda s: s.key)
def test_standard_errors_are_the_spread_of_simulated_values(settings: Settings) -> None:
    panel = complete(gompertz_panel(people=3e6, seed=5))
    deaths = poisson_draws(panel.deaths, np.array("isle"), 2000, "test")
    copies = panel.over(lambda array: np.broadcast_to(array, (2000, *array.shape)))
    out = 1 + miscount(panel.grid, settings) * np.random.default_rng(3).normal(size=(2000, 1))
    simulated = run(replace(copies, deaths=deaths, exposure=panel.exposure * out), settings)
    # where rates are smoothed each table drawn is smoothed anew, the delta method holds how much
    near = 0.06 if settings.smoothing == "none" else 0.12
    for one, got in zip(SMOOTH, estimates(SMOOTH, panel, settings).values(), strict=True):
        assert got.se == pytest.approx(one.value(simulated).std(), rel=near), one.key


def test_the_level_of_the_settings_is_the_level_of_the_interval() -> None:
    panel = gompertz_panel(seed=1)
    narrow = estimate(E0, panel, replace(SETTINGS_1, level=0.5))
    wide = estimate(E0, panel, SETTINGS_1)
    assert (wide.high - wide.low) / (narrow.high - narrow.low) == pytest.approx(
        1.9599639845 / 0.6744897502, rel=0.03
    )
    narrow, wide = (
        estimate(MEDIAN, panel, replace(SETTINGS_1, level=level), streams=np.array("isle"))
        for level in (0.5, 0.95)
    )
    assert wide.low < narrow.low < narrow.high < wide.high


def test_the_variance_of_a_part_against_its_whole_counts_shared_deaths_once() -> None:
    part, rest = gompertz_panel(seed=1), gompertz_panel(seed=2, level=4e-5)
    whole = replace(part, deaths=part.deaths + rest.deaths, exposure=part.exposure + rest.exposure)
    got = difference(E0, part, whole, SETTINGS_1, shared=part)
    # written over the two disjoint sets of deaths, of which the whole holds both
    g, h = (gradient(E0, run(panel, SETTINGS_1)) for panel in (part, whole))
    own = (g / part.exposure - h / whole.exposure) ** 2 * part.deaths
    other = (h / whole.exposure) ** 2 * rest.deaths
    assert got.se == pytest.approx(np.sqrt((own + other).sum()), rel=1e-9)
    assert (got.high - got.low) / 2 == pytest.approx(1.959964 * got.se, rel=0.02)


@pytest.mark.parametrize("key", ["e0", "H", "ageing_rate"])
def test_shared_deaths_count_in_the_join_each_side_makes(key: str) -> None:
    """Nobody of the part was counted at 70-74, yet some of its deaths were: they count in the rate
    of 65-69 there, and in that of 70-74 in the whole. Against steps in each count by itself."""
    part, rest = gompertz_panel(seed=1), gompertz_panel(seed=2, level=4e-5)
    part.exposure[part.grid.position(70)] = 0
    whole = replace(part, deaths=part.deaths + rest.deaths, exposure=part.exposure + rest.exposure)
    got = difference(find(key), part, whole, SETTINGS_1, shared=part)
    ages = len(part.grid)
    step = np.eye(ages) * 0.01

    def slopes(in_part: float) -> np.ndarray:
        """By each count of the part (1), or of the rest of the whole (0), on its own."""
        sides = [
            find(key).value(
                run(replace(repeated(panel, ages), deaths=panel.deaths + moved), SETTINGS_1)
            )
            for sign in (1, -1)
            for panel, moved in ((part, sign * in_part * step), (whole, sign * step))
        ]
        return (sides[0] - sides[1] - sides[2] + sides[3]) / 0.02

    variance = (slopes(1) ** 2 * part.deaths + slopes(0) ** 2 * rest.deaths).sum()
    assert got.se == pytest.approx(np.sqrt(variance), rel=1e-6)


def repeated(panel: Panel, times: int) -> Panel:
    return panel[np.newaxis][np.zeros(times, int)]


def test_two_independent_populations_add_their_variances() -> None:
    this, that = gompertz_panel(seed=1), gompertz_panel(seed=2, level=4e-5)
    got = difference(E0, this, that, SETTINGS_1)
    one, other = (estimate(E0, panel, SETTINGS_1) for panel in (this, that))
    assert got.se == pytest.approx(np.hypot(one.se, other.se), rel=1e-12)
    reach = np.hypot(one.value - one.low, other.high - other.value)
    assert got.value - got.low == pytest.approx(reach, rel=1e-12)


def test_the_same_deaths_on_both_sides_leave_nothing_to_chance() -> None:
    panel = gompertz_panel(seed=1)
    got = difference(E0, panel, panel, SETTINGS_1, shared=panel)
    assert got.value == 0
    assert np.isnan([got.low, got.high]).all()
    assert got.reason == Reason.NO_SAMPLING_INTERVAL
    names = codes(panel)
    got = difference(MODE, panel, panel, SETTINGS_1, shared=panel, streams=(names, names))
    assert got.value == 0
    assert np.isnan([got.low, got.high]).all()
    assert got.reason == Reason.NO_SAMPLING_INTERVAL


def test_the_same_deaths_among_other_people_are_not_the_same() -> None:
    """Chance in deaths moves both sides, but not alike."""
    panel = gompertz_panel(seed=1)
    fewer = replace(panel, exposure=panel.exposure * np.linspace(0.8, 0.9, len(panel.grid)))
    names = codes(panel, "this"), codes(panel, "that")
    for indicator in (E0, MEDIAN):
        got = difference(indicator, panel, fewer, SETTINGS_1, shared=panel, streams=names)
        assert got.reason == Reason.NONE
        assert got.low < got.value < got.high


def test_shared_deaths_narrow_a_simulated_difference_as_they_narrow_a_delta_one() -> None:
    part, rest = (gompertz_panel(seed=seed, people=5e6) for seed in (1, 2))
    whole = replace(part, deaths=part.deaths + rest.deaths, exposure=part.exposure + rest.exposure)
    many = replace(SETTINGS_1, draws=4000)
    names = np.array("part"), np.array("whole")
    stepped = replace(E0, why_not_smooth="pretended, to compare the two ways", needs=MODE.needs)
    for shared in (None, part):
        delta = difference(E0, part, whole, many, shared=shared)
        drawn = difference(stepped, part, whole, many, shared=shared, streams=names)
        width = (drawn.high - drawn.low) / (delta.high - delta.low)
        assert width == pytest.approx(1, abs=0.06)


def test_without_streams_a_number_that_is_not_smooth_has_no_interval() -> None:
    panel = gompertz_panel(seed=1)
    got = estimate(MODE, panel, SETTINGS_1)
    assert np.isfinite(got.value)
    assert np.isnan(got.low)
    assert got.reason == Reason.NOT_SIMULATED
    assert difference(MODE, panel, panel, SETTINGS_1).reason == Reason.NOT_SIMULATED


def spared() -> Panel:
    """A small town in which no child died."""
    panel = complete(gompertz_panel(people=20_000))
    return replace(panel, deaths=np.where(np.arange(len(panel.grid)) < 2, 0, panel.deaths))


def test_no_deaths_behind_a_chance_of_dying_leave_the_upper_limit_of_none() -> None:
    """As if one had died in the first year or the next four, where it weighs most."""
    panel = spared()
    got = estimate(find("5q0"), panel, SETTINGS_1)
    weight = gradient(find("5q0"), run(panel, SETTINGS_1)) / panel.exposure
    assert (got.value, got.low) == (0, 0)
    assert got.high == pytest.approx(weight.max() * chi2.ppf(0.975, 2) / 2, rel=1e-9)
    assert np.isnan(got.se)
    assert got.reason == Reason.NONE


def test_a_difference_from_a_side_without_deaths_reaches_as_far_as_that_side() -> None:
    panel = gompertz_panel(people=100_000)
    for sign, (this, that) in ((1, (panel, spared())), (-1, (spared(), panel))):
        got = difference(find("5q0"), this, that, SETTINGS_1)
        some, none = (estimate(find("5q0"), one, SETTINGS_1) for one in (panel, spared()))
        ends = sorted((sign * got.low, sign * got.high))
        assert sign * got.value == some.value
        assert ends[0] == pytest.approx(
            some.value - np.hypot(some.value - some.low, none.high), rel=1e-9
        )
        assert ends[1] == pytest.approx(some.high, rel=1e-9)
        assert np.isnan(got.se)


@pytest.mark.parametrize(
    ("sides", "settings"),
    [(2, SETTINGS_1), *((1, settings) for settings in SETTINGS.values())],
    ids=lambda part: getattr(part, "key", str(part)),
)
def test_many_indicators_are_read_together_as_each_alone(sides: int, settings: Settings) -> None:
    this, that = (
        complete(gompertz_panel(seed=1, level=np.array([2e-5, 3e-5]))),
        complete(gompertz_panel(seed=2, level=np.array([3e-5, 3e-5]))),
    )
    names = codes(this, "this"), codes(this, "that")
    every = list(INDICATORS.values())
    few = replace(settings, draws=10)
    if sides == 1:
        together = estimates(every, this, few, streams=names[0])
        alone = {one.key: estimate(one, this, few, streams=names[0]) for one in every}
    else:
        together = differences(every, this, that, few, streams=names)
        alone = {one.key: difference(one, this, that, few, streams=names) for one in every}
    assert list(together) == list(alone)
    for key in together:
        for part in fields(Estimate):
            assert_array_equal(getattr(together[key], part.name), getattr(alone[key], part.name))


def test_a_difference_names_what_either_side_lacks() -> None:
    sound = gompertz_panel(seed=1)
    few = replace(sound, deaths=sound.deaths / 1000, exposure=sound.exposure / 1000)
    for this, that in ((sound, few), (few, sound)):
        got = difference(E0, this, that, SETTINGS_1)
        assert np.isnan(got.value)
        assert got.reason == Reason.TOO_FEW_PERSON_YEARS
    nothing = replace(sound, deaths=sound.deaths * np.nan)
    for this, that, why in (
        (few, nothing, Reason.TOO_FEW_PERSON_YEARS),
        (nothing, few, Reason.NOT_AVAILABLE),
    ):
        assert difference(E0, this, that, SETTINGS_1).reason == why


def test_joined_groups_keep_the_covariance_of_what_they_share() -> None:
    part, rest = gompertz_panel(seed=1), gompertz_panel(seed=2)
    empty = np.arange(len(part.grid)) == 20
    part, rest = (
        replace(p, deaths=np.where(empty, 1.0, p.deaths), exposure=np.where(empty, 0, p.exposure))
        for p in (part, rest)
    )
    same = difference(E0, part, part, SETTINGS_1, shared=part)
    assert same.reason == Reason.NO_SAMPLING_INTERVAL


def test_grids_must_agree_and_shared_deaths_be_in_both() -> None:
    panel = gompertz_panel(seed=1)
    with pytest.raises(ValueError, match="the age groups differ"):
        difference(E0, panel, gompertz_panel(GRIDS["single"], seed=1), SETTINGS_1)
    with pytest.raises(ValueError, match="more deaths are shared than one side has"):
        difference(E0, panel, panel, SETTINGS_1, shared=replace(panel, deaths=panel.deaths + 1))


def test_no_populations_give_no_figures() -> None:
    empty = gompertz_panel(slope=np.zeros(0))
    for indicator in (E0, MODE, MEDIAN):
        got = estimate(indicator, empty, SETTINGS_1, streams=codes(empty))
        assert got.value.shape == got.low.shape == got.reason.shape == (0,)


def test_counts_over_births_have_the_exact_limits_of_their_count() -> None:
    panel = complete(gompertz_panel(people=30_000, seed=4))
    live, still, _ = panel.births
    for key, count, over in (("imr", panel.deaths[0], live), ("sbr", still, live + still)):
        got = estimate(find(key), panel, SETTINGS_1)
        exact = chi2.ppf([0.025, 0.975], [2 * count, 2 * count + 2]) / 2 / over
        assert_allclose([got.low, got.high], exact, rtol=1e-9)
        assert got.se == pytest.approx(np.sqrt(count) / over)


def test_births_of_a_part_count_once_in_a_difference_from_its_whole() -> None:
    part, rest = (complete(gompertz_panel(people=2e5, seed=seed)) for seed in (1, 2))
    sums = {n: getattr(part, n) + getattr(rest, n) for n in ("deaths", "exposure", "births")}
    whole = replace(part, **sums)
    for key, own, births in (
        ("imr", (part.deaths[0], rest.deaths[0]), (part.births[0], whole.births[0])),
        ("nmr", (part.births[2], rest.births[2]), (part.births[0], whole.births[0])),
    ):
        got = difference(find(key), part, whole, SETTINGS_1, shared=part)
        slopes = 1 / births[0] - 1 / births[1], 1 / births[1]
        assert got.se == pytest.approx(np.sqrt(np.dot(np.square(slopes), own)), rel=1e-9)
    unknown = replace(part, births=part.births * np.nan)
    nmr, apart = (
        difference(find("nmr"), part, whole, SETTINGS_1, shared=both) for both in (unknown, None)
    )
    assert nmr.se == apart.se


COUNTED = replace(SETTINGS_1, population_error=((65, 1.0), (85, 4.0)))


def test_persons_counted_wrongly_move_a_rate_as_far_as_they_weigh() -> None:
    panel = complete(gompertz_panel(people=3e5, seed=1))
    rate, error = find("cdr"), miscount(panel.grid, COUNTED)
    chance, got = (estimate(rate, panel, settings) for settings in (SETTINGS_1, COUNTED))
    years = panel.exposure.sum()
    moved = chance.value * (error * panel.exposure).sum() / years
    assert got.value == chance.value
    assert got.se == pytest.approx(np.hypot(chance.se, moved), rel=1e-3)
    for side, near in ((got.low, chance.low), (got.high, chance.high)):
        reach = np.hypot(near - chance.value, 1.959964 * moved)
        assert abs(side - got.value) == pytest.approx(reach, rel=1e-3)


def test_persons_counted_wrongly_move_all_ages_together() -> None:
    """Against the slope in each rate times the change of that rate, summed before it is squared."""
    panel = gompertz_panel(people=3e5, seed=1)
    chain = run(panel, SETTINGS_1)
    moved = (gradient(E0, chain) * chain.rates.mx * miscount(panel.grid, COUNTED)).sum()
    chance, got = (estimate(E0, panel, settings) for settings in (SETTINGS_1, COUNTED))
    assert got.se == pytest.approx(np.hypot(chance.se, moved), rel=1e-3)
    assert got.se > 1.05 * chance.se


def test_persons_counted_wrongly_widen_a_simulated_number_as_they_widen_a_smooth_one() -> None:
    panel = gompertz_panel(people=3e6, seed=1)
    stepped = replace(E0, why_not_smooth="pretended, to compare the two ways")
    many = replace(COUNTED, draws=4000)
    delta = estimate(E0, panel, many)
    drawn = estimate(stepped, panel, many, streams=codes(panel))
    assert drawn.se == pytest.approx(delta.se, rel=0.04)
    assert drawn.high - drawn.low == pytest.approx(delta.high - delta.low, rel=0.08)


def test_each_side_of_a_difference_has_its_own_error_of_the_population() -> None:
    part, rest = gompertz_panel(seed=1), gompertz_panel(seed=2, level=4e-5)
    whole = replace(part, deaths=part.deaths + rest.deaths, exposure=part.exposure + rest.exposure)
    chance, got = (
        difference(E0, part, whole, settings, shared=part) for settings in (SETTINGS_1, COUNTED)
    )
    alone = [
        estimate(E0, panel, COUNTED).se ** 2 - estimate(E0, panel, SETTINGS_1).se ** 2
        for panel in (part, whole)
    ]
    assert got.se**2 - chance.se**2 == pytest.approx(sum(alone), rel=1e-9)
    same = difference(E0, part, part, COUNTED, shared=part)
    assert same.reason == Reason.NO_SAMPLING_INTERVAL
