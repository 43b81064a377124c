"""Single ages of small areas: shown by five years, and told by no difference of others."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from server.disclosure.coarsening import coarsened
from server.disclosure.masking import mask
from server.disclosure.showing import shown
from server.store.records import Area, Key, Terms, Vector
from tests.server.disclosure.counts import Cells, add

SINGLE = AgeGrid(tuple(range(91)))
# the nation of two regions; the north of a city, a town and a village, the south of two shires
AREAS = (
    Area("n", ""),
    Area("north", "", "n"),
    Area("south", "", "n"),
    *(Area(code, "", "north") for code in ("city", "town", "village")),
    *(Area(code, "", "south") for code in ("shire", "dale")),
)
PARENTS = {area.code: area.parent for area in AREAS}
PEOPLE = {"city": 2e6, "town": 1e6, "village": 2e4, "shire": 9e5, "dale": 8e5}
FEW = Terms(threshold=5, coarse_below=100_000)


def counted(**people: float) -> Cells:
    rng, cells = np.random.default_rng(3), dict[Key, Vector]()
    for code, size in (PEOPLE | people).items():
        for sex in "fm":
            lived = np.full(len(SINGLE), np.round(size / 2 / len(SINGLE)))
            deaths = rng.poisson(lived * np.exp(0.09 * np.arange(len(SINGLE)) - 9)).astype(float)
            for measure, values in (("deaths", deaths), ("person_years", lived)):
                add(cells, PARENTS, Key(code, sex, "2001", measure), values)
    return {key: Vector("final", SINGLE, cell.values) for key, cell in cells.items()}


def coarse(cells: Cells) -> set[str]:
    found = coarsened(AREAS, cells, FEW)
    return {key.area for key, cell in found.items() if cell.grid != SINGLE}


@pytest.mark.parametrize(
    ("small", "by_five_years"),
    [
        ({}, {"city", "town", "village"}),
        ({"village": 5e5}, set()),
        ({"village": 5e5, "dale": 2e4}, {"shire", "dale"}),
        (
            {"shire": 2e4, "dale": 2e4},
            {"city", "town", "village", "north", "south", "shire", "dale"},
        ),
    ],
)
def test_all_parts_of_a_whole_are_given_by_five_years(
    small: dict[str, float], by_five_years: set[str]
) -> None:
    """A whole less its other parts is the small one; a part is the sum of its own parts."""
    assert coarse(counted(**small)) == by_five_years


def test_no_single_age_of_a_small_area_is_the_difference_of_others() -> None:
    cells = counted()
    made = mask(AREAS, cells, FEW).mask
    seen = {key: shown(cell, made[key]) if key in made else cell for key, cell in cells.items()}
    for sex in "fmp":
        whole, *others = (
            seen[Key(code, sex, "2001", "deaths")] for code in ("north", "city", "town")
        )
        assert whole.grid == SINGLE
        assert all(37 not in one.grid.starts for one in others)
        assert 37 not in seen[Key("village", sex, "2001", "deaths")].grid.starts


def test_nothing_is_coarser_without_the_rule() -> None:
    cells = counted()
    assert coarsened(AREAS, cells, Terms(threshold=5)) is cells
