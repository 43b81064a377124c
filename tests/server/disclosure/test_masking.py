"""The mask of an edition: complete, kept from edition to edition, blind to what it withholds."""

from collections.abc import Iterator
from dataclasses import replace
from itertools import permutations

import numpy as np
import pytest
from scipy.sparse import csr_array, vstack

from server.disclosure.blocks import SEXES, Block, block
from server.disclosure.equations import equations
from server.disclosure.masking import Content, Made, mask
from server.disclosure.showing import shown
from server.store.records import Area, Key, Mask, Terms, Vector
from tests.server.disclosure.counts import FLAT, GRID, TREE, add, drawn
from tests.server.disclosure.elimination import determined

TERMS = Terms(threshold=5)
Cells = dict[Key, Vector]


def hidden(of: Block, made: Mask, measure: str = "deaths", year: str = "2001") -> np.ndarray:  # type: ignore[type-arg]
    found = np.zeros_like(of.held)
    for slot, place in enumerate(of.area.tolist()):
        for sex, code in enumerate(SEXES):
            one = made.get(Key(of.areas[place].code, code, year, measure))
            found[slot, sex] = one is not None and int(of.start[slot]) in one.ages
    return found


def revised(cells: Cells, areas: tuple[Area, ...], seed: int, only: str = "") -> Cells:
    """Deaths reported late: a few more, into every sum; `only` in one area."""
    rng = np.random.default_rng(seed)
    parents = {area.code: area.parent for area in areas}
    leaves = [code for code in parents if code not in set(parents.values())]
    out = dict(cells)
    for code in leaves if not only else [only]:
        for sex in "fm":
            late = rng.poisson(0.4, len(GRID)).astype(float)
            add(out, parents, Key(code, sex, "2001", "deaths"), late)
    return out


def told(editions: list[tuple[tuple[Area, ...], Cells, Mask]]) -> set[tuple[object, ...]]:
    """Withheld counts fixed by all editions together, a count that two share taken as one unknown:
    exactly, by elimination."""
    unknowns: dict[tuple[object, ...], int] = {}
    known: set[int] = set()
    parts = []
    for areas, cells, made in editions:
        of = block(areas, "2001", "deaths", cells)
        gone = hidden(of, made)
        places = []
        for slot, place in enumerate(of.area.tolist()):
            for sex in range(3):
                name = (of.areas[place].code, int(of.start[slot]), sex, of.values[slot, sex])
                places.append(unknowns.setdefault(name, len(unknowns)))
                if not gone[slot, sex]:
                    known.add(places[-1])
        parts.append((equations(of).matrix, places))
    joint = vstack(
        [
            csr_array(
                (one.data, np.array(at)[one.indices], one.indptr), (one.shape[0], len(unknowns))
            )
            for one, at in parts
        ]
    )
    open_ = np.array([at not in known for at in range(len(unknowns))])
    fixed = determined(csr_array(joint), open_)
    return {name for name, at in unknowns.items() if fixed[at]}


@pytest.mark.parametrize("areas", [FLAT, TREE], ids=["flat", "tree"])
def test_every_small_count_is_withheld(areas: tuple[Area, ...]) -> None:
    cells = drawn(areas, seed=4)
    made = mask(areas, cells, TERMS).mask
    for key, vector in cells.items():
        if key.measure != "deaths":
            assert key not in made
            continue
        small = {age for age, n in zip(GRID.starts, vector.values, strict=True) if 0 < n < 5}
        assert small <= set(made[key].ages if key in made else ())


@pytest.mark.parametrize("seed", range(8))
@pytest.mark.parametrize("areas", [FLAT, TREE], ids=["flat", "tree"])
def test_two_editions_together_tell_nothing(areas: tuple[Area, ...], seed: int) -> None:
    first = drawn(areas, seed=seed)
    only = "" if seed % 2 else areas[-1].code
    second = revised(first, areas, seed, only)
    one = mask(areas, first, TERMS)
    two = mask(areas, second, TERMS, [Content(areas, first, one.mask)])
    assert not told([(areas, first, one.mask)])
    left = sum(one.exposed for one in two.unprotected.values())
    assert not told([(areas, first, one.mask), (areas, second, two.mask)]) or left
    _stays_withheld(one, two)


def _stays_withheld(one: Made, two: Made) -> None:
    for key, gone in one.mask.items():
        assert set(gone.ages) <= set(two.mask[key].ages), key


def test_a_mask_made_of_the_second_edition_alone_would_tell() -> None:
    """So the test above can fail."""
    leaks = 0
    for seed in range(1, 12, 2):
        first = drawn(FLAT, seed=seed)
        second = revised(first, FLAT, seed)
        one, alone = (mask(FLAT, cells, TERMS).mask for cells in (first, second))
        leaks += bool(told([(FLAT, first, one), (FLAT, second, alone)]))
    assert leaks


def test_a_year_that_did_not_change_is_shown_as_before() -> None:
    first = drawn(FLAT, seed=1, years=("2001", "2002"))
    new = drawn(FLAT, seed=2, years=("2003",))
    one = mask(FLAT, first, TERMS).mask
    two = mask(FLAT, first | new, TERMS, [Content(FLAT, first, one)]).mask
    assert {key: gone for key, gone in two.items() if key.period != "2003"} == one


