"""Years of life lost as entries: by hand, and where the age is none of the grid's."""

from itertools import pairwise

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.ages import AgeGrid
from engine.chain import gradient, run
from engine.indicator import Indicator
from engine.indicators.years_of_life_lost import FAMILY, before_age
from engine.settings import SETTINGS, Settings
from engine.standards.remaining_years import GBD_2010
from tests.factories import GRIDS, gompertz_panel

BEFORE_75, REFERENCE = FAMILY


@pytest.mark.parametrize("age", [1, 65, 75, 85])
def test_years_before_an_age_by_hand(age: int) -> None:
    panel = gompertz_panel(GRIDS["abridged"], seed=1)
    starts = (*panel.grid.starts, 105)
    lost = lived = 0.0
    for x, (start, end) in enumerate(pairwise(starts)):
        if start < age:
            lost += panel.deaths[x] * (age - (start + end) / 2)
            lived += panel.exposure[x]
    chain = run(panel, SETTINGS["almanac-1"])
    assert before_age(age).value(chain) == pytest.approx(lost / lived, rel=1e-12)


def test_years_by_the_reference_by_hand() -> None:
    """Groups that begin and end at ages of the reference; the open one at 100: 2.23 and 1.64."""
    panel = gompertz_panel(GRIDS["abridged"], seed=1)
    table = dict(zip(GBD_2010.ages, GBD_2010.years, strict=True))
    starts = panel.grid.starts
    lost = sum(
        panel.deaths[x] * (table[start] + table[end]) / 2
        for x, (start, end) in enumerate(pairwise(starts))
    )
    lost += panel.deaths[-1] * (2.23 - 1.115 / 5 * (2.23 - 1.64))
    chain = run(panel, SETTINGS["almanac-1"])
    assert REFERENCE.value(chain) == pytest.approx(lost / panel.exposure.sum(), rel=1e-12)


@pytest.mark.parametrize("entry", [*FAMILY, before_age(40)], ids=lambda i: i.key)
@pytest.mark.parametrize("settings", SETTINGS.values(), ids=SETTINGS)
def test_each_is_the_weighted_sum_of_its_deaths(entry: Indicator, settings: Settings) -> None:
    panel = gompertz_panel(GRIDS["single"], seed=1, slope=np.array([0.09, 0.1]))
    chain = run(panel, settings)
    each = chain.rates.per_death(gradient(entry, chain))
    assert_allclose((each * panel.deaths).sum(axis=-1), entry.value(chain), rtol=1e-12)


@pytest.mark.parametrize("settings", SETTINGS.values(), ids=SETTINGS)
@pytest.mark.parametrize("age", [72, 95])
def test_an_age_inside_a_group_gives_no_number(age: int, settings: Settings) -> None:
    """Also where a law goes on in single years above the open age: deaths are counted below it."""
    panel = gompertz_panel(GRIDS["abridged"], seed=1).regroup(AgeGrid((0, 1, *range(5, 91, 5))))
    assert np.isnan(before_age(age).value(run(panel, settings)))
