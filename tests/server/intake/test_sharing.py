"""Counts that do not state their sex, age or area: a worked example, and laws."""

from collections import Counter
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from server.intake.parsing import Handed, Parsed, parse
from server.intake.report import Report
from server.intake.sharing import Unstated
from server.store.records import Key
from tests.server.intake.tables import COLUMNS, Row, csv

SPREAD = (("sex", "spread"), ("age", "spread"), ("area", "spread"))
AGES = ("0", "1-4", "5+")
UNKNOWN = "not stated"


def rows(area: str, sex: str, counts: list[float], year: int = 2001) -> list[Row]:
    """One for each age; people a hundred times as many, where all is stated."""
    stated = UNKNOWN not in (area, sex)
    return [
        {
            "area": area,
            "year": year,
            "sex": sex,
            "age": age,
            "deaths": count,
            "population": 100 * count + 1_000 if stated else 0,
        }
        for age, count in zip(AGES, counts, strict=True)
    ]


def ageless(area: str, sex: str, count: float, year: int = 2001) -> Row:
    return rows(area, sex, [count, 0, 0], year)[0] | {"age": UNKNOWN, "population": 0}


def read(
    table: list[Row], unstated: tuple[tuple[str, str], ...] = SPREAD, **more: object
) -> Parsed:
    mapping = replace(COLUMNS, unstated=unstated, **({"most_unstated": 60} | more))  # type: ignore[arg-type]
    return parse([Handed("counts", "counts.csv", csv(table), mapping)])


def deaths(
    parsed: Parsed, area: str, sex: str, measure: str = "deaths", year: int = 2001
) -> list[float]:
    return parsed.cells[Key(area, sex, str(year), measure)].values.tolist()  # type: ignore[no-any-return]


NORTH = rows("north", "f", [10, 20, 70]) + rows("north", "m", [10, 30, 110])
SOUTH = rows("south", "f", [5, 10, 40.425]) + rows("south", "m", [0, 0, 57])
BESIDE = [
    *rows("north", UNKNOWN, [2, 0, 9]),  # 0: 1 and 1; 5+: 3.5 and 5.5
    ageless("north", "f", 9.35),  # of 20 and 73.5: 2 and 7.35; infants are known
    ageless("north", "m", 14.55),  # of 30 and 115.5: 3 and 11.55
    *rows(UNKNOWN, "f", [0, 0, 6]),  # of 80.85 and 40.425: 4 and 2
    ageless(UNKNOWN, "m", 3),  # of 33 + 127.05 in the north and 57 in the south
]
EXPECTED = {
    ("north", "f"): [11, 22, 84.85],
    ("north", "m"): [11, 33 + 3 * 33 / 217.05, 127.05 + 3 * 127.05 / 217.05],
    ("south", "f"): [5, 10, 42.425],
    ("south", "m"): [0, 0, 57 + 3 * 57 / 217.05],
}


def test_first_sex_then_age_then_area_by_hand() -> None:
    parsed = read(NORTH + SOUTH + BESIDE)
    assert not parsed.errors
    for (area, sex), expected in EXPECTED.items():
        assert_allclose(deaths(parsed, area, sex), expected, atol=1e-6)
    assert deaths(parsed, "north", "f", "counted_deaths") == [10, 20, 70]
    assert deaths(parsed, "south", "m", "counted_deaths") == [0, 0, 57]
    assert {key.sex for key in parsed.cells} == {"f", "m"}
    assert {key.area for key in parsed.cells} == {area.code for area in parsed.areas}
    assert parsed.unstated == (
        Unstated("deaths", "2001", 362.425, 11, 23.9, 9, 0, 362.425 + 11 + 23.9 + 9),
    )
    assert Report.from_json(Report.of(parsed).to_json()) == Report.of(parsed)
    assert "counted_deaths" not in Report.of(parsed).measures


def test_what_is_left_out_is_left_out_and_said() -> None:
    chosen = (("sex", "spread"), ("age", "left_out"), ("area", "spread"))
    parsed = read(NORTH + SOUTH + BESIDE, chosen)
    assert_allclose(deaths(parsed, "north", "f"), [11, 20, 73.5 + 6 * 73.5 / 113.925], atol=1e-6)
    assert deaths(parsed, "south", "m") == [0, 0, 57]
    assert Key("south", "m", "2001", "counted_deaths") not in parsed.cells
    (year,) = parsed.unstated
    assert (year.sex, year.age, year.area, year.left_out) == (11, 0, 6, 26.9)
    assert year.after == pytest.approx(362.425 + 17)


