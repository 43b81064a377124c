"""Years of life lost: closed forms, and an open age group against single ages."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.ages import AgeGrid
from engine.standards.remaining_years import GBD_2010, RemainingYears
from engine.years_lost import before, by_reference, rate
from tests.engine.stepping import complex_step, largest_error
from tests.factories import GRIDS, gompertz_panel
from tests.published import denmark

TO_85 = AgeGrid((0, 1, *range(5, 86, 5)))


@pytest.mark.parametrize("grid", [GRIDS["single"], GRIDS["abridged"], TO_85])
@pytest.mark.parametrize("age", [1, 65, 75, 85])
def test_a_constant_rate_among_as_many_at_each_age_costs_half_the_span(
    grid: AgeGrid, age: int
) -> None:
    """The sum of n (A - x - n/2) under A is A^2 / 2; divided by the A years lived, A / 2."""
    exposure = np.append(grid.widths[:-1], 7.0)
    got = rate(np.full(len(grid), 0.0125), exposure, before(grid, age),
               np.array(grid.starts) < age)  # fmt: skip
    assert got.value == pytest.approx(0.0125 * age / 2, rel=1e-12)


def test_nothing_is_lost_at_the_age_or_after() -> None:
    years = before(TO_85, 75)
    starts = np.array(TO_85.starts)
    assert np.all(years[starts >= 75] == 0)
    assert years[starts == 70] == 2.5
    assert years[0] == 74.5


def test_years_left_are_those_of_the_reference_at_its_ages_and_on_a_line_between() -> None:
    line = RemainingYears("a line", (0, 50, 100), (90.0, 50.0, 10.0), "none")
    assert_allclose(by_reference(AgeGrid((0, 40, 60)), line), [74.0, 50.0, 42 - 0.8 * 21])
    # middles of ages 0 and 1 to 4, of 72.5, and half of 7.64 years after 85
    got = by_reference(TO_85, GBD_2010)
    assert got[0] == pytest.approx((86.02 + 85.21) / 2)
    assert got[1] == pytest.approx(85.21 - 2 / 4 * (85.21 - 81.25))
    assert got[15] == pytest.approx((18.93 + 14.80) / 2)
    assert got[-1] == pytest.approx(7.64 - 3.82 / 5 * (7.64 - 5.05))


def test_beyond_its_last_age_the_reference_is_held() -> None:
    grid = AgeGrid((0, 110, 120))
    assert_allclose(by_reference(grid, GBD_2010)[1:], 1.64)


def test_the_gradient_is_the_complex_step_and_weighs_the_deaths() -> None:
    panel = gompertz_panel(GRIDS["abridged"], seed=2, slope=np.array([0.09, 0.1]))
    mx, younger = panel.deaths / panel.exposure, np.array(panel.grid.starts) < 75
    years = before(panel.grid, 75)
    got = rate(mx, panel.exposure, years, younger)
    stepped = complex_step(lambda m: rate(m, panel.exposure, years, younger).value, mx)
    assert largest_error(got.gradient, stepped) < 1e-12
    lived = panel.exposure[:, younger].sum(axis=-1)
    assert_allclose(got.value, (panel.deaths * years).sum(axis=-1) / lived, rtol=1e-12)


def test_a_gap_above_the_ages_asked_is_no_gap() -> None:
    panel = gompertz_panel(GRIDS["abridged"], seed=2)
    exposure = panel.exposure.copy()
    exposure[-1] = np.nan
    holed = replace(panel, exposure=exposure)
    younger = np.array(panel.grid.starts) < 75
    mx = panel.deaths / panel.exposure
    both = [rate(mx, one.exposure, before(panel.grid, 75), younger).value for one in (panel, holed)]
    assert both[0] == both[1]


@pytest.mark.parametrize(("opens", "most"), [(75, 0.12), (80, 0.061), (85, 0.03)])
def test_an_open_group_moves_the_figure_by_as_much_as_is_said(opens: int, most: float) -> None:
    """Denmark from 1974 to 2012, both sexes: most for women of late years."""
    errors = []
    for sex in denmark.SEXES:
        single = denmark.panel(sex)
        grouped = single.regroup(AgeGrid(tuple(range(opens + 1))))
        fine, coarse = (
            rate(
                one.deaths / one.exposure,
                one.exposure,
                by_reference(one.grid, GBD_2010),
                np.ones(len(one.grid), bool),
            ).value
            for one in (single, grouped)
        )
        errors.append(coarse / fine - 1)
    assert 0.85 * most < np.max(errors) < most
    assert np.min(errors) > -0.01
