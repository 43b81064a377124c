"""Fitted laws of a population, and the people at the highest ages that its deaths imply."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.ages import AgeGrid
from engine.chain import run
from engine.estimates import Reason
from engine.indicators import find
from engine.laws import LAWS
from engine.panel import Panel
from engine.settings import find as named
from server.results import models
from server.results.loading import Beside, load
from server.results.questions import PopulationYear
from server.store.connect import Session
from tests.factories import GRIDS, edition, gompertz_panel

FIVE = GRIDS["abridged"]
PLAIN = named("almanac-1")
SLOPE = 0.1


def by_law(panel: Panel, level: float = PLAIN.level) -> dict[str, models.Fitted]:
    return {
        next(key for key in models.FROM if LAWS[key] is one.law): one
        for one in models.fitted(panel, level)
    }


# ---- laws ----------------------------------------------------------------------------------------


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
        ((0, 1, 40, 50, 60, 70, 80), set(models.FROM)),
    ],
)
def test_a_law_needs_more_groups_than_it_has_parameters(
    starts: tuple[int, ...], fitted: set[str]
) -> None:
    panel = gompertz_panel(people=3e6, seed=1).regroup(AgeGrid(starts))
    assert set(by_law(panel)) == fitted


def test_what_does_not_converge_is_told_apart() -> None:
    nobody = replace(gompertz_panel(people=3e6), deaths=np.zeros(len(FIVE)))
    assert not any(one.found for one in models.fitted(nobody, PLAIN.level))


def test_a_rate_held_at_nought_is_no_free_parameter() -> None:
    """Without deaths at all ages alike the background is held at 0."""
    panel = gompertz_panel(people=1e7, accidents=0.0)
    lower = np.array(FIVE.starts) < 60
    panel = replace(panel, deaths=np.where(lower, 0.9, 1.0) * panel.deaths)
    found = by_law(panel)["makeham"]
    assert found.fit.at_bound.tolist().count(True) == 1
    assert found.free == by_law(panel)["gompertz"].free


# ---- the people at the highest ages --------------------------------------------------------------


def part(share: float, *, ghosts: float = 1.0) -> Panel:
    """A scaled copy of its whole, whose people of 90 and over were handed in `ghosts` times."""
    whole = gompertz_panel(people=4e6)
    old = np.where(np.array(FIVE.starts) >= 90, ghosts, 1.0)
    own = Panel.of(FIVE, share * whole.deaths, share * whole.exposure * old, sex="f")
    return replace(own, whole=whole)


def test_the_root_is_part_of_nothing() -> None:
    assert models.implied(gompertz_panel(people=4e6), PLAIN) is None


def test_a_scaled_copy_implies_the_people_that_were_counted() -> None:
    panel = part(0.2)
    found = models.implied(panel, PLAIN)
    assert found is not None
    assert found.known
    assert found.population.ratio.value == pytest.approx(1, rel=1e-9)
    assert found.population.ratio.low < 1 < found.population.ratio.high
    assert tuple(found.figures) == models.MOVED
    for key, one in found.figures.items():
        counted = float(find(key).value(run(panel, PLAIN)))
        assert one.value == pytest.approx(counted, rel=1e-9)
        assert one.low <= one.value <= one.high


def test_people_counted_twice_are_found_and_shorten_life() -> None:
    panel = part(0.2, ghosts=1.25)
    found = models.implied(panel, PLAIN)
    assert found is not None
    assert found.population.ratio.value == pytest.approx(0.8, rel=1e-9)
    truth = float(find("e65").value(run(part(0.2), PLAIN)))
    assert found.figures["e65"].value == pytest.approx(truth, rel=1e-9)
    assert float(find("e65").value(run(panel, PLAIN))) > truth


def test_a_small_part_is_not_judged() -> None:
    found = models.implied(part(0.002), PLAIN)
    assert found is not None
    assert not found.known
    assert found.population.ratio.reason == Reason.TOO_FEW_DEATHS
    assert {int(one.reason) for one in found.figures.values()} == {Reason.TOO_FEW_DEATHS}


def test_the_whole_of_an_area_is_the_one_it_lies_in(session: Session) -> None:
    panels = {f"{area}.f.2014": part(share) for area, share in (("north", 0.3), ("south", 0.7))}
    edition(session, panels, parents={"north": "isle", "south": "isle"})
    beside = Beside(parents={"north": "isle", "south": "isle"})
    of = [PopulationYear(area, "f", "2014") for area in ("north", "isle")]
    held = load(session, "isle", 1, of, beside)
    north, isle = (models.implied(held[one].panel, PLAIN) for one in of)
    assert isle is None
    assert north is not None
    assert north.population.ratio.value == pytest.approx(1, rel=1e-6)
