"""Faults that published files are known to have are found, and clean files pass."""

from collections.abc import Iterable

import numpy as np
import pytest

from engine.ages import AgeGrid
from server.intake.mapping import Mapping
from server.intake.parsing import Handed, parse
from server.intake.problems import Problem
from tests.factories import gompertz_rates
from tests.published import denmark
from tests.server.intake.lives import FIVES, stable

COLUMNS = Mapping(
    year="year", sex="sex", age="age", area="area", deaths="deaths", population="population"
)
Line = tuple[str, int, str, str, float, float]


def found(lines: Iterable[Line], **mapping: object) -> list[Problem]:
    heading = "area,year,sex,age,deaths,population"
    text = "\n".join([heading, *(",".join(map(str, line)) for line in lines)])
    mapped = Mapping(**({f: getattr(COLUMNS, f) for f in heading.split(",")} | mapping))  # type: ignore[arg-type]
    return list(parse([Handed("counts", "counts.csv", text.encode(), mapped)]).problems)


def danish(to: AgeGrid) -> list[Line]:
    lines: list[Line] = []
    for sex in ("female", "male"):
        panel = denmark.panel(sex).regroup(to)
        for year, deaths, people in zip(denmark.YEARS, panel.deaths, panel.exposure, strict=True):
            lines += [
                ("dk", year, sex, label.replace("–", "-"), *counts)
                for label, *counts in zip(to.labels, deaths, people, strict=True)
            ]
    return lines


def test_the_person_years_at_98_are_found() -> None:
    """They are 17 % too large at source, so that the death rate falls from 97 to 98."""
    (problem,) = found(danish(denmark.GRID))
    assert problem.key == "old_age_rates_fall"
    assert [problem.values[name] for name in ("age", "before", "sex")] == ["98", "97", "f"]
    assert (problem.values["rate"], problem.values["other"]) == (321.5, 343.3)


@pytest.mark.parametrize(
    "grid",
    [AgeGrid(tuple(range(96))), denmark.ABRIDGED, AgeGrid((0, 1, *range(5, 90, 5)))],
    ids=["single years to 95+", "five-year groups to 95+", "to 85+"],
)
def test_clean_danish_counts_trip_none(grid: AgeGrid) -> None:
    assert found(danish(grid)) == []


def men() -> list[Line]:
    return [
        (
            "dk",
            int(row["period"]),
            "m",
            row["age"],
            float(row["deaths"]),
            float(row["person_years"]),
        )
        for row in denmark.rows("denmark_men_1943_1988.csv")
    ]


def test_a_period_that_is_a_copy_of_another_is_found() -> None:
    keys = [problem.key for problem in found(men(), last_age_open=True)]
    assert set(keys) == {"years_missing"}  # the years between the first ones of the periods
    copy = [("dk", 1938, *line[2:]) for line in men() if line[1] == 1943]
    repeated = [
        problem
        for problem in found(copy + men(), last_age_open=True)  # type: ignore[arg-type]
        if problem.key == "year_repeated"
    ]
    assert [problem.column for problem in repeated] == ["deaths", "population"]
    assert {(one.values["same"], one.values["years"]) for one in repeated} == {("1938", "1943")}


def test_a_period_whose_rates_are_those_of_another_is_found() -> None:
    """Rates per million among men that become more from period to period."""
    lines: list[Line] = []
    for row in denmark.rows("england_wales_men_1931_1941.csv"):
        year, age = int(row["period_start"]), int(row["age"])
        people = 1e6 * np.exp(0.01 * (year - 1931)) * (1.2 - age / 80)
        if age == 10:
            lines.append(("ew", year, "m", "0-9", 9_000.0 + year, 1.1 * people))
        label = "80+" if age == 80 else f"{age}-{age + 4}"
        deaths = round(people * float(row["all_cause_per_1e6"]) / 1e6, 6)
        lines.append(("ew", year, "m", label, deaths, people))
    in_groups = [problem for problem in found(lines) if problem.key == "rates_repeated"]
    assert in_groups == []  # the youngest, which the file lacks, were made up to differ
    alike = [(a, y, s, g, d if g != "0-9" else 0.009 * p, p) for a, y, s, g, d, p in lines]
    (problem,) = [one for one in found(alike) if one.key == "rates_repeated"]
    assert (problem.values["same"], problem.values["year"]) == ("1931", "1936")


def brazil() -> list[Line]:
    """Registered deaths by state, given the ages of a law and a population that grows evenly, of
    which the deaths registered in 2019 would be 0.55 %."""
    rates = gompertz_rates(FIVES, level=4e-5, slope=0.09, infant=0.012)
    alive = stable(rates, FIVES)
    share = rates * alive / (rates * alive).sum()
    rows = denmark.rows("brazil_registered_deaths_2015_2020.csv")
    latest = {row["state"]: int(row["deaths"]) for row in rows if row["year"] == "2019"}
    lines: list[Line] = []
    for row in rows:
        state, year = row["state"], int(row["year"])
        people = latest[state] / 0.0055 * np.exp(0.01 * (year - 2019))
        lines += [
            (state, year, "p", label.replace("–", "-"), float(round(died)), float(round(lived)))
            for label, died, lived in zip(
                FIVES.labels, int(row["deaths"]) * share, people * alive, strict=True
            )
        ]
    return lines


def test_registered_deaths_of_doubtful_completeness_raise_warnings() -> None:
    problems = found(brazil(), area="", area_name="area")
    told = {problem.key for problem in problems}
    assert "jump_of_deaths" in told  # 2020, and registration that spread in leaps
    assert all(problem.severity == "warning" for problem in problems)
    before = [line for line in brazil() if line[1] < 2020]  # without the year that ends in May
    told_before = found(before, area="", area_name="area")
    assert "registered_share" in {problem.key for problem in told_before}
    drifting = {p.values["area"] for p in told_before if p.key == "deaths_drift"}
    assert {"bahia", "maranhao", "rio-grande-do-sul"} <= drifting
    assert {"sao-paulo", "distrito-federal"}.isdisjoint(drifting)
