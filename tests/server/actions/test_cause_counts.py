"""Deaths by cause through the actions: sums, what gives way, new codes, and the list."""

from collections.abc import Iterable, Mapping
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.ages import AgeGrid
from server.actions.cause_lists import laid_over as list_laid_over
from server.actions.laid_over import Base, Made, made_of
from server.actions.recoding import recoded
from server.actions.totals import merged, totalled
from server.intake.parsing import Parsed
from server.intake.successions import FIRST, LAST, Share, Succession, Successions
from server.store.errors import Refused
from server.store.records import ALL_OF_IT, Area, Cause, Key, Selection, Taking, Vector

FLAT = merged((Area("w", "Whole"), Area("a", "", "w"), Area("b", "", "w")), ())
GRID = AgeGrid((0, 1, 5, 10))
LIST = (
    Cause("body", "Of the body"),
    Cause("heart", "Heart", "body"),
    Cause("lungs", "Lungs", "body"),
    Cause("falls", "Falls", kind="external"),
)
Counts = Mapping[str, Iterable[float]]


def by_cause(where: str, causes: Counts, *, lacking: float = 0.0) -> dict[Key, Vector]:
    """All deaths of "area.sex.year" and those of each cause, which lack some of all."""
    area, sex, period = where.split(".")
    cells = {
        Key(area, sex, period, "deaths", code): Vector("final", GRID, np.array(list(ages), float))
        for code, ages in causes.items()
    }
    total = sum((cell.values for cell in cells.values()), start=np.full(4, lacking))
    return {Key(area, sex, period, "deaths"): Vector("final", GRID, total), **cells}


def of(cells: Mapping[Key, Vector], where: str) -> dict[str, list[float]]:
    """Deaths by cause of a place, those of all under ""."""
    place = tuple(where.split("."))
    return {
        key.cause: cell.values.tolist()
        for key, cell in sorted(cells.items())
        if key[:3] == place and key.measure == "deaths"
    }


ONE = by_cause("a.f.2001", {"heart": (1, 2, 3, 4)})
TWO = by_cause("a.m.2001", {"falls": [5] * 4})


def test_a_cause_that_a_sex_or_part_lacks_has_no_deaths_there() -> None:
    other = by_cause("b.f.2001", {"lungs": (1, 0, 0, 7)})
    made = totalled(ONE | TWO | other, FLAT, base={}).cells
    assert of(made, "a.p.2001") == {"": [6, 7, 8, 9], "falls": [5] * 4, "heart": [1, 2, 3, 4]}
    assert of(made, "w.f.2001") == {"": [2, 2, 3, 11], "heart": [1, 2, 3, 4], "lungs": [1, 0, 0, 7]}
    assert of(made, "w.m.2001") == {}  # of the men of b there are no deaths at all


def test_nothing_is_summed_by_cause_where_a_sex_or_part_has_no_causes() -> None:
    plain = {key: cell for key, cell in TWO.items() if not key.cause}
    made = totalled(ONE | plain, FLAT[:2], base={}).cells
    assert of(made, "a.p.2001") == {"": [6, 7, 8, 9]}
    assert of(made, "w.f.2001") == {"": [1, 2, 3, 4], "heart": [1, 2, 3, 4]}
    assert of(made, "w.m.2001") == {"": [5] * 4}


def test_a_sum_stands_on_the_common_age_groups_of_its_parts() -> None:
    coarse = AgeGrid((0, 5, 10))
    other = {
        key._replace(area="b"): Vector("final", coarse, GRID.regroup(cell.values, coarse))
        for key, cell in ONE.items()
    }
    made = totalled(ONE | other, FLAT, base={}).cells
    assert made[Key("w", "f", "2001", "deaths", "heart")].grid == coarse
    assert of(made, "w.f.2001")["heart"] == [6, 6, 8]


CAUSES = ("heart", "lungs", "falls")
held = st.dictionaries(
    st.sampled_from(CAUSES), st.lists(st.integers(0, 9), min_size=4, max_size=4), min_size=1
)


@given(st.lists(held, min_size=4, max_size=4), st.integers(0, 3))
def test_causes_add_up_to_all_deaths_in_every_sum(parts: list[Counts], lacking: int) -> None:
    places = ("a.f.2001", "a.m.2001", "b.f.2001", "b.m.2001")
    cells: dict[Key, Vector] = {}
    for where, causes in zip(places, parts, strict=True):
        cells |= by_cause(where, causes, lacking=lacking)
    made = totalled(cells, FLAT, base={}).cells
    for where, count in (("a.p.2001", 2), ("w.f.2001", 2), ("w.p.2001", 4)):
        found = of(made, where)
        total = np.array(found.pop(""))
        assert (
            np.array(list(found.values())).sum(axis=0).tolist()
            == (total - count * lacking).tolist()
        )


