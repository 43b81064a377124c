"""Totals of sexes and areas, and when they are not available."""

from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from server.actions.totals import merged, periods_needed, total, totalled, totals
from server.store.errors import Refused
from server.store.records import Area, Key, Vector
from tests.factories import cells

FLAT = (Area("w", "Whole"), Area("a", "", "w"), Area("b", "", "w"))
DEEP = (*FLAT, Area("a1", "", "a"), Area("a2", "", "a"))
FINE, COARSE = AgeGrid((0, 1, 5, 10, 85, 100)), AgeGrid((0, 1, 5, 10, 85))


def key(area: str, sex: str = "f", year: int = 2001, measure: str = "deaths") -> Key:
    return Key(area, sex, str(year), measure)


def only(handed: dict[Key, Vector], *areas: str) -> dict[Key, Vector]:
    return {key: cell for key, cell in handed.items() if key.area in areas}


def test_persons_are_women_and_men() -> None:
    handed = cells("a", measures=("deaths",))
    made = totalled(handed, (Area("a", ""),), base={}).cells
    assert set(made) == {key("a", "f"), key("a", "m"), key("a", "p")}
    expected = handed[key("a", "f")].values + handed[key("a", "m")].values
    assert made[key("a", "p")].values.tolist() == expected.tolist()


def test_persons_alone_stay() -> None:
    handed = cells("a", sexes="p")
    assert totalled(handed, (Area("a", ""),), base={}).cells == handed


def test_persons_beside_women_and_men_that_stand_are_refused() -> None:
    base = totalled(cells("a"), (Area("a", ""),), base={}).cells
    for sexes in ("p", "pf"):
        with pytest.raises(Refused, match="Persons were handed in for a in 2001, but the edition"):
            totalled(cells("a", sexes=sexes), (Area("a", ""),), base=base)
    women = {key: cell for key, cell in base.items() if key.sex == "f"}
    handed = cells("a", sexes="p", times=3.0)
    assert totalled(handed, (Area("a", ""),), base=women).cells == handed


def test_one_sex_alone_makes_no_persons() -> None:
    handed = cells("a", sexes="f")
    assert totalled(handed, (Area("a", ""),), base={}).cells == handed


def test_persons_follow_when_one_sex_is_revised() -> None:
    base = totalled(cells("a"), (Area("a", ""),), base={}).cells
    handed = cells("a", sexes="m", times=7.0)
    made = totalled(handed, (Area("a", ""),), base=base).cells
    expected = base[key("a", "f")].values + handed[key("a", "m")].values
    assert made[key("a", "p")].values.tolist() == expected.tolist()
    assert key("a", "f") not in made


def test_an_area_is_the_sum_of_its_parts_through_every_level() -> None:
    handed = cells(("a1", "a2", "b"))
    made = totalled(handed, merged(DEEP, ()), base={}).cells
    for measure in ("deaths", "person_years"):
        for sex in "fmp":
            of = {
                area: made[key(area, sex, measure=measure)].values
                for area in ["w", "a", "b", "a1", "a2"]
            }
            assert of["a"].tolist() == (of["a1"] + of["a2"]).tolist()
            assert of["w"].tolist() == (of["a1"] + of["a2"] + of["b"]).tolist()


def test_a_sum_stands_on_the_common_age_groups() -> None:
    handed = cells("a", grid=FINE) | cells("b", grid=COARSE)
    made = totalled(handed, merged(FLAT, ()), base={}).cells
    assert made[key("w")].grid == COARSE
    a, b = handed[key("a")].values, handed[key("b")].values
    assert made[key("w")].values.tolist() == [*(a[:4] + b[:4]), a[4] + a[5] + b[4]]


def test_one_provisional_part_makes_the_sum_provisional() -> None:
    handed = cells("a") | cells("b", status="provisional")
    made = totalled(handed, merged(FLAT, ()), base={}).cells
    assert made[key("w")].status == "provisional"
    assert made[key("a", "p")].status == "final"


def test_a_gap_in_a_part_is_a_gap_in_the_sum() -> None:
    gap = Vector("final", COARSE, np.array([1.0, np.nan, 1.0, 1.0, 1.0]))
    full = Vector("final", COARSE, np.ones(5))
    assert np.isnan(total([gap, full]).values).tolist() == [False, True, False, False, False]


def test_a_sum_needs_every_part() -> None:
    handed = cells("ab") | cells("a", years=(2002,))
    made = totalled(handed, merged(FLAT, ()), base={}).cells
    assert key("w", year=2001) in made
    assert key("w", year=2002) not in made


