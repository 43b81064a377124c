"""Each reason, from counts that call for it."""

from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import run
from engine.estimates import Reason
from engine.indicators import INDICATORS, estimate, estimates, find
from engine.panel import Panel
from engine.settings import SETTINGS
from tests.factories import GRIDS, complete, gompertz_panel

PLAIN, LAW = SETTINGS["almanac-1"], SETTINGS["almanac-1-gompertz"]
SPREAD = {key for key, one in INDICATORS.items() if one.needs.open_small}
CLOSED = {key for key, one in INDICATORS.items() if one.needs.open_deaths}
OVER_BIRTHS = {key for key, one in INDICATORS.items() if one.needs.births}
OF_A_WHOLE = {key for key, one in INDICATORS.items() if one.needs.whole}
WEIGHED = {key for key, one in INDICATORS.items() if one.needs.least_deaths}
SOUND = complete(gompertz_panel(people=5e6))
EARLY_END = AgeGrid((0, 1, *range(5, 91, 5)))


def reasons(panel: Panel, settings=PLAIN) -> dict[str, Reason]:
    few = replace(settings, draws=40)
    found = estimates(list(INDICATORS.values()), panel, few, streams=np.array("isle"))
    return {key: Reason(int(one.reason)) for key, one in found.items()}


def only(panel: Panel, reason: Reason, settings=PLAIN) -> set[str]:
    """Keys with the reason; all others must have none."""
    found = reasons(panel, settings)
    assert set(found.values()) <= {reason, Reason.NONE}
    return {key for key, why in found.items() if why is reason}


def changed(age: int, *, deaths: float, exposure: float | None = None) -> Panel:
    at = np.array(SOUND.grid.starts) == age
    return replace(
        SOUND,
        deaths=np.where(at, deaths, SOUND.deaths),
        exposure=SOUND.exposure if exposure is None else np.where(at, exposure, SOUND.exposure),
    )


def test_sound_counts_give_every_number() -> None:
    assert only(SOUND, Reason.NONE) == set(INDICATORS)


def test_too_large_an_open_group_hides_what_is_spread_over_it() -> None:
    ends_early = SOUND.regroup(EARLY_END)
    assert run(ends_early, PLAIN).open_reach > 0.05
    assert only(ends_early, Reason.OPEN_GROUP_TOO_LARGE) == SPREAD
    # the groups' peak may lie beyond 90; the smooth curve has one below
    at_edge = {"mode_raw", "mode_parabola"}
    assert only(ends_early, Reason.MODE_AT_EDGE, LAW) == at_edge
    generous = replace(PLAIN, open_share=0.9)
    assert only(ends_early, Reason.MODE_AT_EDGE, generous) == at_edge


def test_the_share_that_may_reach_the_open_group_is_that_of_the_settings() -> None:
    reach = float(run(SOUND, PLAIN).open_reach)
    barely, too_much = (replace(PLAIN, open_share=reach * part) for part in (1.01, 0.99))
    assert only(SOUND, Reason.NONE, barely) == set(INDICATORS)
    assert only(SOUND, Reason.OPEN_GROUP_TOO_LARGE, too_much) == SPREAD


def test_the_median_is_lost_in_an_open_group_that_half_reach() -> None:
    ends_early = SOUND.regroup(AgeGrid((0, 1, *range(5, 71, 5))))
    found = reasons(ends_early)
    assert found["median"] is Reason.OPEN_GROUP_TOO_LARGE
    assert found["e0"] is Reason.NONE


def test_no_deaths_in_the_open_group() -> None:
    spared = changed(100, deaths=0)
    assert {"e0", "H"} <= CLOSED
    assert only(spared, Reason.NO_DEATHS_IN_OPEN_GROUP) == CLOSED
    assert only(spared, Reason.NONE, LAW) == set(INDICATORS)


def test_few_person_years_give_no_figure() -> None:
    few = replace(SOUND, deaths=SOUND.deaths / 1001, exposure=SOUND.exposure / 1001)
    assert only(few, Reason.TOO_FEW_PERSON_YEARS) == set(INDICATORS)


def test_nobody_in_the_first_year_of_life() -> None:
    assert only(changed(0, deaths=0, exposure=0), Reason.NO_POPULATION) == set(INDICATORS)


def test_no_deaths_at_all() -> None:
    nobody = replace(SOUND, deaths=0 * SOUND.deaths, births=SOUND.births * [1, 1, 0])
    assert only(nobody, Reason.NO_DEATHS) == set(INDICATORS) - OVER_BIRTHS


def test_no_deaths_in_the_span_of_the_ageing_rate() -> None:
    ages = np.array(SOUND.grid.starts)
    spared = replace(SOUND, deaths=np.where((ages >= 40) & (ages < 85), 0, SOUND.deaths))
    assert reasons(spared)["ageing_rate"] is Reason.NO_DEATHS


def test_too_few_groups_for_the_ageing_rate() -> None:
    coarse = SOUND.regroup(AgeGrid((0, 1, 5, 15, 40, 60, 65, 90, 95, 100)))
    narrow = replace(PLAIN, ageing_span=(40, 64))
    assert reasons(coarse, narrow)["ageing_rate"] is Reason.TOO_FEW_AGES