def test_what_lacks_two_is_shared_out_only_where_both_may_be() -> None:
    table = [*NORTH, ageless("north", UNKNOWN, 23)]  # of 20, 70, 30 and 110
    parsed = read(table, SPREAD[:2])
    assert_allclose(deaths(parsed, "north", "f"), [10, 22, 77])
    assert_allclose(deaths(parsed, "north", "m"), [10, 33, 121])
    for chosen in ((SPREAD[0], ("age", "left_out")), (("sex", "left_out"), SPREAD[1])):
        assert deaths(read(table, chosen), "north", "f") == [10, 20, 70]
    assert [problem.key for problem in read(table, SPREAD[:1]).errors] == ["age_not_stated"]
    nowhere = [*NORTH, *SOUTH, ageless(UNKNOWN, UNKNOWN, 3.37425)]
    parsed = read(nowhere)
    assert_allclose(deaths(parsed, "south", "f"), [5, 10.1, 40.82925 - 0.0], atol=1e-9)


def test_where_all_is_stated_nothing_changes() -> None:
    plain, chosen = read(NORTH + SOUTH, ()), read(NORTH + SOUTH)
    assert plain.unstated == chosen.unstated == ()
    zeros = read(NORTH + SOUTH + rows("north", UNKNOWN, [0, 0, 0]), ())
    for other in (chosen, zeros):
        assert other.problems == plain.problems
        for key, cell in plain.cells.items():
            assert_array_equal(other.cells[key].values, cell.values)
        assert other.cells.keys() == plain.cells.keys()


def test_infants_get_their_share_where_they_are_no_group_of_their_own() -> None:
    table = [
        row | {"age": {"0": "0-4", "1-4": "5-9", "5+": "10+"}[str(row["age"])]} for row in NORTH
    ]
    parsed = read([*table, ageless("north", "f", 10)])
    assert_allclose(deaths(parsed, "north", "f"), [11, 22, 77])


def test_where_nobody_is_stated_at_an_age_the_age_is_kept() -> None:
    table = rows("north", "f", [0, 0, 30]) + rows("north", "m", [0, 5, 55])
    parsed = read([*table, *rows("north", UNKNOWN, [3, 0, 0])])
    assert_allclose(deaths(parsed, "north", "f"), [1, 0, 30])  # 30 and 60 at all ages
    assert_allclose(deaths(parsed, "north", "m"), [2, 5, 55])
    assert deaths(parsed, "north", "m", "counted_deaths") == [0, 5, 55]
    only_infants = rows("north", "f", [8, 0, 0]) + rows("north", "m", [9, 5, 55])
    parsed = read([*only_infants, ageless("north", "f", 2)])
    assert deaths(parsed, "north", "f") == [10, 0, 0]


def test_counts_in_wide_groups_go_to_the_ages_within() -> None:
    wide = [
        row | {"age": age}
        for row, age in zip(rows("north", UNKNOWN, [4, 9.2, 0])[:2], ("0-4", "5+"), strict=True)
    ]
    parsed = read(NORTH + wide)
    assert_allclose(
        deaths(parsed, "north", "f"),
        [10 + 4 * 10 / 70, 20 + 4 * 20 / 70, 70 + 9.2 * 70 / 180],
        atol=1e-6,
    )


def test_a_total_over_the_ages_stands_for_them_where_there_are_none() -> None:
    total = rows("north", UNKNOWN, [25, 0, 0])[0] | {"age": "all ages"}
    parsed = read([*NORTH, total])
    assert_allclose(
        deaths(parsed, "north", "f"), [11, 22, 77]
    )  # infants too: the age is not unknown
    beside = read([*NORTH, *rows("north", UNKNOWN, [0, 0, 18]), total | {"deaths": 18}])
    assert not beside.problems
    assert_allclose(deaths(beside, "north", "f"), [10, 20, 77])


def test_people_and_births_are_shared_out_like_deaths() -> None:
    people = [row | {"population": 50} for row in rows("north", UNKNOWN, [0, 0, 0])]
    parsed = read(NORTH + people)
    assert_allclose(
        deaths(parsed, "north", "f", "person_years"),
        [2025, 3000 + 50 * 3 / 7, 8000 + 50 * 8 / 20],
        atol=1e-6,
    )
    assert {key.measure for key in parsed.cells} == {"deaths", "person_years"}
    lines = b"area,year,sex,births\nnorth,2001,f,480\nnorth,2001,m,520\nnorth,2001,unknown,10\n"
    mapping = replace(COLUMNS, age="", deaths="", population="", births="births", unstated=SPREAD)
    born = parse([Handed("births", "births.csv", lines, mapping)])
    assert deaths(born, "north", "f", "births") == [484.8]
    assert deaths(born, "north", "m", "births") == [525.2]


