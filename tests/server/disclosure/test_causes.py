"""Deaths by cause under a policy: of the whole alone, and no withheld one can be worked out, from
the tables of causes and of areas together, of two editions."""

from dataclasses import replace
from itertools import permutations, product

import numpy as np
import pytest

from server.disclosure.blocks import TOTAL
from server.disclosure.causes import ALL, NOT_STATED, past, table
from server.disclosure.masking import Content, Made, mask
from server.results.releasing import masked
from server.store.masks import Kept, Protected
from server.store.records import Area, Cause, Key, Terms
from tests.server.disclosure.counts import FLAT, LIST, Cells, by_cause, drawn, late
from tests.studies.cause_attack import Shown, attack

TERMS = Terms(threshold=5)
DIED_OF = ("heart", "lungs", "road", "fall")


def nation(seed: int, people: float = 9e3, **more: object) -> Cells:
    return by_cause(drawn(FLAT, seed=seed, people=people), seed=seed, **more)  # type: ignore[arg-type]


def made(cells: Cells, *earlier: Content, terms: Terms = TERMS) -> Made:
    return mask(FLAT, cells, terms, earlier, causes=LIST)


def content(cells: Cells, of: Made) -> Content:
    return Content(FLAT, cells, of.mask, of.unprotected, TERMS, LIST, of.by_cause)


def released(cells: Cells, of: Made) -> Cells:
    return masked(cells, Protected(TERMS, Kept(of.mask, of.unprotected, of.by_cause)))


def test_causes_are_shown_of_the_whole_alone() -> None:
    cells = nation(1)
    given = released(cells, made(cells))
    assert {key.area for key in cells if key.cause} == {area.code for area in FLAT}
    assert {key.area for key in given if key.cause} == {"n"}
    none = made(cells, terms=replace(TERMS, causes="none"))
    assert not none.by_cause
    assert not [key for key in released(cells, none) if key.cause]
    rounded = made(cells, terms=Terms(base=5))
    assert not [key for key in released(cells, rounded) if key.cause]


@pytest.mark.parametrize("seed", range(4))
def test_every_small_count_of_a_cause_or_group_is_withheld(seed: int) -> None:
    cells = nation(seed)
    of = made(cells)
    whole = table(LIST, "n", "2001", cells)
    assert whole is not None
    looked = 0
    for key, vector in whole.cells.items():
        if key.measure == "deaths" and key.area != ALL:
            gone = of.mask.get(Key("n", key.sex, "2001", "deaths", key.area))
            small = {
                age for age, n in zip(whole.grid.starts, vector.values, strict=True) if 0 < n < 5
            }
            assert small <= set(gone.ages if gone else ()), key
            looked += len(small)
    assert looked > 20


@pytest.mark.parametrize("people", [9e3, 600.0])
def test_where_all_deaths_of_an_age_are_withheld_every_cause_is(people: float) -> None:
    cells = nation(2, people)
    of = made(cells)
    keys = [Key("n", sex, "2001", "deaths") for sex in "fmp"]
    dark = {age for key in keys if key in of.mask for age in of.mask[key].ages}
    if people < 1e3:
        assert dark
    given = released(cells, of)
    for cause in (*DIED_OF, "rare"):
        for sex in "fmp":
            gone = of.mask.get(Key("n", sex, "2001", "deaths", cause))
            assert dark <= set(gone.ages if gone else ()), (cause, sex)
            if dark - {TOTAL}:  # of one that nobody died of too
                assert set(given[Key("n", sex, "2001", "deaths", cause)].withheld) >= dark - {TOTAL}


@pytest.mark.parametrize(("seed", "people"), [(0, 9e3), (1, 9e3), (2, 900.0), (3, 900.0)])
def test_no_withheld_count_can_be_worked_out(seed: int, people: float) -> None:
    first = nation(seed, people)
    second = late(first, FLAT, seed) if seed % 2 else late(first, FLAT, seed, only="a1")
    one = made(first)
    two = made(second, content(first, one))
    listed = LIST if two.by_cause else ()
    editions = [Shown(FLAT, LIST, first, one.mask), Shown(FLAT, listed, second, two.mask)]
    found = attack(editions[:1], every=19)
    assert found.withheld > 20
    assert not found.fixed
    both = attack(editions, every=23)
    left = sum(one.exposed for one in two.unprotected.values())
    assert len(both.fixed) <= left, both.fixed


def test_one_count_let_through_is_found() -> None:
    """With all but one shown, that one is fixed; with its sum over age withheld too, it is not
    by its cause, but by all others."""
    cells = nation(3)
    of = made(cells)
    key, gone = next(
        (key, one) for key, one in of.mask.items() if key.cause and key.sex == "f" and one.ages
    )
    alone = {key: replace(gone, ages=gone.ages[:1], values=gone.values[:1])}
    found = attack([Shown(FLAT, LIST, cells, alone)])
    assert found.withheld == 1
    assert len(found.fixed) == 1 or not found.small


