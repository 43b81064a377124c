"""Standardised rates: laws, and sums made by hand over groups taken apart."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import HealthCheck, given
from hypothesis import settings as how
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.count_limits import exact_limits
from engine.indicators import estimates, find
from engine.indicators.rates import FAMILY as RATES
from engine.indicators.standardised import by_population, by_standard
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.stages.rates import Rates, death_rates
from engine.standardisation import (
    Weighted,
    crude,
    direct,
    expected_deaths,
    few_deaths,
    indirect,
    observed_over_expected,
    used,
)
from engine.standards import STANDARDS, Standard
from tests.engine.stepping import complex_step, largest_error
from tests.factories import GRIDS, LIMITS, gompertz_panel, panels

TO_85 = AgeGrid((0, 1, *range(5, 86, 5)))
ODD = AgeGrid((0, 1, 3, 5, 12, 15, 25, 40, 45, 60, 65, 74, 80, 83))
every_standard = pytest.mark.parametrize("standard", STANDARDS.values(), ids=lambda s: s.key)
drawn = how(max_examples=15, deadline=None, suppress_health_check=list(HealthCheck))


def by(standard: Standard, panel: Panel, mx: Array | None = None) -> Weighted:
    rates = rates_of(panel)
    people = np.array(standard.weights)
    mx = rates.mx if mx is None else mx
    return direct(panel.grid, mx, panel.exposure, people, standard.grid)


def rates_of(panel: Panel) -> Rates:
    return death_rates(panel.deaths, panel.exposure)


def by_hand(standard: Standard, panel: Panel) -> float:
    """Group by group, counts and people summed from one shared start to the next."""
    starts = [s for s in panel.grid.starts if s in standard.starts]
    total = 0.0
    for start, end in zip(starts, [*starts[1:], 999], strict=True):
        inside = [start <= age < end for age in panel.grid.starts]
        people = sum(w for w, age in zip(standard.weights, standard.starts, strict=True)
                     if start <= age < end)  # fmt: skip
        total += people * panel.deaths[inside].sum() / panel.exposure[inside].sum()
    return total / sum(standard.weights)


@every_standard
@pytest.mark.parametrize("grid", [*GRIDS.values(), TO_85, ODD, AgeGrid((0, 20, 65)), AgeGrid((0,))])
def test_groups_are_summed_to_those_that_counts_and_standard_share(
    standard: Standard, grid: AgeGrid
) -> None:
    panel = gompertz_panel(GRIDS["single"], seed=4)
    panel = panel.regroup(GRIDS["single"].common(grid))
    assert by(standard, panel).value == pytest.approx(by_hand(standard, panel), rel=1e-12)


@every_standard
@drawn
@given(panel=panels())
def test_counts_summed_beforehand_change_nothing(standard: Standard, panel: Panel) -> None:
    shared = panel.regroup(panel.grid.common(standard.grid))
    assert_allclose(by(standard, shared).value, by(standard, panel).value, rtol=1e-12)


@every_standard
@drawn
@given(panel=panels(), times=st.floats(1e-3, 1e6))
def test_only_the_proportions_of_the_weights_matter(
    standard: Standard, panel: Panel, times: float
) -> None:
    more = replace(standard, weights=tuple(times * w for w in standard.weights))
    assert_allclose(by(more, panel).value, by(standard, panel).value, rtol=1e-12)


@every_standard
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
def test_one_rate_at_all_ages_is_the_standardised_rate(standard: Standard, grid: AgeGrid) -> None:
    panel = gompertz_panel(grid)
    got = by(standard, replace(panel, deaths=0.0125 * panel.exposure))
    assert got.value == pytest.approx(0.0125, rel=1e-12)


@drawn
@given(panel=panels())
def test_by_its_own_people_it_is_the_crude_rate(panel: Panel) -> None:
    rates = rates_of(panel)
    own = direct(panel.grid, rates.mx, panel.exposure, panel.exposure, panel.grid)
    whole = crude(panel.grid, rates.mx, panel.exposure)
    counted = panel.deaths.sum(axis=-1) / panel.exposure.sum(axis=-1)
    assert_allclose(own.value, counted, rtol=1e-12)
    assert_allclose(whole.value, counted, rtol=1e-12)
    assert_allclose(own.gradient, whole.gradient, rtol=1e-12)


@every_standard
@drawn
@given(panel=panels())
def test_the_rate_is_the_weighted_sum_of_its_deaths(standard: Standard, panel: Panel) -> None:
    """So that the limits of a weighted sum of counts are its limits."""
    rates, got = rates_of(panel), by(standard, panel)
    weighed = (rates.per_death(got.gradient) * panel.deaths).sum(axis=-1)
    assert_allclose(weighed, got.value, rtol=1e-12)


@every_standard
@pytest.mark.parametrize("grid", [GRIDS["single"], GRIDS["irregular"], TO_85, ODD])
def test_the_gradient_is_the_complex_step(standard: Standard, grid: AgeGrid) -> None:
    panel = gompertz_panel(grid, seed=2, slope=np.array([0.09, 0.1]))
    stepped = complex_step(lambda mx: by(standard, panel, mx).value, rates_of(panel).mx)
    assert largest_error(by(standard, panel).gradient, stepped) < 1e-12


def holed(*ages: int) -> Panel:
    """Nobody lived at these ages, but one died at each."""
    panel = gompertz_panel(GRIDS["single"], seed=9)
    deaths, exposure = panel.deaths.copy(), panel.exposure.copy()
    deaths[list(ages)], exposure[list(ages)] = 1.0, 0.0
    return replace(panel, deaths=deaths, exposure=exposure)


def holding(standard: Standard, age: int) -> int:
    """The number of the group with this age."""
    return sum(start <= age for start in standard.starts) - 1


@pytest.mark.parametrize("ages", [(42,), (44, 45), tuple(range(95, 101)), (40, 41, 42, 43, 44, 45)])
def test_a_group_without_person_years_takes_the_rate_of_the_one_below(
    ages: tuple[int, ...],
) -> None:
    standard, panel = STANDARDS["esp2013"], holed(*ages)
    shared = panel.grid.regroup(panel.deaths, standard.grid).copy()
    years = panel.grid.regroup(panel.exposure, standard.grid).copy()
    # deaths of an age without people belong with the age below, so with the group of that age
    below = holding(standard, min(ages) - 1)
    for age in ages:
        shared[holding(standard, age)] -= 1
        shared[below] += 1
    with np.errstate(all="ignore"):
        mx = shared / years
    for x in range(1, len(mx)):
        if years[x] == 0:
            mx[x] = mx[x - 1]
    expected = (np.array(standard.weights) * mx).sum() / 100_000
    got, rates = by(standard, panel), rates_of(panel)
    assert got.value == pytest.approx(expected, rel=1e-12)
    g = rates.pull(got.gradient)
    assert np.all(g[list(ages)] == 0)
    assert (g * rates.mx).sum() == pytest.approx(expected, rel=1e-12)
    assert (rates.per_death(g) * panel.deaths).sum() == pytest.approx(expected, rel=1e-12)


def test_a_gap_is_a_gap_and_touches_no_other_population() -> None:
    panel = gompertz_panel(GRIDS["abridged"], seed=1, slope=np.linspace(0.08, 0.1, 3))
    deaths = panel.deaths.copy()
    deaths[1, 7] = np.nan
    got = by(STANDARDS["who2000"], replace(panel, deaths=deaths)).value
    assert np.isnan(got).tolist() == [False, True, False]
    none = direct(panel.grid, rates_of(panel).mx, panel.exposure, 0 * panel.exposure, panel.grid)
    assert np.all(np.isnan(none.value))


def test_people_laid_out_otherwise_in_memory_give_the_same_bits() -> None:
    panel = gompertz_panel(GRIDS["single"], seed=1, slope=np.linspace(0.08, 0.1, 40))
    mx, years = rates_of(panel).mx, panel.exposure
    plain = direct(panel.grid, mx, years, years, panel.grid).value
    turned = direct(panel.grid, mx, years, np.asfortranarray(years), panel.grid).value
    assert_array_equal(turned, plain)
    whole = panel.over(np.asfortranarray)
    assert_array_equal(expected_deaths(years, whole), expected_deaths(years, panel))


# ---- against a whole -----------------------------------------------------------------------------


def parts() -> tuple[Panel, Panel]:
    """Three areas and, for each, the whole they make up."""
    areas = gompertz_panel(GRIDS["abridged"], seed=3, slope=np.linspace(0.085, 0.1, 3),
                           people=4e5)  # fmt: skip
    whole = areas.over(lambda array: np.broadcast_to(array.sum(axis=0), array.shape))
    return areas, whole


def test_the_whole_is_as_expected_of_itself() -> None:
    _, whole = parts()
    mx = rates_of(whole).mx
    assert_allclose(observed_over_expected(mx, whole.exposure, whole).value, 1, rtol=1e-12)
    crude_rate = whole.deaths.sum(axis=-1) / whole.exposure.sum(axis=-1)
    assert_allclose(indirect(mx, whole.exposure, whole).value, crude_rate, rtol=1e-12)


def test_expected_deaths_of_the_areas_add_up_to_the_deaths_of_the_whole() -> None:
    areas, whole = parts()
    expected = expected_deaths(areas.exposure, whole)
    assert expected.sum() == pytest.approx(areas.deaths.sum(), rel=1e-12)
    by_hand = [sum(whole.deaths[0] / whole.exposure[0] * years) for years in areas.exposure]
    assert_allclose(expected, by_hand, rtol=1e-12)
    got = observed_over_expected(rates_of(areas).mx, areas.exposure, whole)
    assert_allclose(got.value, areas.deaths.sum(axis=-1) / expected, rtol=1e-12)


@pytest.mark.parametrize("read", [observed_over_expected, indirect])
def test_rates_twice_those_of_the_whole_are_a_ratio_of_two_whatever_the_ages(
    read: Callable[[Array, Array, Panel], Weighted],
) -> None:
    areas, whole = parts()
    twice = 2 * rates_of(whole).mx
    crude_rate = whole.deaths.sum(axis=-1) / whole.exposure.sum(axis=-1)
    got = read(twice, areas.exposure, whole)
    unit = 1.0 if read is observed_over_expected else crude_rate
    assert_allclose(got.value, 2 * unit, rtol=1e-12)
    stepped = complex_step(lambda mx: read(mx, areas.exposure, whole).value, twice)
    assert largest_error(got.gradient, stepped) < 1e-12


def test_where_nothing_is_expected_there_is_no_ratio() -> None:
    areas, whole = parts()
    none = replace(whole, deaths=0 * whole.deaths)
    got = observed_over_expected(rates_of(areas).mx, areas.exposure, none)
    assert np.all(np.isnan(got.value))


# ---- limits --------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", LIMITS)
@given(weight=st.floats(1e-6, 1e3), deaths=st.lists(st.integers(0, 50), min_size=4, max_size=4))
def test_equal_weights_give_the_exact_limits_of_the_count(
    name: str, weight: float, deaths: list[int]
) -> None:
    counts = np.array([*deaths, 1], float)
    alone = LIMITS["gamma"](np.ones(1), counts.sum(keepdims=True), 0.9)
    got = LIMITS[name](np.full(5, weight), counts, 0.9)
    assert_allclose(got, weight * np.array(alone), rtol=1e-9)


@pytest.mark.parametrize("name", LIMITS)
def test_limits_lie_around_the_rate_and_narrow_with_the_level(name: str) -> None:
    rng = np.random.default_rng(1)
    weights, deaths = rng.uniform(0.1, 3, (50, 6)), rng.poisson(4, (50, 6)).astype(float)
    value = (weights * deaths).sum(axis=-1)
    wide, narrow = (LIMITS[name](weights, deaths, level) for level in (0.99, 0.8))
    assert np.all((wide.low < narrow.low) & (narrow.low < value))
    assert np.all((value < narrow.high) & (narrow.high < wide.high))


def test_the_two_kinds_of_limits_meet_where_deaths_are_many() -> None:
    weights, deaths = np.array([3.0, 1.0, 0.5]), np.array([2e5, 3e5, 1e5])
    gamma, dobson = (LIMITS[name](weights, deaths, 0.95) for name in ("gamma", "dobson"))
    width = gamma.high - gamma.low
    assert_allclose(np.array(gamma) / width, np.array(dobson) / width, atol=0.005, rtol=0)


# ---- what is printed beside a rate ---------------------------------------------------------------


@pytest.mark.parametrize(
    ("key", "grid", "label"),
    [
        ("esp2013", GRIDS["single"], "European Standard Population 2013, 21 groups, 95+"),
        ("esp2013", TO_85, "European Standard Population 2013, 19 groups, 85+"),
        ("esp2013", ODD, "European Standard Population 2013, 10 groups, 80+"),
        ("esp1976", GRIDS["abridged"], "European Standard Population 1976, 19 groups, 85+"),
        ("who2000", GRIDS["abridged"], "WHO World Standard Population 2000-2025, 21 groups, 100+"),
        ("segi", TO_85, "Segi world standard population, 18 groups, 85+"),
    ],
)
def test_the_label_names_standard_groups_and_top(key: str, grid: AgeGrid, label: str) -> None:
    assert str(used(by_standard(STANDARDS[key]), grid)) == label


def test_the_label_of_the_users_own_standard_is_its_code_on_the_groups_of_the_counts() -> None:
    assert str(used(by_population("isle.p.2010"), TO_85)) == "isle.p.2010, 19 groups, 85+"
    assert used(RATES[0], TO_85) is None
    assert used(find("e0"), TO_85) is None


def test_from_ten_deaths_and_under_twenty_a_rate_is_flagged() -> None:
    totals = np.array([0.0, 9, 10, 19, 20, 500])
    deaths = np.stack([totals - 0, 0 * totals], axis=-1)
    flagged = few_deaths(by_standard(STANDARDS["segi"]), deaths)
    assert flagged.tolist() == [False, False, True, True, False, False]
    assert not few_deaths(RATES[0], deaths).any()


def test_every_standard_has_a_weight_for_every_group() -> None:
    with pytest.raises(ValueError, match="has 1 weights for 2 age groups; each group has one"):
        Standard("x", "x", "The isle", (0, 5), (1.0,), "nowhere")


def test_a_population_without_its_standard_or_its_whole_has_no_rate() -> None:
    chain = run(gompertz_panel(GRIDS["abridged"], seed=1), SETTINGS["almanac-1"])
    assert np.isnan(by_population("isle.p.2010").value(chain))


def test_settings_name_the_limits_of_rates() -> None:
    panel = gompertz_panel(people=60_000, seed=3)
    asked = [find(key) for key in ("asr_esp2013", "cdr", "e0")]
    names = ("almanac-1", "almanac-1-dobson")
    usual, dobson = (estimates(asked, panel, SETTINGS[name]) for name in names)
    for key in ("asr_esp2013", "cdr"):
        assert (usual[key].value, usual[key].se) == (dobson[key].value, dobson[key].se)
    assert (usual["e0"].low, usual["e0"].high) == (dobson["e0"].low, dobson["e0"].high)
    deaths, rate = panel.deaths.sum(), dobson["asr_esp2013"]
    reach = (np.array(exact_limits(deaths, 0.95)) - deaths) * rate.se / np.sqrt(deaths)
    assert_allclose((rate.low, rate.high), rate.value + reach, rtol=1e-9)
    assert rate.high < usual["asr_esp2013"].high
