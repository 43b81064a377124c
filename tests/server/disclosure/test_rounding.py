"""Rounded counts: unbiased, the same wherever the same is counted, adding up, and parted once."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.disclosure.masking import Content, mask, way_of
from server.disclosure.rounding import BASES, Rounding, rounded
from server.disclosure.showing import shown
from server.store.records import Area, Key, Mask, Terms, Vector
from tests.server.disclosure.counts import FLAT, GRID, NATION, TREE, add, drawn

HOW = Rounding(3, "secret")
TERMS = Terms(base=3)
Cells = dict[Key, Vector]
NAMES = [f"cell {at}" for at in range(4000)]


def released(cells: Cells, made: Mask) -> Cells:
    return {key: shown(cell, made[key]) if key in made else cell for key, cell in cells.items()}


def revised(cells: Cells, areas: tuple[Area, ...], seed: int) -> Cells:
    rng = np.random.default_rng(seed)
    parents = {area.code: area.parent for area in areas}
    out = dict(cells)
    for code in parents.keys() - set(parents.values()):
        for sex in "fm":
            late = rng.poisson(0.4, len(GRID)).astype(float)
            add(out, parents, Key(code, sex, "2001", "deaths"), late)
    return out


@given(count=st.integers(0, 500), base=st.sampled_from(BASES), name=st.text(max_size=9))
def test_a_count_is_given_as_a_multiple_next_to_it(count: int, base: int, name: str) -> None:
    (given,) = Rounding(base, "s").shown(np.array([float(count)]), [name])
    assert given % base == 0
    assert abs(given - count) < base
    assert given == count or count % base


@pytest.mark.parametrize("base", BASES)
def test_nothing_is_added_on_average(base: int) -> None:
    """The mean over many cells, in standard errors: the variance is r (b - r), r the remainder."""
    for count in range(2 * base):
        given = Rounding(base, "s").shown(np.full(len(NAMES), float(count)), NAMES)
        rest = count % base
        error = np.sqrt(rest * (base - rest) / len(NAMES))
        assert abs(given.mean() - count) <= 4 * error


class At(Rounding):
    """Rounds with a shift that is given."""

    def _shift(self, name: str) -> float:
        return float(name)


@given(
    start=st.integers(0, 40),
    steps=st.lists(st.integers(-3, 3), max_size=6),
    shift=st.floats(0, 4.99),
)
def test_whoever_knows_every_move_of_a_count_is_left_with_as_many_as_the_base(
    start: int, steps: list[int], shift: float
) -> None:
    """Each count of a run of `base` neighbours, under a shift of its own, is shown alike."""
    counts = 9.0 + np.maximum(start + np.cumsum([0, *steps]), 0.0)

    def seen(move: int) -> list[float]:
        name = str(shift - move)
        return At(5, "s").shown(counts + move, [name] * len(counts)).tolist()

    moves = range(-4, 5)
    alike = [move for move in moves if 0 <= shift - move < 5 and seen(move) == seen(0)]
    assert len(alike) == 5


def test_another_secret_or_another_cell_is_another_draw() -> None:
    ones = np.ones(len(NAMES))
    one, other = (Rounding(3, secret).shown(ones, NAMES) for secret in ("a", "b"))
    assert 0.3 < (one != other).mean() < 0.6  # 4 in 9
    assert 0.25 < (one > 0).mean() < 0.42  # 1 in 3


@pytest.mark.parametrize("areas", [FLAT, TREE], ids=["flat", "tree"])
def test_everything_adds_up_and_parts_are_multiples(areas: tuple[Area, ...]) -> None:
    cells = drawn(areas, seed=3)
    given = released(cells, mask(areas, cells, TERMS, secret="s").mask)
    parents = {area.code: area.parent for area in areas}
    for key, vector in given.items():
        if key.measure != "deaths":
            assert np.array_equal(vector.values, cells[key].values)
            continue
        assert vector.rounded == 3
        assert not (vector.values % 3).any()
        if key.sex == "p":
            both = [given[key._replace(sex=sex)].values for sex in "fm"]
            assert np.array_equal(vector.values, both[0] + both[1])
        parts = [one for one, whole in parents.items() if whole == key.area]
        if parts:
            together = sum(given[key._replace(area=one)].values for one in parts)
            assert np.array_equal(vector.values, together)
        else:
            widest = 3 if key.sex != "p" else 6
            assert (np.abs(vector.values - cells[key].values) < widest).all()


def test_a_count_that_stays_is_given_as_before() -> None:
    first = drawn(FLAT, seed=1, years=("2001", "2002"))
    second = revised(first, FLAT, 1)
    one = mask(FLAT, first, TERMS, secret="s").mask
    two = mask(FLAT, second, TERMS, [Content(FLAT, first, one)], secret="s").mask
    before, after = released(first, one), released(second, two)
    moved = 0
    for key, vector in first.items():
        same = vector.values == second[key].values
        if key.sex != "p" and key.area.startswith("a"):
            assert np.array_equal(before[key].values[same], after[key].values[same])
            assert (after[key].values >= before[key].values).all()  # only deaths were added
            moved += int((before[key].values != after[key].values).sum())
    assert moved


def test_what_a_whole_has_beyond_its_parts_is_rounded_by_itself() -> None:
    cells = drawn(NATION, seed=5)
    for sex, more in (("f", 1.0), ("m", 0.0), ("p", 2.0)):  # one of them of unknown sex
        key = Key("n", sex, "2001", "deaths")
        cells[key] = replace(cells[key], values=cells[key].values + more)
    given = rounded(NATION, "2001", "deaths", cells, HOW).cells
    values = {key[:2]: one.values for key, one in given.items()}
    assert np.array_equal(values["n", "m"], values["r", "m"] + values["s", "m"])
    beyond = values["n", "f"] - values["r", "f"] - values["s", "f"]
    unknown = values["n", "p"] - values["n", "f"] - values["n", "m"]
    for extra in (beyond, unknown):
        assert set(extra) <= {0.0, 3.0}
    assert beyond.any() or unknown.any()


def test_a_whole_is_given_on_the_ages_of_its_parts() -> None:
    cells = drawn(NATION, seed=5)
    coarse = type(GRID)((0, 20, 60))
    for key in list(cells):
        if key.area == "r" and key.measure == "deaths":
            values = GRID.regroup(cells[key].values, coarse)
            cells[key] = replace(cells[key], grid=coarse, values=values)
    made = mask(NATION, cells, TERMS, secret="s").mask
    given = released(cells, made)
    assert given["n", "f", "2001", "deaths", ""].grid == coarse
    assert given["s", "f", "2001", "deaths", ""].grid == GRID


def test_areas_that_hold_other_sexes_are_given_as_persons() -> None:
    cells = drawn(NATION, seed=5)
    for sex in "fm":
        del cells[Key("r", sex, "2001", "deaths")]
    made = mask(NATION, cells, TERMS, secret="s").mask
    given = released(cells, made)
    persons = [given[Key(one, "p", "2001", "deaths")] for one in ("n", "r", "s")]
    assert np.array_equal(persons[0].values, persons[1].values + persons[2].values)
    women = given[Key("n", "f", "2001", "deaths")]
    assert women.withheld == GRID.starts
    assert not women.rounded
    assert 0.4 < women.values.sum() / persons[0].values.sum() < 0.6  # by people alone


@pytest.mark.parametrize("change", ["merged", "finer", "added", "coarser"])
def test_people_rounded_once_are_not_rounded_in_another_way(change: str) -> None:
    """Two counts of one, each rounded up, whose sum is rounded down, would both be told."""
    first = drawn(FLAT, seed=2)
    areas, second = FLAT, {}
    for key, vector in first.items():
        code = "a0" if change == "merged" and key.area == "a1" else key.area
        held = second.get(key._replace(area=code))
        values = vector.values + (held.values if held else 0)
        second[key._replace(area=code)] = replace(vector, values=values)
    if change == "merged":
        areas = tuple(area for area in FLAT if area.code != "a1")
    if change == "added":  # a part of what was a whole without parts
        areas = (*FLAT, Area("b", "", "a0"))
        for key in list(second):
            if key.area == "a0":
                second[key._replace(area="b")] = second[key]
    if change in ("finer", "coarser"):
        grid = type(GRID)((0, 1, 5, 40, 60, 80))
        coarser = {
            key: replace(one, grid=grid, values=GRID.regroup(one.values, grid))
            for key, one in first.items()
        }
        first, second = (coarser, first) if change == "finer" else (first, coarser)
    one = mask(FLAT, first, TERMS, secret="s").mask
    two = mask(areas, second, TERMS, [Content(FLAT, first, one)], secret="s").mask
    for key, hidden in two.items():
        assert not hidden.rounded, key
        assert set(hidden.ages) >= set(second[key].grid.starts)
    alone = mask(areas, second, TERMS, secret="s").mask
    assert all(hidden.rounded for hidden in alone.values())
    if change == "merged":  # what was given before stands in
        same = Key("a2", "f", "2001", "deaths")
        assert two[same].values[:-1] == one[same].values


def test_new_areas_beside_the_old_ones_are_rounded() -> None:
    first = drawn((Area("n", "N"), Area("a0", "", "n")), seed=2)
    more = {key._replace(area="x"): one for key, one in first.items() if key.area == "n"}
    one = mask(FLAT[:2], first, TERMS, secret="s").mask
    beside = (*FLAT[:2], Area("x", "X"))
    two = mask(beside, first | more, TERMS, [Content(FLAT[:2], first, one)], secret="s").mask
    assert all(hidden.rounded for hidden in two.values())


@pytest.mark.parametrize("secret", "abc")
def test_deaths_of_the_first_28_days_are_no_more_than_those_of_infants(secret: str) -> None:
    cells = drawn(FLAT, seed=0)
    for key in list(cells):
        if key.measure == "deaths":
            few = cells[key].values[:1]  # all of them: these are rounded alike
            cells[key._replace(measure="neonatal_deaths")] = Vector("final", type(GRID)((0,)), few)
    given = released(cells, mask(FLAT, cells, TERMS, secret=secret).mask)
    early = [key for key in given if key.measure == "neonatal_deaths"]
    assert early
    for key in early:
        assert given[key].values[0] == given[key._replace(measure="deaths")].values[0]
        assert given[key].rounded == 3


def test_counts_behind_chance_are_the_rounded_ones() -> None:
    cells = drawn(FLAT, seed=0)
    cells |= {
        key._replace(measure="counted_deaths"): replace(one, values=0.97 * one.values)
        for key, one in cells.items()
        if key.measure == "deaths"
    }
    given = released(cells, mask(FLAT, cells, TERMS, secret="s").mask)
    for key, one in given.items():
        if key.measure == "deaths":
            beside = given[key._replace(measure="counted_deaths")]
            assert np.array_equal(one.values, beside.values)


def test_coarser_ages_are_sums_of_rounded_ones() -> None:
    single = type(GRID)(tuple(range(91)))
    cells = {
        key: replace(one, grid=single, values=np.full(91, 7.0 if key.measure == "deaths" else 1e3))
        for key, one in drawn(FLAT, seed=0).items()
        if key.area != "n" and key.sex != "p"
    }
    fine = released(cells, mask(FLAT, cells, TERMS, secret="s").mask)
    few = replace(TERMS, coarse_below=10**6)
    coarse = released(cells, mask(FLAT, cells, few, secret="s").mask)
    for key, one in coarse.items():
        assert one.grid.starts[:4] == (0, 1, 5, 10)
        assert np.array_equal(one.values, fine[key].grid.regroup(fine[key].values, one.grid))


@pytest.mark.parametrize(
    ("then", "now", "held"),
    [
        (Terms(3), Terms(base=5), Terms(3)),
        (Terms(base=3), Terms(7), Terms(7, base=3)),
        (Terms(base=3), Terms(base=10), Terms(base=3)),
        (Terms(3), Terms(9), Terms(9)),
    ],
)
def test_a_year_keeps_the_way_it_was_first_shown_in(then: Terms, now: Terms, held: Terms) -> None:
    """Counts withheld and rounded tell one another: of 1 and 1, withheld beside their sum, one
    rounded up and one down are told."""
    cells = drawn(FLAT, seed=1)
    old = Content(FLAT, cells, {}, terms=then)
    assert way_of("2001", now, [old]) == held
    assert way_of("2002", now, [old]) == now
    made = mask(FLAT, cells, now, (), [old], secret="s").mask
    assert {one.rounded for one in made.values()} == {held.base}
    between = Content(FLAT, cells, {}, terms=replace(now, base=then.base, threshold=4))
    back = way_of("2001", now, [old, between])
    assert back.base == held.base
    if now.base and not then.base:  # as the last policy that withheld it would have it
        assert back.threshold == 4