def test_a_part_of_the_base_is_enough() -> None:
    base = totalled(cells("ab"), merged(FLAT, ()), base={}).cells
    handed = cells("a", times=3.0)
    made = totalled(handed, merged(FLAT, ()), base=base, base_areas=merged(FLAT, ())).cells
    expected = handed[key("a")].values + base[key("b")].values
    assert made[key("w")].values.tolist() == expected.tolist()
    assert key("b") not in made


def test_what_was_handed_in_for_a_summed_area_must_be_the_sum() -> None:
    """Else a revised whole handed in without its parts would go by without a word."""
    parts = cells("ab")
    base = totalled(parts, merged(FLAT, ()), base={}).cells
    sums = only(base, "w")
    made = totalled(parts | sums, merged(FLAT, ()), base={}).cells
    assert {key: made[key].values.tolist() for key in sums} == {
        key: cell.values.tolist() for key, cell in sums.items()
    }
    rounded = {key: replace(cell, values=cell.values + 1.5) for key, cell in sums.items()}
    made = totalled(parts | rounded, merged(FLAT, ()), base={}).cells
    assert made[key("w")].values.tolist() == sums[key("w")].values.tolist()
    off = {key: replace(cell, values=cell.values + 1.6) for key, cell in sums.items()}
    with pytest.raises(
        Refused,
        match=r"The deaths handed in for w in 2001 \(f, age 0\) differ by 1\.6\d* from the sum of "
        "its parts. Hand in all its parts, take w out, or declare it as delivered",
    ):
        totalled(off, merged(FLAT, ()), base=base, base_areas=merged(FLAT, ()))


def test_a_delivered_area_keeps_its_own_counts_and_its_persons_are_its_sexes() -> None:
    listed = merged([replace(FLAT[0], delivered=True), *FLAT[1:]], ())
    handed = cells("wab", grid=FINE)
    made = totalled(handed, listed, base={}).cells
    assert made[key("w")].values.tolist() == handed[key("w")].values.tolist()
    expected = handed[key("w", "f")].values + handed[key("w", "m")].values
    assert made[key("w", "p")].values.tolist() == expected.tolist()
    assert key("w") not in totalled(cells("ab"), listed, base={}).cells


def test_counts_of_an_area_that_cannot_be_summed_are_not_dropped_in_silence() -> None:
    with pytest.raises(
        Refused,
        match="Counts were handed in for w in 2001, which is summed from its parts, but not every "
        r"part has deaths for that year\. Hand in the missing parts, or declare w as delivered",
    ):
        totalled(cells("wa"), merged(FLAT, ()), base={})


def test_a_new_part_ends_the_sums_it_is_missing_from() -> None:
    base_areas = merged(FLAT, ())
    base = totalled(cells("ab", years=(2001, 2002)), base_areas, base={}).cells
    listed = merged([Area("c", "", "w")], base_areas)
    handed = cells("c", years=(2002,))
    assert periods_needed(handed, listed, base_areas) is None
    made = totalled(handed, listed, base=base, base_areas=base_areas)
    assert {key for key in made.ended if key.measure == "deaths"} == {
        key("w", sex, 2001) for sex in "fmp"
    }
    parts = [base[key("a", year=2002)], base[key("b", year=2002)], handed[key("c", year=2002)]]
    assert made.cells[key("w", year=2002)].values.tolist() == total(parts).values.tolist()


def test_sums_end_where_an_area_is_delivered_from_now_on() -> None:
    base_areas = merged(FLAT, ())
    base = totalled(cells("ab", years=(2001, 2002)), base_areas, base={}).cells
    listed = merged([Area("w", "", delivered=True)], base_areas)
    handed = cells("w", years=(2002,), times=9.0)
    made = totalled(handed, listed, base=base, base_areas=base_areas)
    assert (
        made.cells[key("w", year=2002)].values.tolist()
        == handed[key("w", year=2002)].values.tolist()
    )
    assert {key.period for key in made.ended} == {"2001"}
    assert {key.area for key in made.ended} == {"w"}


def test_only_the_years_handed_in_are_needed_while_the_tree_stays() -> None:
    listed = merged(FLAT, ())
    named = merged([Area("a", "Another name")], listed)
    assert periods_needed(cells("a", years=(2003, 2001)), named, listed) == ("2001", "2003")


def test_an_upload_that_is_silent_on_the_tree_leaves_it() -> None:
    base = merged([replace(FLAT[0], delivered=True), *FLAT[1:]], ())
    again = merged([Area("a", "North"), Area("w", "Whole")], base)
    assert again == (
        Area("w", "Whole", "", delivered=True),
        Area("a", "North", "w"),
        Area("b", "", "w"),
    )


