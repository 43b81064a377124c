"""The study of false alarms in short: clean counts, and a bound for every check."""

import datetime as dt

import numpy as np
import pytest

from server.intake.checks import KINDS
from server.intake.checks.alarms import FalseAlarms, kept
from tests.studies import false_alarms
from tests.studies.false_alarms import (
    BY_CAUSE,
    LAWS,
    SINGLE,
    SIZES,
    Counts,
    alarms,
    measure,
    simulated,
    table,
)

BOUND = 2.0  # findings of a check for 1,000 clean areas, sexes and years, in any of the data


@pytest.fixture(scope="module")
def found() -> FalseAlarms:
    """Each of the data once; of made-up ones a tenth of what is kept."""
    return measure(1)


@pytest.mark.parametrize("key", KINDS)
def test_no_check_finds_much_in_clean_counts(found: FalseAlarms, key: str) -> None:
    """One finding among the 400 lines of a collection is 2.5 in 1,000: two are too many."""
    for one in found.data:
        assert found.rates[one.name].get(key, 0) * one.lines / 1000 <= 1, one.name
    assert found.of(key).mean < 0.5


def test_what_is_kept_holds_the_bound_and_names_checks_that_are() -> None:
    stored = kept()
    assert dt.date.fromisoformat(stored.measured) >= dt.date(2026, 12, 1)
    assert {key for rates in stored.rates.values() for key in rates} <= set(KINDS)
    assert len(stored.data) == 3 + 2 * len(SIZES) * len(LAWS) + len(BY_CAUSE)
    assert all(stored.of(key).worst <= BOUND for key in KINDS)
    assert sum(stored.rates[one.name] != {} for one in stored.data if "Denmark" in one.name) == 0
    assert FalseAlarms.from_json(stored.to_json()) == stored


def test_rates_are_means_over_all_lines() -> None:
    data = (false_alarms.CleanCounts("small", 100), false_alarms.CleanCounts("large", 300))
    told = FalseAlarms("2026-12-01", data, {"small": {"a": 8.0}, "large": {}})
    rate = told.of("a")
    assert (rate.worst, rate.where, rate.mean) == (8.0, "small", 2.0)
    assert (told.lines, told.found) == (400, 0.8)
    assert "| small | 100 | 8 | a 8 |" in table(told)


@pytest.mark.parametrize("law", LAWS)
def test_made_up_counts_vary_as_they_say(law: str) -> None:
    """Variance of deaths over their mean, from one year to the next, at ages of few hundreds."""
    counts = simulated(SINGLE, 1_000_000, law, 3)
    died = counts.deaths[..., 60:80]
    step = np.diff(died, axis=2) ** 2 / (died[:, :, 1:] + died[:, :, :-1])
    expected = 1.0 if law == "poisson" else false_alarms.UNEVEN
    mean = died.mean()
    shocks = 0.0 if law == "poisson" else false_alarms.SHOCK**2 * mean
    assert step.mean() == pytest.approx(expected + shocks, rel=0.15)


def test_a_fault_among_clean_counts_is_counted() -> None:
    clean = simulated(SINGLE, 250_000, "poisson", 1)
    deaths = clean.deaths.copy()
    deaths[2, 0, 5] *= 1.5
    spoilt = Counts(clean.grid, deaths, clean.people, clean.first)
    assert alarms(spoilt)["jump_of_deaths"] == 1