def test_those_counted_are_summed_with_their_cause() -> None:
    counted = {
        key._replace(measure="counted_deaths"): replace(cell, values=cell.values - 0.5)
        for key, cell in ONE.items()
    }
    made = totalled(ONE | counted | TWO, FLAT[:2], base={}).cells
    for where in ("a.p", "w.p"):
        area, sex = where.split(".")
        for cause, expected in (("heart", [0.5, 1.5, 2.5, 3.5]), ("falls", None)):
            found = made.get(Key(area, sex, "2001", "counted_deaths", cause))
            assert (found.values.tolist() if found else None) == expected


# ---- over an edition that stands ----------------------------------------------------------------


def stands(cells: Mapping[Key, Vector], causes: tuple[Cause, ...] = LIST) -> Base:
    summed = totalled(cells, FLAT, base={}).cells

    def load(chosen: Selection) -> dict[Key, Vector]:
        return {
            key: cell
            for key, cell in summed.items()
            if chosen.periods is None or key.period in chosen.periods
        }

    return Base(FLAT, (), load, causes, lambda: summed)


def laid(
    cells: Mapping[Key, Vector],
    base: Base,
    causes: tuple[Cause, ...] = (),
    taking: Taking = ALL_OF_IT,
) -> Made:
    return made_of(Parsed(dict(cells), FLAT, (), 0, 0, "w", causes=causes), taking, base)


def after(base: Base, made: Made) -> dict[Key, Vector]:
    kept = base.load(Selection(cause=None)).items()
    return {key: cell for key, cell in kept if key not in made.ended} | made.cells


BOTH = (
    ONE | TWO | by_cause("b.f.2001", {"lungs": [2] * 4}) | by_cause("b.m.2001", {"falls": [1] * 4})
)


def test_the_causes_of_deaths_that_come_anew_give_way_with_them() -> None:
    base = stands(BOTH)
    found = after(base, laid(by_cause("a.f.2001", {"lungs": (1, 1, 1, 1)}), base, LIST))
    assert of(found, "a.f.2001") == {"": [1] * 4, "lungs": [1] * 4}
    assert of(found, "a.p.2001") == {"": [6] * 4, "falls": [5] * 4, "lungs": [1] * 4}
    assert of(found, "w.f.2001") == {"": [3] * 4, "lungs": [3] * 4}
    assert of(found, "w.p.2001") == {"": [9] * 4, "falls": [6] * 4, "lungs": [3] * 4}
    assert of(found, "a.m.2001") == of(BOTH, "a.m.2001")


def test_deaths_without_causes_end_the_causes_of_all_that_rests_on_them() -> None:
    base = stands(BOTH)
    plain = {key: cell for key, cell in ONE.items() if not key.cause}
    made = laid(plain, base)
    found = after(base, made)
    for where in ("a.f", "a.p", "w.f", "w.p"):
        assert list(of(found, f"{where}.2001")) == [""]
    for where in ("a.m", "b.f", "b.p", "w.m"):
        assert len(of(found, f"{where}.2001")) > 1
    assert made.causes.ended == frozenset()


def test_population_that_comes_anew_leaves_the_causes() -> None:
    base = stands(BOTH)
    people = {
        key._replace(measure="person_years"): cell for key, cell in ONE.items() if not key.cause
    }
    found = after(base, laid(people, base))
    assert of(found, "a.f.2001") == of(BOTH, "a.f.2001")
    assert len(of(found, "w.p.2001")) == 4


def test_a_list_of_which_nothing_is_counted_any_longer_ends() -> None:
    base = stands(ONE)
    plain = {key: cell for key, cell in ONE.items() if not key.cause}
    assert laid(plain, base).causes.ended == {cause.code for cause in LIST}


def test_a_year_that_gives_way_goes_with_its_causes() -> None:
    base = stands(BOTH)
    new = by_cause("b.f.2001", {"heart": [3] * 4})
    found = after(base, laid(new, base, LIST, Taking(gives_way="years")))
    assert {key.area for key in found if key.cause} == {"b"}


def test_causes_that_are_more_than_all_deaths_are_refused() -> None:
    less = dict(ONE)
    less[Key("a", "f", "2001", "deaths")] = Vector("final", GRID, np.array([1.0, 2, 1, 4]))
    with pytest.raises(Refused, match=r"by cause of a in 2001 \(f, age 5–9\) are 2 more than"):
        laid(less, stands({}), LIST)


