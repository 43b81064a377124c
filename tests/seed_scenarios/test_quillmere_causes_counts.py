"""The deaths of Quillmere by cause, before any upload: sums, and what the stories rest on."""

import csv
import io

import numpy as np
import pytest
from numpy.typing import NDArray

from seed_scenarios.quillmere_causes_counts import (
    CODES,
    GAINED,
    LOST,
    MAINLAND,
    OLDER,
    PART,
    RECODED,
    comparability,
    ill_defined,
    parted,
    shares,
)
from seed_scenarios.quillmere_causes_files import ALL, breaks_csv, deaths_csv
from seed_scenarios.quillmere_counts import HEAT, STARTS, YEARS, Counts, counted

REGION = {region.code: region for region in MAINLAND}
MEN = 1
Parted = dict[str, NDArray[np.int64]]


@pytest.fixture(scope="module")
def counts() -> dict[str, Counts]:
    return counted(revised=True)


@pytest.fixture(scope="module")
def deaths(counts: dict[str, Counts]) -> Parted:
    """By region, [year, sex, age, cause]."""
    return {code: parted(counts[code], region) for code, region in REGION.items()}


@pytest.fixture(scope="module")
def mainland(deaths: Parted) -> NDArray[np.int64]:
    return np.sum(list(deaths.values()), axis=0)


def of(code: str) -> int:
    return CODES.index(code)


def year(number: int) -> int:
    return YEARS.index(number)


@pytest.mark.parametrize("code", REGION)
def test_causes_add_up_to_the_deaths_that_were_drawn(
    counts: dict[str, Counts], deaths: Parted, code: str
) -> None:
    assert np.array_equal(deaths[code].sum(axis=-1), counts[code].deaths)
    assert np.array_equal(parted(counts[code], REGION[code]), deaths[code])  # by the same seed


@pytest.mark.parametrize("code", REGION)
@pytest.mark.parametrize("at", [1999, 2011, 2017, 2018, 2023])
def test_shares_are_shares(code: str, at: int) -> None:
    found = shares(REGION[code], at)
    assert found.shape == (2, len(STARTS), len(CODES))
    assert found.min() >= 0
    np.testing.assert_allclose(found.sum(axis=-1), 1, rtol=1e-12)


def test_no_cause_befalls_whom_it_cannot(mainland: NDArray[np.int64]) -> None:
    at = mainland.sum(axis=0)
    assert at[0, :, of("cancer-prostate")].sum() == at[MEN, :, of("pregnancy")].sum() == 0
    bearing = (np.array(STARTS) >= 10) & (np.array(STARTS) < 50)
    assert at[0, ~bearing, of("pregnancy")].sum() == 0 < at[0, bearing, of("pregnancy")].sum()
    for code in ("perinatal", "sudden-infant"):
        assert at[:, 1:, of(code)].sum() == 0 < at[:, 0, of(code)].min()


def test_the_ill_defined_share_falls_from_nine_per_cent_to_three(
    mainland: NDArray[np.int64],
) -> None:
    share = mainland[..., of("ill-defined")].sum(axis=(1, 2)) / mainland.sum(axis=(1, 2, 3))
    assert share[0] == pytest.approx(0.09, abs=0.005)
    assert share[-1] == pytest.approx(0.03, abs=0.003)
    assert np.corrcoef(share, YEARS)[0, 1] < -0.98
    assert ill_defined(YEARS[12]) == pytest.approx(0.06)


def test_only_the_last_year_waits_for_causes_and_the_young_most(
    mainland: NDArray[np.int64],
) -> None:
    waiting = mainland[..., of("pending")]
    assert waiting[:-1].sum() == 0
    young = np.array(STARTS) < 65
    share = {
        ages: waiting[-1][:, at].sum() / mainland[-1][:, at].sum()
        for ages, at in (("young", young), ("old", ~young))
    }
    assert share["young"] == pytest.approx(0.1, abs=0.01)
    assert share["old"] == pytest.approx(0.02, abs=0.003)


def test_new_rules_move_deaths_between_two_causes_and_no_other(
    mainland: NDArray[np.int64], deaths: Parted
) -> None:
    found = comparability(deaths)
    before = mainland[year(RECODED - 1)].sum(axis=0)
    lost, gained = before[:, of(LOST)].sum(), before[:, of(GAINED)].sum()
    left = found[LOST].ratio * lost + found[GAINED].ratio * gained
    assert left == pytest.approx(lost + gained)  # what the one loses the other gains
    assert found[LOST].ratio == pytest.approx(1 - PART, abs=0.03)
    assert found[LOST].error == pytest.approx(np.sqrt(PART * (1 - PART) / lost), rel=0.1)
    assert found[LOST].error * lost == pytest.approx(found[GAINED].error * gained)
    old, new = (shares(REGION["northlade"], at) for at in (RECODED - 1, RECODED))
    step = (new - old)[:, STARTS.index(OLDER) :]
    moved = {code for code in CODES if np.abs(step[..., of(code)]).max() > 0.01}
    assert moved == {LOST, GAINED}
    assert step[..., of(LOST)].max() < 0 < step[..., of(GAINED)].min()
    younger = np.array(STARTS) < OLDER
    assert np.allclose(new[:, younger, of(LOST)], old[:, younger, of(LOST)], rtol=0.02)


