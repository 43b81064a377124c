"""Fitted laws of a population: every one from its own age, with the limits its level asks for."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.stats import chi2

from engine.ages import AgeGrid
from engine.laws import LAWS
from engine.panel import Panel
from server.results import laws
from tests.factories import GRIDS, gompertz_panel

FIVE = GRIDS["abridged"]
LEVEL = 0.95
SLOPE = 0.1


def by_law(panel: Panel, level: float = LEVEL) -> dict[str, laws.Fitted]:
    return {
        next(key for key in laws.FROM if LAWS[key] is one.law): one
        for one in laws.fitted(panel, level)
    }


def test_every_law_is_fitted_from_its_own_age() -> None:
    found = by_law(gompertz_panel(people=3e6, seed=1))
    assert set(found) == set(LAWS)
    assert all(one.found for one in found.values())
    assert {key: one.first for key, one in found.items()} == {
        "gompertz": 40,
        "kannisto": 40,
        "makeham": 40,
        "makeham_infant": 0,
        "siler": 0,
    }


def test_a_law_takes_the_closed_groups_from_its_age_and_no_others() -> None:
    panel = gompertz_panel(people=3e6, seed=1)
    from_40 = slice(FIVE.position(40), len(FIVE) - 1)
    found = by_law(panel)["gompertz"]
    assert_allclose(found.fit.deaths, panel.deaths[from_40])
    assert found.free == len(FIVE) - 1 - FIVE.position(40) - 2
    others = np.ones(len(FIVE))
    others[from_40] = 0
    moved = replace(panel, deaths=panel.deaths * (1 + 9 * others))
    assert by_law(moved)["gompertz"].slope == found.slope
    assert by_law(moved)["makeham_infant"].slope != by_law(panel)["makeham_infant"].slope


@pytest.mark.parametrize("background", [2e-4, 1e-3])
def test_the_law_behind_the_counts_is_found(background: float) -> None:
    panel = gompertz_panel(GRIDS["single"], people=1e8, accidents=background)
    found = by_law(panel)["makeham"]
    mode = np.log(SLOPE / 2e-5) / SLOPE
    for (value, low, high), truth in ((found.mode, mode), (found.slope, SLOPE)):
        assert low < value < high
        assert value == pytest.approx(truth, rel=1e-3)
    at = found.law.position("background")
    assert np.exp(found.fit.parameters[at]) == pytest.approx(background, rel=0.03)


def test_limits_are_even_and_as_wide_as_their_level_asks() -> None:
    panel = gompertz_panel(people=3e5, seed=3)
    wide, narrow = (by_law(panel, level)["gompertz"] for level in (0.95, 0.6826894921370859))
    assert_allclose(narrow.slope[0] - narrow.slope[1], narrow.fit.se[1], rtol=1e-9)
    for part in ("mode", "slope"):
        value, low, high = getattr(wide, part)
        one = getattr(narrow, part)
        assert_allclose(high - value, value - low, rtol=1e-9)
        assert_allclose(high - value, 1.959963984540054 * (one[2] - one[0]), rtol=1e-9)


@pytest.mark.parametrize(
    ("starts", "fitted"),
    [
        ((0, 40), set()),
        ((0, 1, 40, 50, 60), set()),
        ((0, 1, 40, 50, 60, 70), {"gompertz", "kannisto", "makeham_infant"}),
        ((0, 1, 40, 50, 60, 70, 80), set(laws.FROM)),
    ],
)
def test_a_law_needs_more_groups_than_it_has_parameters(
    starts: tuple[int, ...], fitted: set[str]
) -> None:
    panel = gompertz_panel(people=3e6, seed=1).regroup(AgeGrid(starts))
    assert set(by_law(panel)) == fitted


def test_what_does_not_converge_is_told_apart() -> None:
    nobody = replace(gompertz_panel(people=3e6), deaths=np.zeros(len(FIVE)))
    assert not any(one.found for one in laws.fitted(nobody, LEVEL))


def test_a_rate_held_at_nought_is_no_free_parameter() -> None:
    """Without deaths at all ages alike the background is held at 0."""
    panel = gompertz_panel(people=1e7, accidents=0.0)
    lower = np.array(FIVE.starts) < 60
    panel = replace(panel, deaths=np.where(lower, 0.9, 1.0) * panel.deaths)
    found = by_law(panel)["makeham"]
    assert found.fit.at_bound.tolist().count(True) == 1
    assert found.free == by_law(panel)["gompertz"].free


def test_the_law_with_the_least_criterion_of_those_of_adults_is_best() -> None:
    found = laws.fitted(gompertz_panel(people=3e6, seed=1), LEVEL)
    chosen = laws.best(found)
    assert chosen is not None
    assert chosen.first == laws.ADULT
    adult = [one for one in found if one.first == laws.ADULT]
    assert len(adult) == 3
    assert chosen.fit.aic == min(float(one.fit.aic) for one in adult)
    assert laws.best(()) is None


@pytest.mark.parametrize("level", [0.8, 0.95])
def test_a_law_misses_where_chance_would_not_bring_it_so_far(level: float) -> None:
    """The bound is that of the chi-square distribution; scipy has it too, at the cost of a second
    of loading."""
    panel = gompertz_panel(people=3e6, seed=1)
    for one in laws.fitted(panel, level):
        assert_allclose(one.bound, chi2.ppf(level, one.free), rtol=1e-12)
        assert one.misses == (one.fit.deviance > one.bound)
    late = replace(panel, deaths=panel.deaths * np.where(np.array(FIVE.starts) == 60, 1.2, 1.0))
    assert all(one.misses for one in laws.fitted(late, level))
