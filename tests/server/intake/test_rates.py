"""Death rates and probabilities made deaths."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from scipy.integrate import quad

from engine.ages import AgeGrid
from server.intake.parsing import Handed, Parsed, parse
from server.intake.probabilities import death_rates, open_rates
from tests.server.intake.tables import Row, counts, csv, population, rows, where

PUBLISHED = Path(__file__).parents[2] / "published"
TABLE = rows()
TABLE_P = [row | {"sex": "p"} for row in where(TABLE, sex="f")]


def rated(table: list[Row], times: float = 1.0, **mapping: object) -> Handed:
    told = [
        row | {"rate": times * int(str(row["deaths"])) / int(str(row["population"]))}
        for row in table
    ]
    columns = {"deaths": "", "rate": "rate", "rate_is": "rate"} | mapping
    return replace(counts(csv(told), **columns), role="rates", name="rates.csv")


def deaths(parsed: Parsed) -> dict[tuple[str, str, str], np.ndarray]:  # type: ignore[type-arg]
    return {
        (key.area, key.sex, key.period): cell.values
        for key, cell in parsed.cells.items()
        if key.measure == "deaths"
    }


@pytest.mark.parametrize(
    ("times", "unit"), [(1.0, "1"), (1_000.0, "1/1000"), (1_000.0, "0.001"), (1e5, "1/100000")]
)
def test_rates_give_back_the_deaths(times: float, unit: str) -> None:
    parsed = parse([rated(TABLE, times, units=(("rate", unit),))])
    plain = parse([counts(TABLE)])
    assert parsed.problems == ()
    assert parsed.cells.keys() == plain.cells.keys()
    for key, cell in parsed.cells.items():
        assert cell.values == pytest.approx(plain.cells[key].values, abs=2e-6)
        assert cell.estimated == (key.measure == "deaths")


def test_small_rates_keep_their_digits() -> None:
    """Rates are not rounded as counts are: three deaths in a thousand million."""
    table = [row | {"deaths": 3, "population": 999_999_937} for row in TABLE]
    found = deaths(parse([rated(table)]))
    assert all(np.abs(values - 3).max() < 1e-6 for values in found.values())


def test_people_may_come_in_a_file_of_their_own_and_in_narrower_groups() -> None:
    halves = [
        row | {"age": age, "population": int(str(row["population"])) / 2}
        for row in TABLE
        for age in (("5-9", "10-14") if row["age"] == "5-14" else (row["age"],))
    ]
    people = population(halves)
    parsed = parse([rated(TABLE, population=""), people])
    assert not parsed.errors
    cell = next(cell for key, cell in parsed.cells.items() if key.measure == "deaths")
    assert len(cell.grid) == 7
    plain = deaths(parse([counts(TABLE)]))
    for key, values in deaths(parsed).items():
        whole = 2  # of the group that was halved; the others have half the people
        assert values[whole] == pytest.approx(plain[key][whole], abs=1e-5)
        assert values[0] == pytest.approx(plain[key][0] / 2, abs=1e-5)


def test_rates_of_persons_beside_both_sexes_are_not_used() -> None:
    parsed = parse([rated(TABLE + TABLE_P)])
    assert {sex for _, sex, _ in deaths(parsed)} == {"f", "m"}
    assert {sex for _, sex, _ in deaths(parse([rated(TABLE_P)]))} == {"p"}
    women = where(TABLE, sex="f")
    assert {sex for _, sex, _ in deaths(parse([rated(women + TABLE_P)]))} == {"f", "p"}


def test_a_total_over_the_ages_is_no_sum_of_rates() -> None:
    total = [where(TABLE, area="north", sex="f", year=2010)[0] | {"age": "all ages"}]
    parsed = parse([rated(TABLE + total)])
    assert "all_ages_differ" not in {one.key for one in parsed.problems if one.column == "rate"}


def test_an_area_without_people_is_named() -> None:
    parsed = parse([rated(TABLE, population=""), population(where(TABLE, area="north"))])
    (error,) = parsed.errors
    assert (error.key, error.values["area"]) == ("rates_without_population", "south")


# ---- probabilities -------------------------------------------------------------------------------


def test_half_of_the_group_is_lived_by_those_who_die() -> None:
    """Of 100 in a group of five years 20 die half-way: 80 live five years, 20 two and a half."""
    found = death_rates(np.array([0.2, 0.1, 1.0]), AgeGrid((0, 5, 6)))
    assert found[0] == pytest.approx(20 / (80 * 5 + 20 * 2.5))
    assert found[1] == pytest.approx(10 / (90 + 10 * 0.5))


def test_the_open_group_of_a_gompertz_law() -> None:
    """The mean rate of a population that stays as it is, by numerical integration."""
    grid = AgeGrid((*range(0, 85, 5), 85))
    level, slope = 2e-5, 0.1
    mx = np.append(level * np.exp(slope * grid.mids[:-1]), np.nan)
    start = level * np.exp(slope * 85) / slope
    years = quad(lambda t: np.exp(-start * np.expm1(slope * t)), 0, 80)[0]
    assert open_rates(mx, grid) == pytest.approx(1 / years, rel=1e-9)


@pytest.mark.parametrize(
    "mx",
    [
        np.array([0.1, 0.01, 0.01, 0.01, np.nan]),  # no rise
        np.array([0.1, 0.01, 0.0, 0.02, np.nan]),  # nobody died in a group
        np.array([0.1, 0.01, np.nan, 0.02, np.nan]),
    ],
)
def test_no_rate_where_those_below_follow_no_law(mx: np.ndarray) -> None:  # type: ignore[type-arg]
    assert np.isnan(open_rates(mx, AgeGrid((0, 60, 65, 70, 75))))
    assert np.isnan(open_rates(mx[[0, 1, 3, 4]], AgeGrid((0, 60, 65, 70))))


@pytest.mark.parametrize("oldest", [80, 85, 90])
def test_open_groups_of_danish_women_and_men(oldest: int) -> None:
    """Closed at 80 to 90, the rate beyond is within 5 % on average, and not biased."""
    table = pd.read_csv(PUBLISHED / "denmark_deaths_personyears_1974_2012.csv")
    table["group"] = np.minimum(table.age // 5 * 5, oldest)
    summed = table.groupby(["sex", "year", "group"])[["deaths", "person_years"]].sum()
    mx = (summed.deaths / summed.person_years).unstack().to_numpy()
    error = open_rates(mx, AgeGrid(tuple(range(0, oldest + 1, 5)))) / mx[:, -1] - 1
    assert np.sqrt((error**2).mean()) < 0.06
    assert abs(error.mean()) < 0.02


def test_probabilities_give_back_the_deaths_below_the_open_age() -> None:
    ages = ["0", "1-4", *(f"{age}-{age + 4}" for age in range(5, 85, 5)), "85+"]
    widths = [1, 4, *[5] * 16, 1]
    table = [
        {"area": "a", "year": 2010, "sex": "f", "age": age, "deaths": n, "population": 9_000}
        for number, age in enumerate(ages)
        for n in [round(8 * 1.4**number / 3)]
    ]
    chances = []
    for row, width in zip(table, widths, strict=True):
        m = int(str(row["deaths"])) / 9_000
        q = width * m / (1 + width * m / 2)
        chances.append(row | {"rate": 1 if row["age"] == "85+" else q})
    handed = Handed(
        "rates",
        "q.csv",
        csv(chances),
        replace(counts(table).mapping, deaths="", rate="rate", rate_is="probability"),
    )
    parsed = parse([handed])
    assert [one.key for one in parsed.problems] == ["open_group_worked_out"]
    (found,) = deaths(parsed).values()
    assert found[:-1] == pytest.approx([row["deaths"] for row in table][:-1], abs=1e-5)