def test_applied_ratios_take_the_step_out_of_the_course(mainland: NDArray[np.int64]) -> None:
    """Of the mainland, 2007 to 2010 against 2011 to 2014, as shares of all deaths."""
    ratios = comparability({"mainland": mainland})
    every = mainland.sum(axis=(1, 2, 3))
    for code in (LOST, GAINED):
        share = mainland[..., of(code)].sum(axis=(1, 2)) / every
        at = year(RECODED)
        before, after = share[at - 4 : at].mean(), share[at : at + 4].mean()
        as_coded, made_comparable = after / before, after / (before * ratios[code].ratio)
        own = share[at - 1] / share[at - 5]  # four years of its own course
        assert abs(made_comparable / own - 1) < abs(as_coded / own - 1)
        assert made_comparable == pytest.approx(own, rel=0.08)


def test_the_men_of_tollbay_die_of_three_causes_more(deaths: Parted) -> None:
    def share(code: str, at: int, causes: tuple[str, ...], sex: int = MEN) -> float:
        ages = (np.array(STARTS) >= 30) & (np.array(STARTS) < 60)
        some = deaths[code][year(at) - 2 : year(at) + 1, sex][:, ages].sum(axis=(0, 1))
        return float(some[[of(one) for one in causes]].sum() / some.sum())

    three = ("overdose", "suicide", "liver-alcohol")
    for one in three:
        assert share("tollbay", 2018, (one,)) > 1.5 * share("northlade", 2018, (one,))
    assert share("tollbay", 2008, three) == pytest.approx(share("northlade", 2008, three), abs=0.05)
    women = share("tollbay", 2018, three, 0)
    assert women == pytest.approx(share("northlade", 2018, three, 0), abs=0.05)


def test_what_came_on_top_is_of_the_three_causes_alone() -> None:
    """Without the story the shares of the others keep their proportions."""
    there, elsewhere = (shares(REGION[code], 2017)[MEN] for code in ("tollbay", "northlade"))
    three = [of(code) for code in ("overdose", "suicide", "liver-alcohol", "ill-defined")]
    others = np.setdiff1d(np.arange(len(CODES)), three)
    told = there[:, others].sum(axis=-1) / elsewhere[:, others].sum(axis=-1)
    inside = (np.array(STARTS) >= 35) & (np.array(STARTS) < 55)
    np.testing.assert_allclose(told[inside], 1 / 1.62, rtol=0.12)
    outside = (np.array(STARTS) < 25) | (np.array(STARTS) >= 65)
    np.testing.assert_allclose(there[outside], elsewhere[outside], rtol=1e-12)


def test_the_hot_summer_is_of_heart_and_lungs(mainland: NDArray[np.int64]) -> None:
    old = np.array(STARTS) >= 75
    hot = mainland[year(HEAT)][:, old].sum(axis=(0, 1))
    around = (mainland[year(HEAT) - 1] + mainland[year(HEAT) + 1])[:, old].sum(axis=(0, 1)) / 2
    more = hot - around
    expected = ("heart-attack", "circulatory-other", "stroke", "lungs-chronic", "pneumonia")
    assert more[[of(code) for code in expected]].sum() > 0.75 * more.sum()
    assert more[of("heart-attack")] > 3 * np.sqrt(around[of("heart-attack")])


def test_the_file_has_every_death_once_and_those_of_all_causes(
    counts: dict[str, Counts], deaths: Parted
) -> None:
    rows = list(csv.DictReader(io.StringIO(deaths_csv(counts, deaths).decode(), newline="")))
    total = sum(int(row["deaths"]) for row in rows if row["cause"] == ALL)
    assert sum(int(row["deaths"]) for row in rows if row["cause"] != ALL) == total
    assert total == sum(one.deaths.sum() for code, one in counts.items() if code in REGION)
    assert {"0", "95-99", "100+"} <= {row["age"] for row in rows}
    one = next(row for row in rows if row["cause"] == "dementia" and row["year"] == "2017")
    where = (year(2017), ("women", "men").index(one["sex"]))
    age = [str(start) for start in STARTS].index(one["age"].split("-")[0])
    assert int(one["deaths"]) == deaths[one["area"]][where][age, of("dementia")]


def test_the_breaks_name_both_causes_with_their_ratios(deaths: Parted) -> None:
    rows = list(csv.DictReader(io.StringIO(breaks_csv(comparability(deaths)).decode(), newline="")))
    told = {row["cause"]: (float(row["ratio"]), row["year"]) for row in rows if row["ratio"]}
    assert set(told) == {LOST, GAINED}
    assert all(when == str(RECODED) for _, when in told.values())
    assert told[LOST][0] < 1 < told[GAINED][0]
