"""An upload against the edition that stands."""

import pytest

from server.intake.parsing import parse
from server.intake.standing import Standing
from tests.server.intake.doubts import stood
from tests.server.intake.tables import Row, counts, deaths, population, rows, where, without

FOUR = rows(("north", "south", "cape", "bay"))
STOOD = stood(FOUR)


def keys(table: list[Row], standing: Standing | None = STOOD) -> list[str]:
    return [problem.key for problem in parse([counts(table)], standing).problems]


@pytest.mark.parametrize(
    ("areas", "missed"),
    [
        (("north",), []),
        (("north", "south"), []),
        (("north", "south", "cape"), ["bay"]),
        (("north", "south", "cape", "bay"), []),
    ],
)
def test_areas_are_missed_where_most_of_them_come_again(
    areas: tuple[str, ...], missed: list[str]
) -> None:
    table = [row for row in FOUR if row["area"] in areas]
    found = [p for p in parse([counts(table)], STOOD).problems if p.key == "areas_gone"]
    assert [problem.values["areas"] for problem in found] == missed


@pytest.mark.parametrize(
    ("years", "missed"),
    [
        ((2014,), []),  # the newest alone
        ((2010, 2014), ["2011–2013"]),  # years between
        ((2012, 2013, 2014), ["2010–2011"]),  # most of them
        ((2014, 2015), []),
    ],
)
def test_years_are_missed_between_others_or_where_most_come_again(
    years: tuple[int, ...], missed: list[str]
) -> None:
    table = where(rows(("north",), years=years), sex="f")
    found = [p for p in parse([counts(table)], STOOD).problems if p.key == "years_gone"]
    assert [problem.values["years"] for problem in found] == missed
    assert all(problem.values["area"] == "north" for problem in found)


def test_nothing_is_missed_where_nothing_is_known_of_what_stands() -> None:
    some = [row for row in FOUR if row["area"] != "bay" and row["year"] != 2012]
    assert {"areas_gone", "years_gone"} <= set(keys(some))
    assert "areas_gone" not in keys(some, None)
    assert set(keys(some, Standing())) == {"years_missing"}


def test_deaths_may_have_their_population_in_the_edition() -> None:
    alone = [deaths(where(FOUR, area="north"))]
    assert [one.key for one in parse(alone).problems] == ["deaths_without_population"]
    assert [one.key for one in parse(alone, STOOD).problems] == []
    assert [one.key for one in parse(alone, None).problems] == []  # asked before
    later = [deaths(rows(("north",), years=range(2010, 2016)))]
    (problem,) = [one for one in parse(later, STOOD).problems if one.severity == "error"]
    assert (problem.key, problem.values["years"]) == ("deaths_without_population", "2015")


def test_a_population_may_have_its_deaths_in_the_edition() -> None:
    files = [deaths(where(FOUR, area="north")), population(FOUR)]
    found = [one.values["area"] for one in parse(files).problems]
    assert sorted(map(str, found)) == ["bay", "cape", "south"]
    assert {one.key for one in parse(files, STOOD).problems} <= {"areas_gone"}


def test_years_that_stand_fill_a_gap() -> None:
    table = [row for row in where(FOUR, area="north") if row["year"] in (2010, 2014)]
    assert "years_missing" in keys(table, Standing())
    assert "years_missing" not in keys(table)
    other = without(FOUR, where(FOUR, area="north", year=2012))
    assert "years_missing" in keys(where(other, area="north"), stood(other))
