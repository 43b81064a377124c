"""How far counts would have to be wrong: counted so, the limit of the difference is at 0."""

from dataclasses import replace

import numpy as np
import pytest

from engine import indicators
from engine.settings import find
from server.results.overturning import overturned
from tests.factories import comparison_of, gompertz_panel

PLAIN = find("almanac-1")
FAR = gompertz_panel(people=8e5, seed=3, level=2.6e-5)
NEAR = gompertz_panel(people=8e5, seed=1, level=2.03e-5)
THAT = gompertz_panel(people=8e5, seed=2)


@pytest.fixture(autouse=True)
def few_figures(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("server.results.compared.COMPARED", ("e0", "H", "threshold_H"))


@pytest.mark.parametrize("this", [FAR, NEAR], ids=["clear", "not clear"])
@pytest.mark.parametrize("of", ["e0", "asr_esp2013"])
@pytest.mark.parametrize("turned", [False, True])
def test_with_so_many_more_deaths_a_limit_is_at_nought(this, of: str, turned: bool) -> None:  # type: ignore[no-untyped-def]
    sides = (THAT, this) if turned else (this, THAT)
    found = comparison_of(*sides, of=of)
    needed = overturned(found)
    assert needed is not None
    panels = [
        replace(side.panel, deaths=side.panel.deaths * (1 + needed.deaths / 100))
        if side is needed.side
        else side.panel
        for side in (found.this, found.that)
    ]
    moved = indicators.difference(indicators.find(of), *panels, PLAIN)
    nearest = min(abs(float(moved.low)), abs(float(moved.high)))
    width = float(moved.high - moved.low)
    assert nearest < 0.04 * width


def test_so_many_fewer_people_do_the_same() -> None:
    found = comparison_of(FAR, THAT)
    needed = overturned(found)
    assert needed is not None
    more = replace(FAR, deaths=FAR.deaths * (1 + needed.deaths / 100))
    fewer = replace(FAR, exposure=FAR.exposure / (1 + needed.deaths / 100))
    values = [indicators.values([indicators.find("e0")], one, PLAIN)["e0"] for one in (more, fewer)]
    np.testing.assert_allclose(values[0], values[1], rtol=1e-12)


def test_the_side_that_is_provisional_is_the_one_that_may_move() -> None:
    found = comparison_of(FAR, THAT, provisional=True)
    needed = overturned(found)
    assert needed is not None
    assert needed.side is found.this
    assert needed.deaths < 0  # it has too many deaths to be as long-lived as the other


def test_nothing_can_overturn_a_revision_or_a_comparison_with_itself() -> None:
    assert overturned(comparison_of(FAR, THAT, that_edition=2)) is None
    assert overturned(comparison_of(FAR, FAR, sides=("north.f.2014", "north.f.2014"))) is None


def test_a_printed_table_is_never_wrong() -> None:
    found = comparison_of(FAR, THAT, standard="gbd2010")
    needed = overturned(found)
    assert needed is None or needed.side is found.this
