"""Danish men 1953-57 and 1983-87 by cause: contributions against values computed elsewhere."""

from typing import NamedTuple

import numpy as np
import pytest

from engine.ages import AgeGrid, Array
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
        row for row in denmark.rows("denmark_causes_1953_1983.csv") if row["period"] == period
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
