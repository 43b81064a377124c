"""Denmark 1974-2012 from the counts, as panels; and the files of values to compare with."""

import csv
from functools import cache
from pathlib import Path

import numpy as np

from engine.ages import AgeGrid
from engine.panel import Panel

HERE = Path(__file__).parent
YEARS = range(1974, 2013)
SEXES = {"female": "f", "male": "m"}
GRID = AgeGrid(tuple(range(100)))
ABRIDGED = AgeGrid((0, 1, *range(5, 100, 5)))


@cache
def rows(name: str) -> list[dict[str, str]]:
    """Rows of a file of this folder."""
    with open(HERE / name, encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@cache
def panel(sex: str) -> Panel:
    """All years of a sex ('female', 'male'), [year, age]."""
    counts = [row for row in rows("denmark_deaths_personyears_1974_2012.csv") if row["sex"] == sex]
    assert [int(row["age"]) for row in counts] == [age for _ in YEARS for age in range(100)]
    deaths, exposure = (
        np.array([float(row[column]) for row in counts]).reshape(len(YEARS), 100)
        for column in ("deaths", "person_years")
    )
    return Panel.of(GRID, deaths, exposure, sex=SEXES[sex])


def one(sex: str, year: int) -> Panel:
    """One year of a sex, [age]."""
    return panel(sex)[year - YEARS[0]]


def summary(sex: str, column: str) -> np.ndarray:
    """A column of the summary for a sex, [year]."""
    found = [row for row in rows("denmark_summary.csv") if row["sex"] == sex]
    assert [int(row["year"]) for row in found] == list(YEARS)
    return np.array([float(row[column]) for row in found])
