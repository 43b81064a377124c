"""Panels: persons from the sexes, parts of a batch, what is refused."""

from dataclasses import replace

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


def years(sex_: str) -> list[Panel]:
    """Three years that differ, the second on a coarser grid."""
    made = [
        gompertz_panel(seed=number + 10 * (sex_ == "m"), sex=sex_, people=people, infant=infant)
        for number, (people, infant) in enumerate([(2e5, 0.004), (6e5, 0.006), (3e5, 0.01)])
    ]
    made[1] = made[1].regroup(AgeGrid((0, 1, *range(5, 91, 5))))
    return made


def test_pooled_rates_are_weighted_by_person_years_on_the_ages_all_have() -> None:
    parts = years("f")
    pooled = Panel.pooled(parts)
    assert pooled.grid.open_age == 90
    parts = [part.regroup(pooled.grid) for part in parts]
    np.testing.assert_array_equal(pooled.deaths, sum(part.deaths for part in parts))
    rates = [part.deaths / part.exposure for part in parts]
    weights = [part.exposure / pooled.exposure for part in parts]
    np.testing.assert_allclose(
        pooled.deaths / pooled.exposure,
        sum(rate * weight for rate, weight in zip(rates, weights, strict=True)),
        rtol=1e-12,
    )
    np.testing.assert_allclose(pooled.infant_weight, [1, 0])
    np.testing.assert_allclose(pooled.infant_ratio, [1, 1])


def test_pooling_in_steps_or_in_another_order_is_the_same_sum() -> None:
    first, second, third = years("m")
    together = Panel.pooled([first, second, third])
    steps = Panel.pooled([third, Panel.pooled([second, first])])
    assert steps.grid == together.grid
    np.testing.assert_array_equal(steps.deaths, together.deaths)
    np.testing.assert_allclose(steps.exposure, together.exposure, rtol=1e-14)


def test_persons_of_several_years_are_pooled_sex_by_sex() -> None:
    """Then their infants' mix is that of all years; pooled as persons it is a mean of the years'
    mixes, close where the sexes' shares hardly move."""
    women, men = years("f"), years("m")
    right = Panel.persons(Panel.pooled(women), Panel.pooled(men))
    grid = right.grid
    infants = [sum(p.regroup(grid).deaths[0] for p in side) for side in (women, men)]
    lived = [sum(p.regroup(grid).exposure[0] for p in side) for side in (women, men)]
    np.testing.assert_allclose(right.infant_weight, np.array(infants) / sum(infants), rtol=1e-12)
    own = np.array(infants) / lived / (sum(infants) / sum(lived))
    np.testing.assert_allclose(right.infant_ratio, own, rtol=1e-12)
    pairs = zip(women, men, strict=True)
    near = Panel.pooled([Panel.persons(one, other) for one, other in pairs])
    np.testing.assert_allclose(near.deaths, right.deaths)
    np.testing.assert_allclose(near.infant_weight, right.infant_weight, rtol=1e-12)
    np.testing.assert_allclose(near.infant_ratio, right.infant_ratio, atol=0.05)


def test_a_whole_is_pooled_beside_its_part() -> None:
    part, whole = years("f"), [gompertz_panel(seed=7, people=5e6)] * 3
    beside = [replace(one, whole=other.regroup(one.grid)) for one, other in zip(part, whole,
              strict=True)]  # fmt: skip
    pooled = Panel.pooled(beside).whole
    assert pooled is not None
    np.testing.assert_allclose(pooled.deaths, 3 * whole[0].regroup(pooled.grid).deaths)
    lacking = Panel.pooled([beside[0], part[2]]).whole
    assert lacking is not None
    assert np.isnan(lacking.deaths).all()  # not known of all years is not known


def test_refusals() -> None:
    years = np.ones(3)
    with pytest.raises(ValueError, match="deaths ends in 2 age groups but the grid has 3"):
        Panel.of(GRID, np.ones(2), years, sex="f")
    with pytest.raises(ValueError, match="deaths has a negative count"):
        Panel.of(GRID, -years, years, sex="f")
    with pytest.raises(ValueError, match="different age grids cannot be stacked"):
        Panel.stack([gompertz_panel(), gompertz_panel(GRIDS["single"])])


def test_deaths_as_counted_follow_the_deaths() -> None:
    women = replace(sex("f", 2, 400), counted=np.array([2.0, 1.5, 6.0]))
    men = sex("m", 6, 600)
    for joined in (Panel.persons(women, men), Panel.pooled([women, men])):
        assert joined.counted is not None
        np.testing.assert_array_equal(joined.counted, [8, 3.5, 15])
        np.testing.assert_allclose(joined.counts * joined.worth, joined.deaths)
    both = Panel.stack([women, men])
    assert both.counted is not None
    np.testing.assert_array_equal(both.counted[1], men.deaths)
    assert both[0].counted is not None
    np.testing.assert_array_equal(both[0].counted, [2, 1.5, 6])
    coarser = women.regroup(AgeGrid((0, 5)))
    assert coarser.counted is not None
    np.testing.assert_array_equal(coarser.counted, [3.5, 6])
    assert Panel.persons(men, men).counted is None
    assert men.worth is None


def test_a_counted_death_is_worth_those_shared_out_by_it() -> None:
    women = replace(sex("f", 2, 400), counted=np.array([2.0, 0.0, 6.0]))
    np.testing.assert_array_equal(women.counts, [2, 2, 6])  # of none counted, those shared out
    np.testing.assert_array_equal(women.worth, [1, 1, 1.5])
    nobody = replace(women, deaths=np.array([2.0, 0.0, 9.0]))
    np.testing.assert_array_equal(nobody.counts, [2, 0, 6])
    np.testing.assert_array_equal(nobody.worth, [1, 11 / 8, 1.5])


def test_deaths_as_counted_are_refused_as_deaths_are() -> None:
    with pytest.raises(ValueError, match="counted ends in 2 age groups"):
        replace(sex("f", 2, 400), counted=np.ones(2))
    with pytest.raises(ValueError, match="counted has a negative count"):
        replace(sex("f", 2, 400), counted=-np.ones(3))
