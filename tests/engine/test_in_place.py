"""What is worked out in place is what the chain gives, one population or many."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine import bulk, in_place
from engine.ages import AgeGrid
from engine.chain import run
from engine.indicators import INDICATORS
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from tests.engine.compiled.test_equal import ALL, CHAINS, drawn
from tests.factories import GRIDS, gompertz_panel

PLAIN = SETTINGS["almanac-1"]


@pytest.fixture(params=ALL)
def grid(request: pytest.FixtureRequest) -> AgeGrid:
    return ALL[request.param]


def flags(panel: Panel, settings: Settings = PLAIN) -> np.ndarray:
    rows, ages = panel.deaths.shape
    columns = {name: np.empty((rows, ages)) for name in in_place.COLUMNS}
    numbers = {key: np.empty(rows) for key in bulk.NUMBERS}
    return in_place.fill(panel, settings, columns, numbers)


@pytest.mark.parametrize("settings", CHAINS, ids=lambda one: one.key)
@pytest.mark.parametrize("sex", ["f", "m", "p", "mixed"])
def test_tables_and_numbers_are_those_of_the_chain(
    grid: AgeGrid, sex: str, settings: Settings
) -> None:
    panel = drawn(grid, sex, seed=8, batch=60)
    full = np.where(panel.exposure[30:] == 0, 100.0, panel.exposure[30:])
    panel.exposure[30:] = full  # else nearly every row has a join
    assert 3 < flags(panel, settings).sum() < 60
    found, chain = bulk.tables(panel, settings, by="numpy"), run(panel, settings)
    for name in bulk.COLUMNS:
        ours, theirs = getattr(found.table, name), getattr(chain.table, name)
        if name == "ex":
            assert_allclose(ours, theirs, rtol=1e-12, atol=0)
        else:
            assert_array_equal(ours, theirs, err_msg=name)
    for key in bulk.NUMBERS:
        expected = INDICATORS[key].value(chain)
        assert_allclose(found.numbers[key], expected, rtol=1e-12, atol=1e-12, err_msg=key)


@pytest.mark.parametrize("split", [1, 7, 300])
def test_a_table_does_not_depend_on_the_others(split: int) -> None:
    panel = drawn(GRIDS["single"], "p", seed=9, batch=501)
    together = bulk.tables(panel, PLAIN, by="numpy")
    part = bulk.tables(panel[split : split + 7], PLAIN, by="numpy")
    for name in bulk.COLUMNS:
        whole = getattr(together.table, name)[split : split + 7]
        assert_array_equal(getattr(part.table, name), whole, err_msg=name)
    for key in bulk.NUMBERS:
        assert_array_equal(part.numbers[key], together.numbers[key][split : split + 7])


def test_where_all_die_life_goes_on_in_the_column_of_expectations() -> None:
    """Three deaths a person-year at 85 to 89: nobody reaches 90, whose ex is still read."""
    one = gompertz_panel(GRIDS["abridged"], slope=np.array([0.09, 0.1]))
    at = GRIDS["abridged"].position(80)
    deaths = one.deaths.copy()
    deaths[0, at] = 3 * one.exposure[0, at]
    panel = replace(one, deaths=deaths)
    assert flags(panel).all()
    found, chain = bulk.tables(panel, PLAIN, by="numpy").table, run(panel, PLAIN).table
    assert found.lx[0, at + 1] == 0
    assert found.ax[0, at] == pytest.approx(1 / 3)
    assert np.isfinite(found.ex).all()
    assert_allclose(found.ex, chain.ex, rtol=1e-12)


def test_gaps_and_joins_are_left_to_the_chain() -> None:
    panel = gompertz_panel(GRIDS["abridged"], slope=np.array([0.09, 0.1, 0.11]))
    panel.deaths[0, 5], panel.exposure[1, 7] = np.nan, 0.0
    assert_array_equal(flags(panel), [False, False, True])


def test_chains_that_are_not_plain_arithmetic_are_not_followed() -> None:
    assert in_place.followed(PLAIN)
    for key in ("almanac-1-keyfitz", "almanac-1-gompertz"):
        assert not in_place.followed(SETTINGS[key])
