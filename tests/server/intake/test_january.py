"""People of two 1 Januaries made people at risk."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from server.intake.mapping import Form, Mapping
from server.intake.parsing import Handed, Parsed, parse
from tests.server.intake.tables import csv, deaths, population, rows, setting, where, without

PUBLISHED = Path(__file__).parents[2] / "published"
TABLE = rows()


def people(parsed: Parsed) -> dict[tuple[str, str, str], list[float]]:
    return {
        (key.area, key.sex, key.period): cell.values.tolist()
        for key, cell in parsed.cells.items()
        if key.measure == "person_years"
    }


def january(table: list[dict[str, object]]) -> Handed:
    return population(table, population_is="january")


def counted(table: list[dict[str, object]], **which: object) -> np.ndarray:  # type: ignore[type-arg]
    return np.array([float(str(row["population"])) for row in where(table, **which)])


def test_a_year_is_the_mean_of_its_two_januaries() -> None:
    found = people(parse([january(TABLE)]))
    assert sorted({year for _, _, year in found}) == ["2010", "2011", "2012", "2013"]
    for area, sex, year in found:
        first = counted(TABLE, area=area, sex=sex, year=int(year))
        second = counted(TABLE, area=area, sex=sex, year=int(year) + 1)
        assert found[area, sex, year] == ((first + second) / 2).tolist()


def test_a_year_that_is_lacking_ends_two() -> None:
    parsed = parse([january(without(TABLE, where(TABLE, year=2012)))])
    assert {year for _, _, year in people(parsed)} == {"2010", "2013"}
    told = [one for one in parsed.problems if one.key == "last_january"]
    assert [one.values["year"] for one in told] == ["2011", "2014"]


def test_the_january_after_the_last_deaths_is_no_matter() -> None:
    """It is needed, and no more is; one that lacks under deaths is told."""
    until = without(TABLE, where(TABLE, year=2014))
    assert parse([deaths(until), january(TABLE)]).problems == ()
    told = parse([deaths(TABLE), january(TABLE)]).problems
    assert "last_january" in [one.key for one in told]


def test_series_of_areas_and_sexes_do_not_touch() -> None:
    """The last January of women is not averaged with the first of men."""
    table = without(TABLE, where(TABLE, area="north", sex="f", year=2014))
    found = people(parse([january(table)]))
    assert ("north", "f", "2013") not in found
    assert ("north", "m", "2013") in found


def test_groups_are_those_both_have() -> None:
    joined = setting(TABLE, where(TABLE, year=2012, age="0"), age="0-4")
    joined = without(joined, [row for row in joined if row["year"] == 2012 and row["age"] == "1-4"])
    parsed = parse([january(joined)])
    grids = {key.period: len(cell.grid) for key, cell in parsed.cells.items()}
    assert grids == {"2010": 7, "2011": 6, "2012": 6, "2013": 7}
    wide = people(parsed)["north", "f", "2011"]
    first = counted(TABLE, area="north", sex="f", year=2011)
    assert (
        wide[0] == (first[0] + first[1] + counted(joined, area="north", sex="f", year=2012)[0]) / 2
    )


def test_a_year_is_provisional_if_either_january_is() -> None:
    parsed = parse([replace_mapping(january(TABLE), provisional_years=("2013",))])
    states = {key.period: cell.status for key, cell in parsed.cells.items()}
    assert states == {
        "2010": "final",
        "2011": "final",
        "2012": "provisional",
        "2013": "provisional",
    }


def replace_mapping(file: Handed, **fields: object) -> Handed:
    return replace(file, mapping=replace(file.mapping, **fields))  # type: ignore[arg-type]


def test_deaths_stay_as_they_are() -> None:
    ended = without(TABLE, where(TABLE, year=2014))
    parsed = parse([deaths(ended), january(TABLE)])
    plain = parse([deaths(ended)])
    assert not parsed.errors
    for key, cell in plain.cells.items():
        assert parsed.cells[key].values.tolist() == cell.values.tolist()


def test_totals_over_the_ages_are_averaged_too() -> None:
    """A file with a row for all ages is checked against means, not against one January."""
    totals = [
        {**where(TABLE, area=a, sex=s, year=y)[0], "age": "all ages", "population": int(people)}
        for a in ("north", "south")
        for s in "fm"
        for y in range(2010, 2015)
        for people in [counted(TABLE, area=a, sex=s, year=y).sum()]
    ]
    parsed = parse([january(TABLE + totals)])
    assert {one.key for one in parsed.problems} == {"last_january"}


def test_januaries_may_stand_in_headings() -> None:
    names = [str(year) for year in range(2010, 2015)]
    found = {tuple(row[key] for key in ("area", "sex", "age", "year")): row for row in TABLE}
    wide = [
        {"area": a, "sex": s, "age": g}
        | {name: found[a, s, g, int(name)]["population"] for name in names}
        for a, s, g in dict.fromkeys((row["area"], row["sex"], row["age"]) for row in TABLE)
    ]
    form = Form(
        across=("year",),
        across_columns=tuple((name, name) for name in names),
        across_number="population",
    )
    mapping = Mapping(area="area", sex="sex", age="age", population_is="january", form=form)
    parsed = parse([Handed("population", "wide.csv", csv(wide), mapping)])
    assert people(parsed) == people(parse([january(TABLE)]))
    (last,) = [one for one in parsed.problems if one.key == "last_january"]
    assert (last.row, last.last_row, last.column, last.rows) == (2, 29, "2014", 28)


@pytest.fixture(scope="module")
def danish() -> pd.DataFrame:
    """Means of two 1 Januaries beside the published person-years of the same year, sex and age."""
    content = (PUBLISHED / "denmark_population_1_january_1990_1995.csv").read_bytes()
    mapping = Mapping(
        year="year",
        sex="sex",
        age="age",
        population="population_jan1",
        only_area="dk",
        last_age_open=True,
        population_is="january",
    )
    parsed = parse([Handed("population", "dk.csv", content, mapping)])
    assert not parsed.errors
    ours = pd.DataFrame(
        [
            (int(key.period), {"f": "female", "m": "male"}[key.sex], age, value)
            for key, cell in parsed.cells.items()
            for age, value in enumerate(cell.values)
        ],
        columns=["year", "sex", "age", "ours"],
    )
    theirs = pd.read_csv(PUBLISHED / "denmark_deaths_personyears_1974_2012.csv")
    return ours.merge(theirs, on=["year", "sex", "age"])


def test_means_are_near_the_published_person_years(danish: pd.DataFrame) -> None:
    assert len(danish) == 5 * 2 * 100
    below = danish[danish.age < 95].groupby(["year", "sex"])[["ours", "person_years"]].sum()
    assert below.ours.to_numpy() == pytest.approx(below.person_years.to_numpy(), rel=1e-3)
    ratio = danish.ours / danish.person_years
    assert ratio[danish.age < 60].between(0.999, 1.001).mean() > 0.95
    assert ratio[danish.age < 90].between(0.99, 1.004).all()