def test_what_is_shown_adds_up_with_what_stands_in() -> None:
    cells = nation(4)
    of = made(cells)
    given = released(cells, of)
    withheld = 0
    for sex in "fmp":
        total = given[Key("n", sex, "2001", "deaths")].values
        causes = [given[Key("n", sex, "2001", "deaths", one)] for one in DIED_OF]
        for one in causes:
            assert (one.values >= 0).all()
            withheld += len(one.withheld)
        assert np.allclose(sum(one.values for one in causes), total, atol=1e-3)
    assert withheld


def test_what_stands_in_does_not_know_what_is_withheld() -> None:
    """Two truths that are shown alike have the same stand-ins."""
    cells = nation(4)
    of = made(cells)
    ages = list(cells[Key("n", "f", "2001", "deaths")].grid.starts)
    same = 0
    for sex, (one, other), (x, y) in product("fm", permutations(DIED_OF, 2), permutations(ages, 2)):
        changed = dict(cells)
        for code, age, step in ((one, x, 1), (one, y, -1), (other, x, -1), (other, y, 1)):
            for who in (sex, "p"):
                key = Key("n", who, "2001", "deaths", code)
                values = changed[key].values.copy()
                values[ages.index(age)] += step
                changed[key] = replace(changed[key], values=values)
        hidden = [of.mask.get(Key("n", sex, "2001", "deaths", code)) for code in (one, other)]
        if not all(gone and {x, y} <= set(gone.ages) for gone in hidden):
            continue
        if min(vector.values.min() for vector in changed.values()) < 0:
            continue
        again = made(changed)
        if {k: gone.ages for k, gone in again.mask.items()} == {
            k: gone.ages for k, gone in of.mask.items()
        }:
            same += 1
            assert again.mask == of.mask
        if same > 2:
            break
    assert same


def test_deaths_of_no_stated_cause_and_of_unlisted_ones() -> None:
    cells = nation(5)
    key = Key("n", "f", "2001", "deaths", "road")
    fewer = cells | {key: replace(cells[key], values=cells[key].values * 0)}
    rest = table(LIST, "n", "2001", fewer)
    assert rest is not None
    unstated = rest.cells[Key(NOT_STATED, "f", "2001", "deaths")]
    assert np.array_equal(unstated.values, cells[key].values)
    unknown = cells | {key._replace(cause="plague"): cells[key]}
    assert table(LIST, "n", "2001", unknown) is None
    assert not made(unknown).by_cause
    assert past(LIST, "n", "2001", drawn(FLAT, seed=1), {}) is None


def test_finer_ages_of_a_cause_are_given_on_those_that_all_share() -> None:
    cells = nation(5)
    coarse = type(cells[Key("n", "f", "2001", "deaths")].grid)((0, 20, 60))
    key = Key("n", "f", "2001", "deaths", "road")
    held = cells[key]
    mixed = cells | {key: replace(held, grid=coarse, values=held.grid.regroup(held.values, coarse))}
    given = released(mixed, made(mixed))
    assert {one.grid for k, one in given.items() if k.cause} == {coarse}


def test_a_year_that_stays_keeps_its_mask() -> None:
    cells = nation(6)
    one = made(cells)
    more = nation(7)
    next_ = cells | {key._replace(period="2002"): vector for key, vector in more.items()}
    two = made(next_, content(cells, one))
    assert {key: gone for key, gone in two.mask.items() if key.period == "2001"} == dict(one.mask)
    assert two.by_cause == {("n", "2001"), ("n", "2002")}
    again = made(late(cells, FLAT, 1), content(cells, one))
    assert again.by_cause
    for key, gone in one.mask.items():
        assert set(gone.ages) <= set(again.mask[key].ages)


def test_causes_that_would_tell_with_those_shown_before_are_not_shown() -> None:
    """One death more of one cause at one age, known from the sums of both editions by cause: so
    many more died in the one area that was revised."""
    first = nation(26, 900.0)
    one = made(first)
    second = late(first, FLAT, 26, only="a1")
    two = made(second, content(first, one))
    assert one.by_cause
    assert not two.by_cause
    assert not [key for key in released(second, two) if key.cause]


def test_another_policy_tells_no_cause_that_the_one_before_withheld() -> None:
    for seed in range(1):
        cells = nation(seed, 3e3)
        old = content(cells, made(cells))
        now = mask(FLAT, cells, Terms(threshold=8), (), [old], causes=LIST)
        before = attack([Shown(FLAT, LIST, cells, old.mask)], every=19)
        listed = LIST if now.by_cause else ()
        both = [
            Shown(FLAT, LIST, cells, old.mask),
            Shown(FLAT, listed, cells, now.mask),
        ]
        left = sum(one.exposed for one in now.unprotected.values())
        assert len(set(attack(both, every=19).fixed) - set(before.fixed)) <= left


def test_a_list_with_a_single_cause_is_the_whole() -> None:
    only = (Cause("every", "Every cause"),)
    cells = drawn(FLAT, seed=1)
    cells |= {k._replace(cause="every"): v for k, v in cells.items() if k.measure == "deaths"}
    of = mask(FLAT, cells, TERMS, causes=only)
    whole = table(only, "n", "2001", cells)
    assert whole is not None
    assert whole.causes == (Area(ALL, ""), Area("every", "", ALL))
    assert of.by_cause
