"""The crude death rate: deaths over person-years, and the units of a rate."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import gradient, run
from engine.indicators.rates import FAMILY
from engine.settings import SETTINGS, Settings
from tests.factories import GRIDS, gompertz_panel

(CRUDE,) = FAMILY


@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
@pytest.mark.parametrize("settings", SETTINGS.values(), ids=SETTINGS)
def test_it_is_deaths_over_person_years_on_any_grid_and_chain(
    grid: AgeGrid, settings: Settings
) -> None:
    panel = gompertz_panel(grid, seed=1, slope=np.array([0.09, 0.1]))
    chain = run(panel, settings)
    years = panel.exposure.sum(axis=-1)
    np.testing.assert_allclose(CRUDE.value(chain), panel.deaths.sum(axis=-1) / years, rtol=1e-12)
    each = chain.rates.per_death(gradient(CRUDE, chain))
    np.testing.assert_allclose(each, np.broadcast_to(1 / years[:, None], each.shape), rtol=1e-12)


def test_it_is_printed_per_100_000() -> None:
    assert CRUDE.unit.scale == 100_000
    assert CRUDE.unit.limits == "gamma"
