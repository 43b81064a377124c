"""Life expectancy, and years lived between two ages."""

import numpy as np
import pytest

from engine.chain import run
from engine.estimates import Reason
from engine.indicators import estimate, find
from engine.settings import SETTINGS
from tests.factories import GRIDS, gompertz_panel

SETTINGS_1 = SETTINGS["almanac-1"]


@pytest.mark.parametrize("key", SETTINGS)
@pytest.mark.parametrize("grid", GRIDS)
def test_a_life_is_made_up_of_its_parts(grid: str, key: str) -> None:
    chain = run(gompertz_panel(GRIDS[grid], seed=2, infant=[0.003, 0.1]), SETTINGS[key])
    read = lambda name: find(name).value(chain)  # noqa: E731
    parts = read("e0_15") + read("l15") * read("e15_65") + read("l65") * read("e65")
    np.testing.assert_allclose(parts, read("e0"), rtol=1e-13)


def test_without_deaths_between_them_all_years_are_lived() -> None:
    panel = gompertz_panel(GRIDS["single"], seed=2)
    panel.deaths[..., 20:30] = 0
    assert find("e20_30").value(run(panel, SETTINGS_1)) == pytest.approx(10, abs=1e-12)


@pytest.mark.parametrize("key", ["e81", "e15_67", "e17_65"])
def test_an_age_that_begins_no_group_has_no_figure(key: str) -> None:
    got = estimate(find(key), gompertz_panel(), SETTINGS_1)
    assert np.isnan(got.value)
    assert got.reason == Reason.AGE_NOT_ON_GRID


def test_years_lived_below_the_open_age_stand_without_deaths_beyond() -> None:
    panel = gompertz_panel(seed=2)
    panel.deaths[-1] = 0
    assert np.isfinite(estimate(find("e15_65"), panel, SETTINGS_1).high)
    assert estimate(find("e65"), panel, SETTINGS_1).reason == Reason.NO_DEATHS_IN_OPEN_GROUP
