"""Danish men by fifteen causes, under a list of one's own: numbers in place of codes."""

import csv
from collections import defaultdict
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from server.intake.parsing import Handed, Parsed, parse
from tests.server.intake.by_cause import own
from tests.server.intake.tables import COLUMNS

PUBLISHED = Path(__file__).parents[3] / "published"
AGES = [*range(0, 90, 5), 90]


def _rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8") as file:
        return list(csv.DictReader(file))


RATES = _rows("denmark_causes_1943_1988.csv")
MEN = _rows("denmark_men_1943_1988.csv")
NAMES = tuple(dict.fromkeys(row["cause"] for row in RATES))


def _age(age: int) -> str:
    return "90+" if age == 90 else f"{age}-{age + 4}"


def _died(row: dict[str, str]) -> float:
    return round(float(row["rate_per_1000"]) * float(row["person_years"]) / 1000, 6)


@pytest.fixture(scope="module")
def parsed() -> Parsed:
    lines = ["area,year,sex,age,cause,deaths,population"]
    for row in RATES:
        number = NAMES.index(row["cause"]) + 1
        head = f"dk,{row['period']},m,{_age(int(row['age']))},{number}"
        lines.append(f"{head},{_died(row)},{row['person_years']}")
    mapping = replace(COLUMNS, cause="cause", cause_list="own")
    listed = own(*(f"{number},{name}" for number, name in enumerate(NAMES, start=1)))
    content = "\n".join(lines).encode()
    return parse([Handed("counts", "men.csv", content, mapping), listed])


def test_the_file_reads_through(parsed: Parsed) -> None:
    assert not parsed.errors
    assert [cause.label for cause in parsed.causes] == list(NAMES)
    assert (parsed.row_count, parsed.sound_count) == (2850 + 15, 2850 + 15)
    assert len({key.period for key in parsed.cells}) == 10


def test_each_cause_has_its_deaths(parsed: Parsed) -> None:
    expected: dict[tuple[str, str], list[float]] = defaultdict(lambda: [0.0] * len(AGES))
    for row in RATES:
        at = row["period"], str(NAMES.index(row["cause"]) + 1)
        expected[at][AGES.index(int(row["age"]))] = _died(row)
    found = {(key.period, key.cause): cell for key, cell in parsed.cells.items() if key.cause}
    assert set(found) == {at for at, ages in expected.items() if any(ages)}
    for at, cell in found.items():
        assert list(cell.grid.starts) == AGES
        np.testing.assert_array_equal(cell.values, expected[at])


def test_the_causes_add_up_to_the_deaths_as_published(parsed: Parsed) -> None:
    """To 0.009 per 1,000, as the source beside the file says, where the person-years are stated in
    full; from a million on they are rounded to ten thousands."""
    for key, cell in parsed.cells.items():
        if key.measure == "deaths" and not key.cause:
            rows = [row for row in MEN if row["period"] == key.period]
            people = np.array([float(row["person_years"]) for row in rows])
            dead = np.array([float(row["deaths"]) for row in rows])
            rounded = np.where(people >= 1e6, 5_000 * dead / people, 0)
            near = 0.0091e-3 * people + rounded
            np.testing.assert_array_less(np.abs(cell.values - dead), near)
            held = parsed.cells[key._replace(measure="person_years")]
            np.testing.assert_array_equal(held.values, people)
