"""Nothing withheld can be worked out: checked by exact elimination and by whole-number programmes,
neither of which knows of the networks the mask is made with."""

import numpy as np
import pytest
from scipy.optimize import Bounds, LinearConstraint, milp

from server.disclosure.blocks import TOTAL, Block, block
from server.disclosure.closing import Closed, close
from server.disclosure.equations import equations
from tests.server.disclosure.counts import FLAT, TREE, drawn
from tests.server.disclosure.elimination import determined

THRESHOLD = 5


def closed(of: Block) -> tuple[Closed, np.ndarray]:  # type: ignore[type-arg]
    primary = of.held & (of.least < THRESHOLD)
    nothing = np.zeros_like(primary)
    return close(of, primary, nothing, ~nothing, THRESHOLD), primary


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("areas", [FLAT, TREE], ids=["flat", "tree"])
def test_no_withheld_count_is_fixed_by_the_equations(areas: object, seed: int) -> None:
    of = block(areas, "2001", "deaths", drawn(areas, seed=seed))  # type: ignore[arg-type]
    done, primary = closed(of)
    rules = equations(of)
    assert primary.any()
    assert not done.exposed
    assert (done.hidden & primary).sum() == primary.sum()
    assert not determined(rules.matrix, done.hidden.ravel()).any()
    # and the check can fail: the small counts alone would not do
    assert determined(rules.matrix, primary.ravel()).any()


@pytest.mark.parametrize("seed", range(3))
def test_a_small_count_may_be_any_other_small_count(seed: int) -> None:
    """The least and the most each can be, given all that is shown, as whole numbers."""
    of = block(FLAT, "2001", "deaths", drawn(FLAT, seed=seed))
    done, primary = closed(of)
    rules, hidden = equations(of), done.hidden.ravel()
    shown = np.where(hidden, 0.0, np.nan_to_num(of.values.ravel()))
    matrix, sums = rules.matrix[:, np.flatnonzero(hidden)], rules.right - rules.matrix @ shown
    narrow = set(done.narrow)
    looked = 0
    for at, place in enumerate(np.flatnonzero(hidden).tolist()):
        if not primary.ravel()[place] or place // 3 in narrow:
            continue
        ends = []
        for sign in (1, -1):
            goal = np.zeros(hidden.sum())
            goal[at] = sign
            found = milp(
                goal,
                integrality=np.ones(len(goal)),
                bounds=Bounds(0, np.inf),
                constraints=LinearConstraint(matrix, sums, sums),
            )
            ends.append(round(sign * found.fun) if found.status == 0 else np.inf)
        looked += 1
        assert ends[0] <= 1, place
        assert ends[1] >= THRESHOLD - 1, place
    assert looked > 10


def test_sums_and_areas_with_parts_are_spared_where_other_counts_can_protect() -> None:
    of = block(FLAT, "2001", "deaths", drawn(FLAT, seed=1, people=3e6, small="a0"))
    done, primary = closed(of)
    spared = ((of.start == TOTAL) | of.inner)[:, None]
    assert primary.any()
    assert not (primary & spared).any()
    assert not (done.hidden & spared).any()


def test_what_an_earlier_edition_shows_protects_nothing() -> None:
    of = block(FLAT, "2001", "deaths", drawn(FLAT, seed=2, people=4e4))
    primary = of.held & (of.least < THRESHOLD)
    nothing = np.zeros_like(primary)
    free = close(of, primary, nothing, ~nothing, THRESHOLD)
    used = free.hidden & ~primary.any(axis=1)[:, None]
    known = np.zeros_like(used)
    known.ravel()[np.flatnonzero(used)[0]] = True
    done = close(of, primary, nothing, ~known, THRESHOLD)
    assert not (done.hidden & known).any()
    assert not determined(equations(of).matrix, (done.hidden & ~known).ravel()).any()


def test_a_count_alone_in_the_world_is_exposed_only_where_it_is_its_own_sum() -> None:
    """Of one area with two ages and their sum, all small: each protects the others."""
    cells = {key: one for key, one in drawn(FLAT, seed=3).items() if key.area == "a0"}
    of = block((FLAT[1],), "2001", "deaths", cells)
    done, _primary = closed(of)
    assert not determined(equations(of).matrix, done.hidden.ravel()).any()
