"""Indices of how well ages are stated, against published limits, other people's values and laws."""

import json
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.ages import AgeGrid, Array
from engine.quality import FIVES, age_sex_accuracy, growth_balance, myers, whipple
from tests.factories import gompertz_rates
from tests.published import denmark

PUBLISHED = json.loads(
    (Path(__file__).parents[1] / "published" / "age_heaping.json").read_text(encoding="utf-8")
)["cases"]
AGES = np.arange(100)


def moved(share: float) -> Array:
    """A tenth, or another share, of every age that does not end in 0 at the last that does."""
    people = np.full(100, 1000.0)
    ends = AGES % 10 == 0
    people[~ends] *= 1 - share
    people[ends] += 9 * 1000 * share
    return people


def danes(year: int, sex: str) -> Array:
    rows = denmark.rows("denmark_people_1971_2000.csv")
    return np.array(
        [float(row["people"]) for row in rows if (row["year"], row["sex"]) == (str(year), sex)]
    )


CASES = {
    "uniform": np.ones(100),
    "all on 0 and 5": np.where(AGES % 5 == 0, 1.0, 0.0),
    "all on 0": np.where(AGES % 10 == 0, 1.0, 0.0),
    "uniform, a tenth of every age not ending in 0 moved to the previous age ending in 0": moved(
        0.1
    ),
    **{
        f"Denmark {year} {sex}": danes(year, sex)
        for year in (1971, 2000)
        for sex in ("male", "female")
    },
}


@pytest.mark.parametrize("case", CASES)
def test_digit_preference_as_published(case: str) -> None:
    """The values are of ages to 99, the last of them a single year there."""
    people = CASES[case]
    assert float(whipple(denmark.GRID, people)) == pytest.approx(
        PUBLISHED[case]["whipple"], abs=1e-9
    )
    assert float(myers(denmark.GRID, people)) == pytest.approx(
        PUBLISHED[case]["myers_10_89"], abs=1e-9
    )


@given(st.integers(0, 2**32))
def test_a_batch_equals_its_rows_and_scale_does_not_matter(seed: int) -> None:
    people = np.random.default_rng(seed).uniform(1, 1000, (3, 2, 100))
    for index in (whipple, myers):
        together = index(denmark.GRID, people)
        assert together.shape == (3, 2)
        assert (index(denmark.GRID, 7 * people) == pytest.approx(together, rel=1e-12)) is True
        assert float(index(denmark.GRID, people[1, 1])) == together[1, 1]
    accuracy = age_sex_accuracy(denmark.GRID, people, people[..., ::-1])
    assert accuracy.index.shape == (3, 2)
    alone = age_sex_accuracy(denmark.GRID, people[2, 0], people[2, 0, ::-1])
    assert float(alone.index) == accuracy.index[2, 0]


def test_indices_of_coarser_or_shorter_ages() -> None:
    """Single years to 79 will do for Myers, to 63 for Whipple; groups will not."""
    to_79 = AgeGrid(tuple(range(80)))
    assert float(myers(to_79, np.ones(80))) == pytest.approx(0, abs=1e-9)
    assert float(myers(to_79, np.where(np.arange(80) % 10 == 3, 1.0, 0))) == pytest.approx(90)
    assert np.isnan(myers(AgeGrid(tuple(range(79))), np.ones(79)))
    assert float(whipple(AgeGrid(tuple(range(64))), np.ones(64))) == pytest.approx(100)
    assert np.isnan(whipple(AgeGrid(tuple(range(63))), np.ones(63)))
    assert np.isnan(whipple(FIVES, np.ones(16)))
    assert np.isnan(whipple(denmark.GRID, np.zeros(100)))


@given(st.floats(0, 0.5))
def test_whipple_of_a_share_moved_to_round_ages(share: float) -> None:
    """Each age ending in 0 or 5 gains four shares: 100 (1 + 4 share), by hand."""
    people = np.where(AGES % 5 == 0, 1 + 4 * share, 1 - share)
    assert float(whipple(denmark.GRID, people)) == pytest.approx(100 * (1 + 4 * share), rel=1e-12)


def test_the_accuracy_index_by_hand() -> None:
    """Women fall in a line of 5 from 100, so that each group is the mean of its neighbours. Men are
    as many, but 10 % more in every second group."""
    women = 100 - 5 * np.arange(16.0)
    assert float(age_sex_accuracy(FIVES, women, women).index) == pytest.approx(0, abs=1e-12)
    men = women * np.where(np.arange(16) % 2 == 1, 1.1, 1.0)
    found = age_sex_accuracy(FIVES, women, men)
    assert float(found.sexes) == pytest.approx(10)
    assert float(found.women) == pytest.approx(0, abs=1e-12)
    by_hand = [abs(200 * men[x] / (men[x - 1] + men[x + 1]) - 100) for x in range(1, 14)]
    assert float(found.men) == pytest.approx(sum(by_hand) / 13)
    assert float(found.index) == pytest.approx(30 + sum(by_hand) / 13)


def test_the_accuracy_index_reads_single_years_and_not_groups_of_ten() -> None:
    men, women = danes(2000, "male"), danes(2000, "female")
    fives = denmark.GRID.regroup(men, FIVES), denmark.GRID.regroup(women, FIVES)
    single = age_sex_accuracy(denmark.GRID, women, men)
    assert float(single.index) == float(age_sex_accuracy(FIVES, fives[1], fives[0]).index) < 20
    tens = AgeGrid((0, 10, 20, 30, 40, 50, 60, 70, 80))
    assert np.isnan(age_sex_accuracy(tens, np.ones((2, 9)), np.ones(9)).index).all()
    assert np.isnan(age_sex_accuracy(FIVES, np.zeros(16), np.ones(16)).index)


FINE = AgeGrid(tuple(range(111)))


@pytest.mark.parametrize("share", [1.0, 0.85, 0.5])
@pytest.mark.parametrize("growth", [-0.01, 0.0, 0.02])
def test_the_growth_balance_tells_the_share_registered(share: float, growth: float) -> None:
    """A stable population, continuous in age to a hundredth of a year, over ten years."""
    age = np.arange(0, 110, 0.01) + 0.005
    hazard = np.interp(age, FINE.mids[:-1], gompertz_rates(FINE)[:-1])
    alive = np.exp(-np.cumsum(hazard) * 0.01 - growth * age)
    first = np.append(alive.reshape(110, 100).sum(axis=-1), 0.0)
    died = np.append((alive * hazard).reshape(110, 100).sum(axis=-1), 0.0)
    years = 10.0
    grown = np.exp(growth * years)
    deaths = died * ((grown - 1) / growth if growth else years)
    found = growth_balance(FINE, first, first * grown, share * deaths, np.array(years))
    assert float(found) == pytest.approx(share, rel=0.02)


@pytest.mark.parametrize("sex", ["female", "male"])
def test_danish_deaths_are_registered(sex: str) -> None:
    panel = denmark.panel(sex)
    for first in (0, 10, 20, 28):
        deaths = panel.deaths[first : first + 11].copy()
        deaths[[0, -1]] /= 2
        people = panel.exposure[first], panel.exposure[first + 10]
        share = growth_balance(denmark.GRID, *people, deaths.sum(axis=0), np.array(10.0))
        assert float(share) == pytest.approx(1, abs=0.03)
    assert np.isnan(growth_balance(AgeGrid((0, 50)), *[np.ones((2, 2))] * 3, np.ones(2))).all()
