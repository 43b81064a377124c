"""Panels: persons from the sexes, parts of a batch, what is refused."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.panel import Panel
from tests.factories import GRIDS, gompertz_panel

GRID = AgeGrid((0, 1, 5))


def sex(name: str, infants: float, years: float) -> Panel:
    return Panel.of(GRID, np.array([infants, 2.0, 9.0]), np.array([years, 400.0, 300.0]), sex=name)


def test_persons_carry_each_sexs_share_of_infant_deaths_and_its_rate_over_theirs() -> None:
    both = Panel.persons(sex("f", 2, 400), sex("m", 6, 600))
    np.testing.assert_array_equal(both.deaths, [8, 4, 18])
    np.testing.assert_array_equal(both.exposure, [1000, 800, 600])
    np.testing.assert_allclose(both.infant_weight, [0.25, 0.75])
    np.testing.assert_allclose(both.infant_ratio, [2 / 400 / 0.008, 6 / 600 / 0.008])
    np.testing.assert_allclose(both.infant_ratio * both.deaths[0] / 1000, [2 / 400, 6 / 600])


def test_persons_of_whom_no_infant_died_take_both_rules_alike() -> None:
    both = Panel.persons(sex("f", 0, 400), sex("m", 0, 600))
    np.testing.assert_array_equal(both.infant_weight, [0.5, 0.5])
    np.testing.assert_array_equal(both.infant_ratio, [1, 1])
    alone = Panel.persons(sex("f", 0, 0), sex("m", 6, 600))
    np.testing.assert_array_equal(alone.infant_weight, [0, 1])
    np.testing.assert_array_equal(alone.infant_ratio, [1, 1])


def test_persons_stand_on_the_ages_both_sexes_have() -> None:
    women, men = gompertz_panel(GRIDS["single"], sex="f"), gompertz_panel(sex="m")
    both = Panel.persons(women, men)
    assert both.grid == GRIDS["abridged"]
    assert both.deaths.sum() == pytest.approx(women.deaths.sum() + men.deaths.sum(), rel=1e-12)


def test_regrouping_keeps_the_infants_mix_and_the_counts() -> None:
    panel = gompertz_panel(GRIDS["single"], sex="m", level=np.array([2e-5, 3e-5]))
    coarse = panel.regroup(AgeGrid((0, 1, 50)))
    np.testing.assert_allclose(coarse.deaths[:, 2], panel.deaths[:, 50:].sum(axis=-1))
    assert coarse.infant_weight is panel.infant_weight
    with pytest.raises(ValueError, match="no age group starts at 3"):
        gompertz_panel().regroup(AgeGrid((0, 3)))


def test_refusals() -> None:
    years = np.ones(3)
    with pytest.raises(ValueError, match="deaths ends in 2 age groups but the grid has 3"):
        Panel.of(GRID, np.ones(2), years, sex="f")
    with pytest.raises(ValueError, match="deaths has a negative count"):
        Panel.of(GRID, -years, years, sex="f")
    with pytest.raises(ValueError, match="different age grids cannot be stacked"):
        Panel.stack([gompertz_panel(), gompertz_panel(GRIDS["single"])])