def test_the_whole_keeps_its_total_and_gets_nothing_of_unknown_areas() -> None:
    isle = [
        [15, 30, 116.425],  # women of both areas, and those of no area
        [10, 30, 167],
    ]
    whole = [row for sex in (0, 1) for row in rows("isle", "fm"[sex], isle[sex])]
    table = [*NORTH, *SOUTH, *rows(UNKNOWN, "f", [0, 0, 6]), *whole]
    parsed = read(table, whole="isle")
    assert {problem.key for problem in parsed.problems} == {"fractional_deaths", "whole_differs"}
    assert {p.column for p in parsed.problems if p.key == "whole_differs"} == {"population"}
    assert "isle" not in {key.area for key in parsed.cells}
    both = np.array(deaths(parsed, "north", "f")) + deaths(parsed, "south", "f")
    assert_allclose(both, isle[0], rtol=1e-15)
    # delivered: it stays, and its counts are its own
    kept = read(table, whole="isle", delivered=("isle",))
    assert deaths(kept, "isle", "f") == isle[0]
    assert kept.unstated == parsed.unstated


def test_persons_of_unknown_area_go_to_both_sexes_where_areas_come_by_sex() -> None:
    persons = rows(UNKNOWN, "p", [4, 0, 0])
    parsed = read(NORTH + persons)
    assert deaths(parsed, "north", "f") == [12, 20, 70]
    twice = read([*NORTH, *persons, *rows(UNKNOWN, "f", [1, 0, 0]), *rows(UNKNOWN, "m", [3, 0, 0])])
    assert deaths(twice, "north", "f") == [11, 20, 70]
    assert not twice.errors


def test_a_provisional_share_makes_provisional_what_it_goes_to() -> None:
    table = [row | {"status": "final"} for row in NORTH + SOUTH]
    table += [row | {"status": "provisional"} for row in [ageless("north", "f", 2)]]
    parsed = read(table, status="status")
    status = {
        (key.area, key.sex): cell.status
        for key, cell in parsed.cells.items()
        if key.measure == "deaths"
    }
    assert status == {
        ("north", "f"): "provisional",
        ("north", "m"): "final",
        ("south", "f"): "final",
        ("south", "m"): "final",
    }


def test_the_limit_is_of_an_area_and_a_year() -> None:
    table = [
        *NORTH,
        *SOUTH,
        *rows("south", "f", [50, 50, 900], 2002),
        *rows("south", "m", [50, 50, 900], 2002),
    ]
    table += [*rows("north", "f", [50, 50, 900], 2002), *rows("north", "m", [50, 50, 900], 2002)]
    few = read([*table, ageless("north", "f", 13)], most_unstated=5)  # of 250 + 13
    assert not few.errors
    (problem,) = read([*table, ageless("north", "f", 14)], most_unstated=5).errors
    assert problem.values["total"] == 264
    assert problem.found == "14 of 264 in north, 2001, which is 5.3 %"
    nowhere = read([*table, ageless(UNKNOWN, "f", 19)], most_unstated=5)  # of 362.425 + 19
    assert not nowhere.errors
    (problem,) = read([*table, ageless(UNKNOWN, "f", 20)], most_unstated=5).errors
    assert problem.found == "20 of 382.425 in not stated, 2001, which is 5.2 %"


COUNTS = st.lists(st.integers(0, 400), min_size=3, max_size=3)