@pytest.mark.parametrize(("key", "age"), [("e65", 65), ("45q15", 15), ("45q15", 60), ("5q0", 5)])
def test_an_age_that_begins_no_group(key: str, age: int) -> None:
    coarse = SOUND.regroup(AgeGrid(tuple(a for a in SOUND.grid.starts if a != age)))
    assert reasons(coarse)[key] is Reason.AGE_NOT_ON_GRID
    assert reasons(coarse)["e0"] is Reason.NONE


def test_an_age_above_the_open_one_needs_a_law() -> None:
    e103 = find("e103")
    assert estimate(e103, SOUND, PLAIN).reason == Reason.AGE_NOT_ON_GRID
    got = estimate(e103, SOUND, LAW)
    assert got.reason == Reason.NONE
    assert 0.5 < got.value < 3


def test_no_peak_below_the_open_age() -> None:
    long_lived = gompertz_panel(GRIDS["abridged"], level=0.1 / np.exp(108 * 0.1), people=5e6)
    found = reasons(long_lived, LAW)
    assert {key for key in SPREAD if found[key] is Reason.MODE_AT_EDGE} == {
        "mode", "mode_raw", "mode_parabola",
    }  # fmt: skip


def test_a_law_that_cannot_be_fitted() -> None:
    coarse = SOUND.regroup(AgeGrid((0, 1, 5, 15, 60, 65, 75, 85)))
    found = reasons(coarse, LAW)
    assert found["e0"] is found["H"] is Reason.TOO_FEW_AGES
    assert found["mode"] is Reason.TOO_FEW_AGES  # nothing spreads the open group
    assert found["5q0"] is Reason.NONE


def test_death_rates_that_no_law_fits() -> None:
    old = np.array(SOUND.grid.starts) >= 70
    falling = replace(SOUND, deaths=np.where(old, SOUND.exposure * 0.05, SOUND.deaths))
    falling.deaths[-2] /= 3
    assert only(falling, Reason.NO_LAW, LAW) == CLOSED | SPREAD


def test_births_that_were_not_handed_in() -> None:
    assert {"imr", "nmr", "pnmr", "sbr"} == OVER_BIRTHS
    for place, hit in enumerate((OVER_BIRTHS, {"sbr"}, {"nmr", "pnmr"})):
        births = np.where(np.arange(3) == place, np.nan, SOUND.births)
        assert only(replace(SOUND, births=births), Reason.NO_BIRTHS) == hit


def test_an_area_that_is_part_of_none() -> None:
    assert {"smr", "isr"} == OF_A_WHOLE
    assert only(replace(SOUND, whole=None), Reason.NO_WHOLE) == OF_A_WHOLE
    for name in ("deaths", "exposure"):
        counts = getattr(SOUND.whole, name).copy()
        counts[7] = np.nan
        whole = replace(SOUND.whole, **{name: counts})
        assert only(replace(SOUND, whole=whole), Reason.NO_WHOLE) == OF_A_WHOLE
    nobody_at_0 = replace(SOUND.whole, exposure=SOUND.whole.exposure * (np.arange(22) > 0))
    assert only(replace(SOUND, whole=nobody_at_0), Reason.NO_WHOLE) == OF_A_WHOLE


def test_a_standard_that_is_not_held() -> None:
    weighed = find("asr_by_isle.p.2010")
    assert estimate(weighed, SOUND, PLAIN).reason == Reason.NONE
    lacking = SOUND.standard.exposure.copy()
    lacking[3] = np.nan
    empty = replace(SOUND.standard, exposure=0 * SOUND.standard.exposure)
    for standard in (None, replace(SOUND.standard, exposure=lacking), empty):
        got = estimate(weighed, replace(SOUND, standard=standard), PLAIN)
        assert got.reason == Reason.NO_STANDARD
        assert np.isnan(got.value)


def test_fewer_deaths_than_a_number_needs() -> None:
    least = {INDICATORS[key].needs.least_deaths for key in WEIGHED}
    assert least == {10}
    share = np.zeros(len(SOUND.grid))
    share[[0, 12, 15, -1]] = 1, 2, 3, 4
    for deaths, hit in ((10, set()), (9, WEIGHED)):
        some = replace(SOUND, deaths=share * deaths / 10)
        found = reasons(some)
        assert {key for key, why in found.items() if why is Reason.TOO_FEW_DEATHS} == hit


def test_no_deaths_at_all_leave_a_rate_over_births() -> None:
    nobody = replace(SOUND, deaths=0 * SOUND.deaths, births=SOUND.births * [1, 1, 0])
    got = estimate(find("imr"), nobody, PLAIN)
    assert (got.value, got.low, got.reason) == (0, 0, Reason.NONE)
    assert got.high > 0


def test_what_must_be_mended_first_is_named() -> None:
    bare = gompertz_panel(people=4_000)
    assert estimate(find("smr"), bare, PLAIN).reason == Reason.TOO_FEW_PERSON_YEARS
    holed = replace(bare, deaths=bare.deaths * np.nan)
    assert estimate(find("smr"), holed, PLAIN).reason == Reason.NOT_AVAILABLE
