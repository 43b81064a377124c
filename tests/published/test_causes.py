"""Danish men by fifteen causes: contributions between 1953-57 and 1983-87, and life expectancy
without each cause from 1943 on, against values computed elsewhere."""

from typing import NamedTuple

import numpy as np
import pytest

from engine.ages import AgeGrid, Array
from engine.causes.counts import CauseCounts
from engine.causes.deletion import GAIN
from engine.causes.losses import years_lost
from engine.causes.number import estimates
from engine.chain import run
from engine.decomposition import arriaga, contributions_by_cause
from engine.indicators import find as indicator
from engine.panel import Panel
from engine.settings import find
from tests.published import denmark

GRID = AgeGrid(tuple(range(0, 95, 5)))
STEADY = find("almanac-1-constant-rate")
DIGITS = 1e-7  # the values have eight digits, the largest is 1.1


class Side(NamedTuple):
    panel: Panel
    causes: Array  # deaths [cause, age]


def side(period: str) -> Side:
    counted = [
        row for row in denmark.rows("denmark_causes_1943_1988.csv") if row["period"] == period
    ]
    rates, years = (
        np.array([float(row[column]) for row in counted]).reshape(len(GRID), 15)
        for column in ("rate_per_1000", "person_years")
    )
    assert [int(row["age"]) for row in counted[::15]] == list(GRID.starts)
    causes = (rates / 1000 * years).T
    return Side(Panel.of(GRID, causes.sum(axis=0), years[:, 0], sex="m"), causes)


def expected(column: str) -> Array:
    """[cause, age]"""
    values = [float(row[column]) for row in denmark.rows("denmark_cause_contributions.csv")]
    return np.array(values).reshape(len(GRID), 15).T


@pytest.mark.fast
def test_every_age_and_cause_along_the_straight_line() -> None:
    this, that = side("1983"), side("1953")
    found = contributions_by_cause(
        indicator("e0"), this.panel, that.panel, STEADY, causes=(this.causes, that.causes)
    )
    np.testing.assert_allclose(
        found.by_cause, expected("contribution_line_integral"), rtol=0, atol=DIGITS
    )
    assert abs(found.remainder) < 1e-9


@pytest.mark.fast
def test_arriagas_ages_and_his_causes_by_their_shares() -> None:
    """His method gives a cause the share it has of the age's change of rate; where an age hardly
    changes while its causes do, that share has no bound, which the straight line does not know."""
    this, that = side("1983"), side("1953")
    ages = arriaga(*(run(one.panel, STEADY).table for one in (this, that)))
    np.testing.assert_allclose(
        ages, expected("contribution_years").sum(axis=0), rtol=0, atol=DIGITS
    )
    step = this.causes / this.panel.exposure - that.causes / that.panel.exposure
    np.testing.assert_allclose(
        ages * step / step.sum(axis=0), expected("contribution_years"), rtol=0, atol=1e-6
    )


@pytest.mark.fast
def test_life_expectancy_without_each_cause() -> None:
    """With rates constant within groups the constant ratio is the chain on the rates left."""
    for row in denmark.rows("denmark_cause_deleted.csv"):
        one = side(row["period"])
        e0 = run(one.panel, STEADY).table.ex[0]
        found = estimates([GAIN], one.panel, CauseCounts(one.causes), STEADY)["gain"].value
        without = [float(value) for name, value in row.items() if name.startswith("e0_without_")]
        assert e0 == pytest.approx(float(row["e0_all_causes_sum"]), abs=1e-6)
        np.testing.assert_allclose(e0 + found, without, rtol=0, atol=1e-6)


@pytest.mark.fast
def test_years_lost_by_cause_add_up_to_e_dagger() -> None:
    for period in ("1943", "1963", "1988"):
        one = side(period)
        by_cell = years_lost(one.panel, CauseCounts(one.causes), STEADY)
        all_ = indicator("edagger").value(run(one.panel, STEADY))
        assert by_cell.sum() == pytest.approx(all_, abs=1e-12)
