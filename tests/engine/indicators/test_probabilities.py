"""Chances of dying between two ages, and survivors."""

import numpy as np
import pytest

from engine.chain import run
from engine.estimates import Reason
from engine.indicators import INDICATORS, estimate, find
from engine.settings import SETTINGS
from tests.factories import GRIDS, gompertz_panel

SETTINGS_1 = SETTINGS["almanac-1"]


def test_chances_of_surviving_multiply() -> None:
    chain = run(gompertz_panel(GRIDS["single"], seed=4, infant=[0.003, 0.1]), SETTINGS_1)
    lives = lambda key: 1 - find(key).value(chain)  # noqa: E731
    np.testing.assert_allclose(lives("15q0") * lives("45q15"), lives("60q0"), rtol=1e-13)
    np.testing.assert_allclose(lives("30q0") * lives("40q30"), find("l70").value(chain), rtol=1e-13)
    np.testing.assert_allclose(lives("1q0"), 1 - chain.table.qx[..., 0], rtol=1e-13)


def test_the_chance_of_dying_between_30_and_70_says_what_it_counts() -> None:
    entry = INDICATORS["40q30"]
    assert entry.label == "Chance of dying between 30 and 70, all causes"
    assert "30q70" in entry.definition
    assert entry.unit.label == "per 1,000 aged 30"
    assert find("30q30").label == "Chance of dying between 30 and 60"


@pytest.mark.parametrize("key", ["l83", "3q80", "4q81"])
def test_an_age_that_begins_no_group_has_no_figure(key: str) -> None:
    assert estimate(find(key), gompertz_panel(), SETTINGS_1).reason == Reason.AGE_NOT_ON_GRID


@pytest.mark.parametrize("key", ["l5", "l100", "5q10", "40q30"])
def test_limits_lie_between_0_and_1(key: str) -> None:
    got = estimate(find(key), gompertz_panel(people=6_000), SETTINGS_1)
    assert 0 <= got.low < got.value < got.high < 1
