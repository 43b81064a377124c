"""Tables of large areas that live under known laws, clean and to be spoilt one way at a time."""

from collections.abc import Iterable, Mapping

import numpy as np

from engine.ages import AgeGrid
from tests.factories import gompertz_rates
from tests.server.intake.tables import Row

FIVES = AgeGrid((0, 1, *range(5, 96, 5)))
SINGLE = AgeGrid(tuple(range(96)))
YEARS = range(2001, 2009)
GROWTH = 0.01
LAWS = {"f": (2e-5, 0.1), "m": (3e-5, 0.1)}  # level and slope of a Gompertz law


def lives(
    areas: Iterable[str] = ("north",),
    *,
    grid: AgeGrid = FIVES,
    people: float = 2e6,
    years: Iterable[int] = YEARS,
    laws: Mapping[str, tuple[float, float]] = LAWS,
    others: Mapping[str, tuple[float, float]] = LAWS,
) -> list[Row]:
    """Stable populations that grow by GROWTH a year, with Poisson deaths under `laws` in the first
    area and `others` in the rest. A sex of the first area has some `people`; each further area a
    tenth more."""
    table: list[Row] = []
    rng = np.random.default_rng(7)
    for number, area in enumerate(areas):
        for sex, (level, slope) in (others if number else laws).items():
            rates = gompertz_rates(grid, level=level, slope=slope)
            alive = stable(rates, grid) * people * (1 + number / 10)
            for year in years:
                lived = np.round(alive * np.exp(GROWTH * (year - 2001)) * rng.normal(1, 1e-3))
                table += [
                    {
                        "area": area,
                        "year": year,
                        "sex": sex,
                        "age": label.replace("–", "-"),
                        "deaths": died,
                        "population": round(count),
                    }
                    for label, died, count in zip(
                        grid.labels, rng.poisson(rates * lived).tolist(), lived, strict=True
                    )
                ]
    return table


def stable(rates: np.ndarray, grid: AgeGrid) -> np.ndarray:
    """Shares of the age groups where births have grown by GROWTH for ever."""
    widths = np.append(grid.widths[:-1], 1 / (rates[-1] + GROWTH))
    fall = np.append(rates[:-1], rates[-1]) + GROWTH
    reached = np.exp(-np.append(0.0, np.cumsum(fall[:-1] * widths[:-1])))
    within = np.append((1 - np.exp(-fall[:-1] * widths[:-1])) / fall[:-1], widths[-1])
    return np.asarray(reached * within / (reached * within).sum())


def numbered(row: Row, name: str) -> int:
    return int(str(row[name]))


def start(row: Row) -> int:
    """First age of a row's group."""
    return int(str(row["age"]).rstrip("+").split("-")[0])


def times(
    table: list[Row],
    factor: float,
    name: str = "deaths",
    *,
    ages: Iterable[int] = range(200),
    **values: object,
) -> list[Row]:
    """The table with a count multiplied at some ages in the rows that have these values."""
    within = set(ages)
    return [
        row | {name: round(numbered(row, name) * factor)}
        if start(row) in within and all(row[key] == value for key, value in values.items())
        else row
        for row in table
    ]