# ---- new codes of areas ----------------------------------------


def merging(*codes: str) -> Successions:
    whole = (Share("c", "", "", AgeGrid((0,)), (1.0,)),)
    return Successions(
        tuple(Succession(code, FIRST, LAST, ("c",), whole) for code in codes), (Area("c", ""),)
    )


def test_a_merge_is_the_sum_by_cause_and_lacks_a_cause_of_nobody() -> None:
    other = by_cause("b.f.2001", {"lungs": [2] * 4, "heart": [1] * 4})
    made = recoded(ONE | other, merging("a", "b")).made
    assert of(made, "c.f.2001") == {"": [4, 5, 6, 7], "heart": [2, 3, 4, 5], "lungs": [2] * 4}


def test_a_merge_with_a_code_without_causes_has_none() -> None:
    other = {
        key: cell for key, cell in by_cause("b.f.2001", {"lungs": [2] * 4}).items() if not key.cause
    }
    done = recoded(ONE | other, merging("a", "b"))
    assert of(done.made, "c.f.2001") == {"": [3, 4, 5, 6]}
    assert Key("a", "f", "2001", "deaths", "heart") in done.gone


def test_a_share_takes_the_same_part_of_every_cause_and_carries_those_counted() -> None:
    parts = tuple(
        Share(code, "", "", AgeGrid((0,)), (part,)) for code, part in (("c", 0.25), ("d", 0.75))
    )
    said = Successions(
        (Succession("a", FIRST, LAST, ("c", "d"), parts),), (Area("c", ""), Area("d", ""))
    )
    made = recoded(ONE, said).made
    assert of(made, "c.f.2001") == {"": [0.25, 0.5, 0.75, 1], "heart": [0.25, 0.5, 0.75, 1]}
    counted = made[Key("d", "f", "2001", "counted_deaths", "heart")]
    assert counted.values.tolist() == [1, 2, 3, 4]
    assert made[Key("d", "f", "2001", "deaths", "heart")].estimated


def test_persons_beside_women_and_men_are_summed_anew_by_cause_too() -> None:
    persons = totalled(ONE | TWO, FLAT[:2], base={}).cells
    stood = {key: cell for key, cell in persons.items() if key.area == "a"}
    assert not any(key.sex == "p" for key in recoded(stood, merging("a")).made)


# ---- the list ----------------------------------------

HEART, FALLS = Key("a", "f", "2001", "deaths", "heart"), Key("a", "f", "2001", "deaths", "falls")


def test_a_list_takes_the_place_of_the_one_that_stood() -> None:
    wider = (*LIST, Cause("drowning", "Drowning", kind="external"))
    gone: frozenset[Key] = frozenset()
    done = list_laid_over(wider, LIST, new=(), gone=gone, held=lambda: [HEART])
    assert (done.causes, done.ended, done.over(LIST)) == (wider, frozenset(), wider)
    fewer = tuple(cause for cause in LIST if cause.code != "lungs")
    done = list_laid_over(fewer, LIST, new=(), gone=gone, held=lambda: [HEART, FALLS])
    assert (done.ended, done.over(LIST)) == (frozenset({"lungs"}), fewer)


@pytest.mark.parametrize(
    "listed",
    [
        LIST[:1] + LIST[2:],  # without the heart
        (*LIST, Cause("valves", "Valves", "heart")),  # the heart has parts now
    ],
)
def test_a_list_that_does_not_count_what_stays_is_refused(listed: tuple[Cause, ...]) -> None:
    with pytest.raises(Refused, match=r"does not count: heart\. An edition has one list"):
        list_laid_over(listed, LIST, new=(), gone=frozenset(), held=lambda: [HEART, FALLS])
    done = list_laid_over(
        listed, LIST, new=(), gone=frozenset({HEART}), held=lambda: [HEART, FALLS]
    )
    assert set(done.causes) == set(listed)


def test_counts_of_a_cause_that_is_not_listed_are_a_fault_of_the_program() -> None:
    with pytest.raises(ValueError, match=r"no list has, or has parts of: \{'body'\}"):
        list_laid_over(LIST, (), new=[HEART._replace(cause="body")], gone=frozenset(), held=tuple)


def test_the_code_of_no_stated_cause_is_taken() -> None:
    own = (*LIST, Cause("not-stated", "Not stated", kind="ill_defined"))
    with pytest.raises(Refused, match="The list of causes has the code not-stated, under which"):
        list_laid_over(own, (), new=(), gone=frozenset(), held=tuple)
