"""Standard populations and years left to live: as they were published."""

from itertools import pairwise

import numpy as np
import pytest

from engine.standards import STANDARDS
from engine.standards.remaining_years import GBD_2010
from tests.published.denmark import rows

NAMES = {
    "esp2013": ("ESP2013", 100_000),
    "esp1976": ("ESP1976", 100_000),
    "segi": ("SEGI_world", 100_000),
    "who2000": ("WHO_2000_2025_percent", 100.035),
    "us2000": ("US2000_million_19", 1_000_000),
}


def test_every_standard_is_compared() -> None:
    assert set(STANDARDS) == set(NAMES)
    assert all(standard.key == key for key, standard in STANDARDS.items())


@pytest.mark.parametrize(("key", "name", "total"), [(k, *v) for k, v in NAMES.items()])
def test_weights_are_those_of_the_list_and_add_up_as_published(
    key: str, name: str, total: float
) -> None:
    listed = [row for row in rows("standard_populations.csv") if row["standard"] == name]
    standard = STANDARDS[key]
    assert standard.starts == tuple(int(row["age_from"]) for row in listed)
    assert standard.weights == tuple(float(row["weight"]) for row in listed)
    assert sum(standard.weights) == pytest.approx(total, rel=1e-12)
    assert all(
        float(row["age_to"]) + 1 == int(after["age_from"]) for row, after in pairwise(listed)
    )
    assert listed[-1]["age_to"] == ""


def test_only_the_weights_that_miss_their_total_say_so() -> None:
    noted = {key for key, standard in STANDARDS.items() if standard.note}
    assert noted == {"who2000"}
    assert "100.035" in STANDARDS["who2000"].note


def test_years_left_are_those_of_the_list_and_age_and_years_left_rise_together() -> None:
    listed = rows("gbd_2010_remaining_years.csv")
    assert GBD_2010.ages == tuple(int(row["age"]) for row in listed)
    assert GBD_2010.years == tuple(float(row["standard_remaining_years"]) for row in listed)
    assert np.all(np.diff(GBD_2010.years) < 0)
    assert np.all(np.diff(np.add(GBD_2010.ages, GBD_2010.years)) > 0)
