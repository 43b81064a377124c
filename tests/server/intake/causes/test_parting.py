"""Laws of deaths read by cause: what the rows add up to, in whatever way they are given."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest

from server.intake.mapping import Form
from server.intake.parsing import Handed, Parsed, parse
from server.store.records import Key
from tests.server.intake.by_cause import by_cause, own, parted, totals
from tests.server.intake.tables import COLUMNS, Row, counts, csv, deaths, rows, where

CODES = ("I21.9", "I25", "C34.1", "C50", "X64", "W19", "R54", "R99", "J18.9", "U07.1")
LEAVES = {
    "I21.9": "heart-attack",
    "I25": "heart-attack",
    "C34.1": "cancer-lung",
    "C50": "cancer-breast",
    "X64": "suicide",
    "W19": "falls",
    "R54": "ill-defined",
    "R99": "pending",
    "J18.9": "pneumonia",
    "U07.1": "covid",
}
AGES = ("0-14", "15-44", "45-64", "65+")
PLACES = [(area, sex, year) for area in ("north", "south") for sex in "fm" for year in (2020, 2021)]
Table = list[Row]


def tables(rng: np.random.Generator) -> Table:
    """Deaths by code of every area, sex, year and age; some codes have no row somewhere."""
    table: Table = []
    for area, sex, year in PLACES:
        for age in AGES:
            named = [code for code in CODES if rng.random() < 0.7] or [CODES[0]]
            table += [
                {"area": area, "year": year, "sex": sex, "age": age, "cause": code, "deaths": count}
                for code in named
                for count in [int(rng.integers(0, 40)) + (code == named[0])]
            ]
    return table


def unknown(rng: np.random.Generator, *matters: str) -> Table:
    """Rows that do not state their sex, age or area, each once."""
    found: dict[tuple[object, ...], Row] = {}
    for _ in range(12):
        area, sex, year = PLACES[rng.integers(len(PLACES))]
        row: Row = {"area": area, "year": year, "sex": sex, "age": AGES[rng.integers(len(AGES))]}
        lacking = [matter for matter in matters if rng.random() < 0.5] or [matters[0]]
        row |= dict.fromkeys(lacking, "not stated")
        row["cause"] = CODES[rng.integers(len(CODES))]
        found[tuple(row.values())] = {**row, "deaths": int(rng.integers(1, 4))}
    return list(found.values())


SEEDS = pytest.mark.parametrize("seed", range(6))
SHARED = (("sex", "spread"), ("age", "spread"), ("area", "spread"))


def read(table: Sequence[Row], **mapping: object) -> Parsed:
    return sound(parse([by_cause(list(table), **mapping)], warn=False))


def sound(parsed: Parsed) -> Parsed:
    """Without errors, but that deaths come alone."""
    assert {one.key for one in parsed.errors} <= {"deaths_without_population"}
    return parsed


def same(one: Parsed, other: Parsed) -> None:
    assert one.cells.keys() == other.cells.keys()
    for key, cell in one.cells.items():
        np.testing.assert_array_equal(cell.values, other.cells[key].values)
        assert (cell.grid, cell.status) == (other.cells[key].grid, other.cells[key].status)


def without_causes(parsed: Parsed) -> Parsed:
    kept = {key: cell for key, cell in parsed.cells.items() if not key.cause}
    return replace(parsed, cells=kept)


def by_leaf(table: Sequence[Row]) -> dict[tuple[str, str, str, str], list[float]]:
    """Sums of the rows, one by one."""
    found: dict[tuple[str, str, str, str], list[float]] = {}
    for row in table:
        for cause in ("", LEAVES[str(row["cause"])]):
            key = (str(row["area"]), str(row["sex"]), str(row["year"]), cause)
            ages = found.setdefault(key, [0.0] * len(AGES))
            ages[AGES.index(str(row["age"]))] += float(str(row["deaths"]))
    return found


@SEEDS
def test_vectors_are_the_sums_of_their_rows(seed: int) -> None:
    table = tables(np.random.default_rng(seed))
    cells = read(table).cells
    expected = {key: ages for key, ages in by_leaf(table).items() if not key[3] or any(ages)}
    assert {(key.area, key.sex, key.period, key.cause) for key in cells} == set(expected)
    for key, cell in cells.items():
        assert cell.values.tolist() == expected[key.area, key.sex, key.period, key.cause]


@SEEDS
def test_the_order_of_rows_does_not_matter(seed: int) -> None:
    rng = np.random.default_rng(seed)
    table = tables(rng)
    same(read(table), read([table[at] for at in rng.permutation(len(table))]))


RANGES = {"all causes": "", "I20-I25": "I2", "C00-D48": "C", "I00-I99": "I", "A00-Y98": ""}


@pytest.mark.parametrize("named", RANGES)
@pytest.mark.parametrize("seed", range(2))
def test_sums_among_the_rows_are_not_counted_twice(seed: int, named: str) -> None:
    """All causes, a group, a range of several causes, each where its parts stand."""
    table = tables(np.random.default_rng(seed))
    sums: dict[tuple[str, ...], int] = {}
    for row in table:
        if str(row["cause"]).startswith(RANGES[named]):
            at = tuple(str(row[name]) for name in ("area", "year", "sex", "age"))
            sums[at] = sums.get(at, 0) + int(str(row["deaths"]))
    beside: Table = [
        {"area": area, "year": year, "sex": sex, "age": age, "cause": named, "deaths": count}
        for (area, year, sex, age), count in sums.items()
    ]
    same(read(table), read([*beside, *table]))


@SEEDS
def test_what_is_shared_out_cause_by_cause_adds_up_to_the_last_millionth(
    seed: int,
) -> None:
    rng = np.random.default_rng(seed)
    table, lacking = tables(rng), unknown(rng, "sex", "age", "area")
    cells = read([*table, *lacking], unstated=SHARED, most_unstated=100).cells
    for key, cell in cells.items():
        if not key.cause and key.measure == "deaths":
            parts = [of for other, of in cells.items() if other.cause and _same_place(other, key)]
            units = sum((np.rint(of.values * 1e6) for of in parts), np.zeros(len(AGES)))
            np.testing.assert_array_equal(np.rint(cell.values * 1e6), units)
    for leaf in {LEAVES[str(row["cause"])] for row in (*table, *lacking)}:
        died = sum(
            float(cell.values.sum())
            for key, cell in cells.items()
            if key.cause == leaf and key.measure == "deaths"
        )
        rows_of = [row for row in (*table, *lacking) if LEAVES[str(row["cause"])] == leaf]
        assert died == pytest.approx(sum(float(str(row["deaths"])) for row in rows_of), abs=1e-6)


def _same_place(one: Key, other: Key) -> bool:
    return one._replace(cause="") == other


@SEEDS
def test_what_was_counted_stays_what_was_counted(seed: int) -> None:
    rng = np.random.default_rng(seed)
    table, lacking = tables(rng), unknown(rng, "sex")
    plain = read(table).cells
    cells = read([*table, *lacking], unstated=SHARED, most_unstated=100).cells
    for key, cell in cells.items():
        if key.measure == "counted_deaths":
            stated = plain.get(key._replace(measure="deaths"))
            expected = np.zeros(len(AGES)) if stated is None else stated.values
            np.testing.assert_array_equal(cell.values, expected)
            assert (cells[key._replace(measure="deaths")].values >= cell.values).all()


def test_deaths_of_all_causes_beyond_the_causes_have_none() -> None:
    table = parted(rows())
    plain, more = read(table), read([*table, *totals(rows(), more=3)])
    for key, cell in more.cells.items():
        expected = plain.cells[key].values + (0 if key.cause else 3)
        np.testing.assert_array_equal(cell.values, expected)


def test_a_group_beyond_its_causes_adds_to_all_causes_alone() -> None:
    table = parted(rows())
    lung = where(table, cause="C34")
    beside = totals(lung, "cancers", more=2)
    plain, more = read(table), read([*table, *beside])
    for key, cell in more.cells.items():
        expected = plain.cells[key].values + (0 if key.cause else 2)
        np.testing.assert_array_equal(cell.values, expected)


def test_a_cause_given_beside_its_codes_keeps_its_own_number() -> None:
    table = parted(rows())
    lung = where(table, cause="C34")
    beside = [
        {**row, "cause": "Lung cancer", "deaths": int(str(row["deaths"])) + 2} for row in lung
    ]
    plain, more = read(table), read([*table, *beside])
    for key, cell in more.cells.items():
        some = key.cause in ("", "cancer-lung")
        np.testing.assert_array_equal(cell.values, plain.cells[key].values + 2 * some)


def test_a_shorter_code_is_a_sum_only_where_it_always_is() -> None:
    table = parted(rows())
    lung = where(table, cause="C34")
    longer = [{**row, "cause": "C34.9"} for row in lung]
    same(read(table), read([*table, *longer]))
    longer[0] = {**longer[0], "deaths": int(str(longer[0]["deaths"])) + 1}
    both = read([*table, *longer]).cells
    key = Key("north", "f", "2011", "deaths", "cancer-lung")
    np.testing.assert_array_equal(both[key].values, 2 * read(table).cells[key].values)


def test_a_cause_not_stated_is_counted_and_falls_into_none() -> None:
    table = parted(rows(), {"C34": 20, "cause not stated": 10, "I21.9": 0})
    parsed = read(table)
    key = Key("south", "m", "2014", "deaths")
    named = [cell.values for of, cell in parsed.cells.items() if of._replace(cause="") == key][1:]
    lacking = where(table, area="south", sex="m", year=2014, cause="cause not stated")
    expected = [float(str(row["deaths"])) for row in lacking]
    np.testing.assert_array_equal(parsed.cells[key].values - sum(named), expected)
    assert {of.cause for of in parsed.cells} == {"", "cancer-lung", "heart-attack"}


def test_people_may_stand_beside_one_cause_or_beside_all() -> None:
    table = parted(rows())
    first = [row if row["cause"] == "C34" else {**row, "population": ""} for row in table]
    stated = {"cause": "cause", "cause_list": "short"}
    every, once = parse([counts(table, **stated)]), parse([counts(first, **stated)])
    assert every.problems == once.problems == ()
    same(every, once)
    plain = parse([counts(rows())])
    same(
        replace(plain), replace(every, cells={k: v for k, v in every.cells.items() if not k.cause})
    )


def test_causes_across_are_those_in_rows() -> None:
    table = parted(rows())
    names = tuple(dict.fromkeys(str(row["cause"]) for row in table))
    wide: list[Row] = []
    for row in rows():
        own_rows = [
            one for one in table if all(one[n] == row[n] for n in ("area", "year", "sex", "age"))
        ]
        wide.append({**row, **{str(one["cause"]): one["deaths"] for one in own_rows}})
    form = Form(
        across=("cause",),
        across_columns=tuple((name, name) for name in names),
        across_number="deaths",
    )
    mapping = replace(COLUMNS, deaths="", population="", cause_list="short", form=form)
    content = csv(wide, ("area", "year", "sex", "age", *names))
    parsed = sound(parse([Handed("deaths", "wide.csv", content, mapping)], warn=False))
    same(parsed, read(table))


def test_an_own_list_and_the_same_list_built_in_read_alike() -> None:
    lines = ("a,Heart,,I00-I99", "b,Lungs,,J00-J99", "c,Cancers,,C00-D48", "d,Falls,,W00-W19")
    lines += ("e,Rest,,R00-R99 A00-B99", "g,More,,X00-Y98")
    table = parted(rows())
    parsed = sound(parse([by_cause(table, cause_list="own"), own(*lines)], warn=False))
    chapters = read(table, cause_list="chapters").cells
    named = {
        "a": "circulation",
        "b": "breathing",
        "c": "tumours",
        "e": "ill-defined",
        "d": "external",
    }
    for key, cell in parsed.cells.items():
        other = chapters[key._replace(cause=named.get(key.cause, ""))]
        np.testing.assert_array_equal(cell.values, other.values)
    assert [cause.code for cause in parsed.causes] == ["a", "b", "c", "d", "e", "g"]


def test_what_is_by_cause_leaves_all_causes_as_they_were() -> None:
    plain = parse([deaths(rows())], warn=False)
    found = read(parted(rows()))
    same(plain, without_causes(found))


def test_causes_stand_in_the_age_groups_that_all_causes_stand_in() -> None:
    """People aged 45 and over are one group: so are the deaths, of each cause and of all."""
    people = [
        "area,year,sex,age,population",
        *(
            f"{area},{year},{sex},{age},9000"
            for area, sex, year in PLACES
            for age in ("0-14", "15-44", "45+")
        ),
    ]
    mapping = replace(COLUMNS, deaths="")
    alone = Handed("population", "people.csv", "\n".join(people).encode(), mapping)
    table = tables(np.random.default_rng(1))
    cells = parse([by_cause(table), alone], warn=False).cells
    fine = read(table).cells
    assert {key for key in cells if key.measure == "deaths"} == set(fine)
    for key, cell in fine.items():
        first, second, third, fourth = cell.values
        assert cells[key].grid.starts == (0, 15, 45)
        assert cells[key].values.tolist() == [first, second, third + fourth]
