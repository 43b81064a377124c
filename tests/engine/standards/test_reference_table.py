"""Remaining years printed in a table, turned into the rates that give them."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine import indicators
from engine.chain import run
from engine.settings import SETTINGS, find
from engine.standards.reference_table import OPEN_AGE, reference_panel, rounding
from engine.standards.remaining_years import GBD_2010, RemainingYears
from tests.factories import gompertz_panel

AS_COUNTED = [one for one in SETTINGS.values() if one.open_interval == "one_over_m"]
MODELLED = [one for one in SETTINGS.values() if one.open_interval != "one_over_m"]


@pytest.mark.parametrize("settings", AS_COUNTED, ids=lambda one: one.key)
def test_the_table_has_the_printed_years_at_every_age(settings) -> None:  # type: ignore[no-untyped-def]
    panel = reference_panel(GBD_2010, settings)
    found = run(panel, settings).table.ex
    tolerance = 1e-6 if settings.smoothing != "none" else 1e-10
    assert_allclose(found, GBD_2010.years[: len(panel.grid)], rtol=0, atol=tolerance)
    assert panel.grid.open_age == OPEN_AGE


@pytest.mark.parametrize("settings", MODELLED, ids=lambda one: one.key)
def test_under_a_law_it_has_them_nearly(settings) -> None:  # type: ignore[no-untyped-def]
    found = run(reference_panel(GBD_2010, settings), settings).table.ex[:20]
    assert_allclose(found, GBD_2010.years[:20], rtol=0, atol=0.07)


def test_a_constant_rate_comes_back() -> None:
    ages = (0, 1, *range(5, 106, 5))
    steady = RemainingYears("", ages, (50.0,) * len(ages), "")
    panel = reference_panel(steady, find("almanac-1-constant-rate"))
    assert_allclose(panel.deaths / panel.exposure, 1 / 50)


def test_chance_has_no_part_in_it() -> None:
    settings = find("almanac-1")
    standard = reference_panel(GBD_2010, settings)
    this = gompertz_panel(sex="p", seed=3).regroup(standard.grid)
    e0 = indicators.find("e0")
    alone = indicators.estimate(e0, this, settings)
    apart = indicators.difference(e0, this, standard, settings)
    assert_allclose(apart.se, alone.se, rtol=1e-4)
    assert_allclose(apart.value, alone.value - 86.02, atol=1e-9)


def test_years_printed_a_hundredth_higher_move_a_rate_by_less_than_its_rounding_says() -> None:
    settings, some = find("almanac-1"), rounding(GBD_2010)
    plain = reference_panel(GBD_2010, settings)
    for at in (0, 5, 12):
        years = list(GBD_2010.years)
        years[at] -= 0.005
        years[at + 1] += 0.005
        moved = reference_panel(replace(GBD_2010, years=tuple(years)), settings)
        rates = [panel.deaths[at] / panel.exposure[at] for panel in (plain, moved)]
        assert abs(rates[1] / rates[0] - 1) == pytest.approx(some[at], rel=0.05)
    assert some[2] == pytest.approx(0.5)
    assert np.all(some[10:] < 0.05)
