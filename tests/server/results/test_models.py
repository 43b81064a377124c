"""The people at the highest ages that the deaths of a population imply."""

from dataclasses import replace

import numpy as np
import pytest

from engine.chain import run
from engine.estimates import Reason
from engine.indicators import find
from engine.panel import Panel
from engine.settings import find as named
from server.results import models
from server.results.loading import Beside, load
from server.results.questions import PopulationYear
from server.store.connect import Session
from tests.factories import GRIDS, edition, gompertz_panel

FIVE = GRIDS["abridged"]
PLAIN = named("almanac-1")


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