@settings(max_examples=40)
@given(
    stated=st.lists(st.lists(st.integers(1, 400), min_size=3, max_size=3), min_size=8, max_size=8),
    sexless=st.lists(COUNTS, min_size=2, max_size=2),
    nowhere=st.lists(COUNTS, min_size=3, max_size=3),
    unknown=st.lists(st.integers(0, 90), min_size=6, max_size=6),
    order=st.integers(0, 10**6),
)
def test_sums_are_kept_whatever_the_order_of_rows(stated, sexless, nowhere, unknown, order) -> None:
    places = [
        (area, sex, year) for area in ("north", "south") for sex in "fm" for year in (2001, 2002)
    ]
    table = [
        row for (a, s, y), own in zip(places, stated, strict=True) for row in rows(a, s, own, y)
    ]
    table += [
        row
        for area, counts in zip(("north", "south"), sexless, strict=True)
        for row in rows(area, UNKNOWN, counts)
    ]
    table += [
        row
        for sex, counts in zip(("f", "m", UNKNOWN), nowhere, strict=True)
        for row in rows(UNKNOWN, sex, counts, 2002)
    ]
    some = [
        ("north", "f"),
        ("south", "m"),
        ("north", UNKNOWN),
        (UNKNOWN, "f"),
        (UNKNOWN, "m"),
        (UNKNOWN, UNKNOWN),
    ]
    table += [ageless(*place, count) for place, count in zip(some, unknown, strict=True)]
    parsed = read(table, most_unstated=100)
    before = Counter[str]()
    for row in table:
        before[str(row["year"])] += int(str(row["deaths"]))
    after = Counter[str]()
    for key, cell in parsed.cells.items():
        if key.measure == "deaths":
            after[key.period] += int(np.rint(cell.values * 1e6).astype(np.int64).sum())
            counted = parsed.cells.get(key._replace(measure="counted_deaths"), cell)
            assert (counted.values <= cell.values).all()
            assert_array_equal(counted.values, np.round(counted.values))
    assert after == {year: 10**6 * count for year, count in before.items()}
    mixed = [table[at] for at in np.random.default_rng(order).permutation(len(table))]
    again = read(mixed, most_unstated=100)
    assert again.unstated == parsed.unstated
    for key, cell in parsed.cells.items():
        assert_array_equal(again.cells[key].values, cell.values)


def test_ages_where_nobody_is_unknown_may_be_left_out() -> None:
    one = rows("north", UNKNOWN, [0, 0, 18])[2:]
    parsed = read([*NORTH, *one])
    assert not parsed.problems
    assert deaths(parsed, "north", "m") == [10, 30, 121]
    single = [one[0] | {"age": "7"}]  # of one year of age, among those of 5 and over
    assert deaths(read([*NORTH, *single]), "north", "m") == [10, 30, 121]
    twice = [problem.key for problem in read([*NORTH, *one, *one]).errors]
    assert twice == ["duplicate_cell"]


def test_totals_are_compared_with_all_their_parts_known_or_not() -> None:
    beside = [*rows("north", UNKNOWN, [0, 0, 18])[2:], ageless("north", "m", 5)]
    persons = [*rows("north", "p", [20, 50, 198]), ageless("north", "p", 5)]
    table = [*NORTH, *beside, *persons]
    totals = [
        rows("north", sex, [count, 0, 0])[0] | {"age": "all ages"}
        for sex, count in (("f", 100), ("m", 155), (UNKNOWN, 18), ("p", 273))
    ]
    assert not read([*table, *totals]).errors
    kinds = {"persons_differ", "all_ages_differ"}

    def found(table: list[Row]) -> list[str]:
        problems = [one for one in read(table).problems if one.column == "deaths"]
        return [problem.found for problem in problems if problem.key in kinds]

    assert not found([*table, *totals])
    assert deaths(read(table), "north", "f") == [10, 20, 77]  # persons get nothing of it
    off = [*table[:-4], *rows("north", "p", [20, 50, 199]), table[-1], *totals]
    assert found(off) == [
        "199 persons in north, 2001, age 5+",
        "273 at all ages in north, p 2001",
    ]
    off = [*table[:-1], table[-1] | {"deaths": 7}]
    assert found(off) == ["7 persons in north, 2001, age not stated"]
    off = [*table, totals[2] | {"deaths": 20}]
    assert found(off) == ["20 at all ages in north, not stated 2001"]
    wide = [row | {"age": "0-84"} if row["sex"] == UNKNOWN else row for row in table]
    assert found(wide) == []  # of no one age: all ages are compared


def test_a_code_that_is_called_unknown_is_of_no_area() -> None:
    table = [row | {"name": str(row["area"]).title()} for row in NORTH]
    table += [row | {"area": "99", "name": "Not stated"} for row in rows(UNKNOWN, "f", [5, 0, 0])]
    parsed = read(table, area_name="name")
    assert [area.code for area in parsed.areas] == ["north"]
    assert deaths(parsed, "north", "f") == [15, 20, 70]


def test_a_total_that_is_named_as_the_whole_is_a_cross_check() -> None:
    total = [row | {"area": "All areas"} for row in NORTH]
    named = {"area": "", "area_name": "area", "whole_name": "All areas"}
    parsed = read([*NORTH, *total], **named)
    assert not parsed.problems
    assert {key.area for key in parsed.cells} == {"north"}
    off = [total[0] | {"deaths": 12}, *total[1:]]
    (problem,) = read([*NORTH, *off], **named).problems
    assert problem.found == "12 in all-areas, f 2001, age 0"
    assert problem.expected == "10, all parts together"
    assert [one.key for one in read([*NORTH, *total], area="", area_name="area").errors] == [
        "total_among_areas"
    ]
