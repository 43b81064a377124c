"""Austrian males 1992, column by column, to half the last printed digit."""

import csv
from pathlib import Path

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.tables import from_rates

DIGITS = {"mx": 6, "qx": 6, "lx": 0, "dx": 0, "Lx": 0, "Tx": 0, "ex": 3}
RADIX = {"lx", "dx", "Lx", "Tx"}

with open(Path(__file__).parent / "austria_males_1992.csv", encoding="utf-8", newline="") as file:
    ROWS = list(csv.DictReader(file))


def printed(column: str) -> np.ndarray:
    return np.array([float(row[column]) for row in ROWS])


@pytest.mark.fast
@pytest.mark.parametrize("column", DIGITS)
def test_every_column_is_the_printed_one(column: str) -> None:
    grid = AgeGrid(tuple(int(row["age"]) for row in ROWS))
    mx = printed("deaths") / printed("population")
    ax = np.append(printed("ax")[:-1], 1 / mx[-1])
    computed = getattr(from_rates(grid, mx, ax), column) * (1e5 if column in RADIX else 1)
    half_digit = 0.5 * 10.0 ** -DIGITS[column]
    np.testing.assert_allclose(computed, printed(column), rtol=0, atol=half_digit)