@pytest.mark.parametrize("seed", range(3))
def test_stand_ins_add_up_to_every_sum_that_is_shown(seed: int) -> None:
    cells = drawn(TREE, seed=seed)
    made = mask(TREE, cells, TERMS).mask
    seen = {key: shown(one, made[key]) if key in made else one for key, one in cells.items()}
    of, gone = (
        block(TREE, "2001", "deaths", seen),
        hidden(block(TREE, "2001", "deaths", cells), made),
    )
    rules = equations(of)
    sums = np.asarray(rules.matrix @ np.nan_to_num(of.values.ravel()))
    truth = equations(block(TREE, "2001", "deaths", cells))
    shows_all = np.array(
        [not gone.ravel()[truth.matrix.indices[a:b]].all() for a, b in _rows(truth.matrix)]
    )
    assert shows_all.any()
    assert np.abs(sums).max() < 1e-4


def _rows(matrix: csr_array) -> list[tuple[int, int]]:
    return list(zip(matrix.indptr[:-1].tolist(), matrix.indptr[1:].tolist(), strict=True))


@pytest.mark.parametrize("seed", [0, 1, 2, 3, 7, 9])  # each has such a truth
def test_stand_ins_do_not_depend_on_what_is_withheld(seed: int) -> None:
    """Another truth of which the same is withheld, and which leaves all that is shown as it is: the
    same stand-ins, to the last digit."""
    cells = drawn(FLAT, seed=seed, people=2.5e4)
    made = mask(FLAT, cells, TERMS).mask
    others = (mask(FLAT, other, TERMS).mask for other in _other_truths(cells, made))
    assert made == next(one for one in others if _places(one) == _places(made))


def _places(made: Mask) -> dict[Key, tuple[int, ...]]:
    return {key: gone.ages for key, gone in made.items()}


def _other_truths(cells: Cells, made: Mask) -> Iterator[Cells]:
    """One death more and one fewer round a square of withheld counts that stay small or large."""
    leaves = [area.code for area in FLAT[1:]]
    for one, two in permutations(leaves, 2):
        for x, y in permutations(GRID.starts, 2):
            steps = ((one, x, 1), (one, y, -1), (two, x, -1), (two, y, 1))
            if (moved := _moved(cells, made, steps)) is not None:
                yield moved


def _moved(cells: Cells, made: Mask, steps: tuple[tuple[str, int, int], ...]) -> Cells | None:
    out = dict(cells)
    for area, age, step in steps:
        for sex, way in (("f", step), ("m", -step)):
            key = Key(area, sex, "2001", "deaths")
            at = GRID.position(age)
            before = out[key].values[at]
            if key not in made or age not in made[key].ages:
                return None
            if (0 < before < 5) != (0 < before + way < 5) or before + way < 1:
                return None
            values = out[key].values.copy()
            values[at] += way
            out[key] = replace(out[key], values=values)
    return out


def test_deaths_before_28_days_are_withheld_where_few_died_later() -> None:
    cells = drawn(FLAT, seed=0, people=4e5)
    for key, vector in list(cells.items()):
        if key.measure == "deaths":
            births = key._replace(measure="neonatal_deaths")
            few = np.array([max(vector.values[0] - 2, 0.0)])
            cells[births] = Vector("final", type(GRID)((0,)), few)
    made = mask(FLAT, cells, TERMS).mask
    assert all(
        0 in made[key].ages
        for key in cells
        if key.measure == "neonatal_deaths" and key.area != "n" and key.sex != "p"
    )


def test_small_areas_are_given_on_coarser_ages() -> None:
    cells = drawn(FLAT, seed=0)
    single = type(GRID)(tuple(range(91)))
    for key in list(cells):
        values = np.full(len(single), 50.0) if key.measure == "deaths" else np.full(91, 1e3)
        cells[key] = Vector("final", single, values)
    made = mask(FLAT, cells, replace(TERMS, coarse_below=1_000_000)).mask
    assert made[Key("a0", "f", "2001", "deaths")].starts[:4] == (0, 1, 5, 10)
    seen = shown(cells[Key("a0", "f", "2001", "deaths")], made[Key("a0", "f", "2001", "deaths")])
    assert seen.values[2] == 250


@pytest.mark.parametrize(("then", "now"), [(3, 5), (5, 4), (10, 5)])
@pytest.mark.parametrize(("areas", "seed"), [(FLAT, 2), (FLAT, 3), (TREE, 0), (TREE, 4)])
def test_another_policy_tells_nothing_that_the_one_before_withheld(
    areas: tuple[Area, ...], seed: int, then: int, now: int
) -> None:
    """Whoever kept what the first one showed knows what stood beside each withheld count."""
    cells = drawn(areas, seed=seed)
    later = revised(cells, areas, seed)
    old = Content(areas, cells, mask(areas, cells, Terms(threshold=then)).mask)
    new = Content(areas, cells, mask(areas, cells, Terms(threshold=now), (), [old]).mask)
    next_ = mask(areas, later, Terms(threshold=now), [new], [old]).mask
    shown = [(areas, cells, one.mask) for one in (old, new)]
    known = told(shown[:1])
    assert told(shown) <= known
    assert told([*shown, (areas, later, next_)]) <= known


def test_a_looser_policy_shows_more() -> None:
    cells = drawn(TREE, seed=1)
    old = Content(TREE, cells, mask(TREE, cells, Terms(threshold=20)).mask)
    new = mask(TREE, cells, Terms(threshold=3), (), [old]).mask
    few, many = (sum(len(one.ages) for one in made.values()) for made in (new, old.mask))
    assert few < many