def test_the_parts_may_come_in_any_order() -> None:
    handed = cells("ab")
    turned = dict(reversed(handed.items()))
    one, other = (totalled(h, merged(FLAT, ()), base={}).cells for h in (handed, turned))
    assert {k: v.values.tolist() for k, v in one.items()} == {
        k: v.values.tolist() for k, v in other.items()
    }


def test_a_schedule_of_an_area_that_is_not_listed_is_an_error_of_the_program() -> None:
    with pytest.raises(ValueError, match=r"areas that are not listed: \['x'\]"):
        totalled(cells("x"), FLAT, base={})


def fewer(handed: dict[Key, Vector], *keys: Key, by: float = 1.25) -> dict[Key, Vector]:
    """With deaths as counted beside some of the deaths."""
    counted = {
        key._replace(measure="counted_deaths"): replace(handed[key], values=handed[key].values / by)
        for key in keys
    }
    return handed | counted


def counted(area: str, sex: str = "f") -> Key:
    return key(area, sex, measure="counted_deaths")


def test_sums_know_the_deaths_counted_of_their_parts() -> None:
    handed = fewer(cells("ab", measures=("deaths",)), key("a", "m"))
    made = totalled(handed, FLAT, base={}).cells
    men = handed[counted("a", "m")].values
    persons = handed[key("a", "f")].values + men
    assert made[counted("a", "p")].values.tolist() == persons.tolist()
    assert made[counted("w", "m")].values.tolist() == (men + handed[key("b", "m")].values).tolist()
    both = sum(handed[key("b", sex)].values for sex in "fm")
    assert made[counted("w", "p")].values.tolist() == (persons + both).tolist()
    assert not {counted("w"), counted("a"), counted("b", "p")} & set(made)


def test_deaths_counted_end_where_deaths_come_anew_without() -> None:
    first = fewer(cells("ab", measures=("deaths",)), key("a", "m"), key("b", "f"))
    base = totalled(first, FLAT, base={}).cells
    handed = only(cells("ab", measures=("deaths",), times=2.0), "a")
    made = totalled(handed, FLAT, base=base, base_areas=FLAT)
    assert made.ended == {counted("a", "m"), counted("a", "p"), counted("w", "m")}
    women = handed[key("a")].values + first[counted("b")].values
    assert made.cells[counted("w")].values.tolist() == women.tolist()
    assert counted("w", "m") not in made.cells


def test_deaths_counted_follow_when_the_other_sex_is_revised() -> None:
    base = totalled(fewer(cells("a", measures=("deaths",)), key("a", "f")), FLAT[1:2], base={})
    handed = cells("a", sexes="m", measures=("deaths",), times=3.0)
    made = totalled(handed, FLAT[1:2], base=base.cells)
    both = base.cells[counted("a")].values + handed[key("a", "m")].values
    assert made.cells[counted("a", "p")].values.tolist() == both.tolist()
    assert not made.ended


def test_a_whole_counts_no_deaths_of_a_part_whose_persons_came_anew_by_sex() -> None:
    """Its persons were shared out in the base; all of the women and men handed in are counted."""
    one = AgeGrid((0,))
    a, b = key("a", "p"), key("b", "p")
    beside = a._replace(measure="counted_deaths")
    shared = {a: 10.0, beside: 8.0, b: 20.0}
    told = {which: Vector("final", one, np.array([n])) for which, n in shared.items()}
    base = totalled(told, FLAT, base={}).cells
    assert base[beside._replace(area="w")].values == [28.0]
    anew = {key("a", sex): Vector("final", one, np.array([n])) for sex, n in (("f", 6.0), ("m", 4))}
    made = totalled(anew, FLAT, base=base, base_areas=FLAT)
    assert made.cells[key("w", "p")].values == [30.0]
    assert beside._replace(area="w") not in made.cells
    assert {beside, beside._replace(area="w")} <= made.ended


@pytest.mark.parametrize("which", [0, 1])
def test_a_sum_is_estimated_and_provisional_where_either_part_is(which: int) -> None:
    grids = (AgeGrid((0, 1, 5)), AgeGrid((0, 1, 5)))
    parts = [Vector("final", grid, np.array([1.0, 2.0, 3.0])) for grid in grids]
    parts[which] = replace(parts[which], status="provisional", estimated=True)
    same = [replace(part, grid=grids[0]) for part in parts]
    for summed in totals({key("a"): parts, key("b"): same}).values():
        assert (summed.status, summed.estimated) == ("provisional", True)
        assert summed.values.tolist() == [2.0, 4.0, 6.0]
