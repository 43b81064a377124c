"""Every check: an upload that trips it and it alone, and clean ones that trip none."""

import json
from pathlib import Path

import pytest

from server.actions.check_upload import with_basis
from server.intake.checks import KINDS
from server.intake.checks.check import LISTED
from server.intake.parsing import Handed, parse
from server.intake.problems import Problem
from server.intake.standing import Standing
from server.store.records import Area, Key
from tests.server.intake.cases import CASES, ONE, SOUND, WOMEN, Case
from tests.server.intake.cause_cases import CAUSE_CASES
from tests.server.intake.doubts import DATA_CASES
from tests.server.intake.list_cases import BASIS_CASES, LIST_CASES
from tests.server.intake.tables import (
    births,
    counts,
    csv,
    deaths,
    persons,
    population,
    rows,
    setting,
    where,
)

HERE = Path(__file__).parent
SENTENCES: dict[str, str] = json.loads((HERE / "sentences.json").read_text(encoding="utf-8"))
EVERY = (*CASES, *DATA_CASES, *LIST_CASES, *BASIS_CASES, *CAUSE_CASES)


def problems(*files: Handed) -> list[Problem]:
    return list(parse(files).problems)


def keys(*files: Handed) -> list[str]:
    return [problem.key for problem in problems(*files)]


@pytest.mark.parametrize("case", EVERY, ids=lambda case: case.key)
def test_a_fault_trips_its_check_and_no_other(case: Case) -> None:
    parsed = parse(case.files(), case.standing)
    if case.basis is not None:
        parsed = with_basis(parsed, case.basis, case.standing or Standing())
    found = parsed.problems
    assert {problem.key for problem in found} == {case.key, *case.also.split()}
    first = next(problem for problem in found if problem.key == case.key)
    assert str(first) == SENTENCES[case.key]
    assert first.severity == KINDS[case.key].severity


def test_every_check_has_a_case() -> None:
    assert [case.key for case in EVERY] == list(KINDS) == list(SENTENCES)


def test_every_kind_says_what_it_means_and_what_to_do() -> None:
    for kind in KINDS.values():
        assert kind.meaning.endswith(".")
        assert kind.remedy.endswith(".")
        assert kind.found
        assert kind.expected


@pytest.mark.parametrize(
    "files",
    [
        [counts(SOUND)],
        [deaths(SOUND), population(SOUND), births(950)],
        [counts(SOUND + rows(("isle",), times=2), whole="isle")],
        [counts(SOUND + rows(("isle",), times=2), whole="isle", delivered=("isle",))],
        [births(0)],
        [population(SOUND)],
    ],
    ids=["one file", "three files", "with the whole", "whole delivered", "births", "population"],
)
def test_clean_uploads_trip_none(files: list[Handed]) -> None:
    parsed = parse(files)
    assert parsed.problems == ()
    assert parsed.sound_count == parsed.row_count > 0


def test_many_rows_with_one_fault_are_one_problem() -> None:
    (problem,) = problems(counts(setting(SOUND, where(SOUND, sex="f"), sex="x")))
    assert (problem.row, problem.last_row, problem.rows) == (2, 134, 70)
    assert problem.rows_worded() == "70 between 2 and 134"
    assert str(problem).startswith("counts.csv, 70 rows between 2 and 134, column sex: found")


def test_rows_in_a_run_are_named_by_their_ends() -> None:
    (problem,) = problems(counts(setting(SOUND, WOMEN, sex="x")))
    assert problem.rows_worded() == "30 to 36"
    assert str(problem).startswith("counts.csv, rows 30 to 36, column sex: found")


def test_beyond_some_different_faults_the_rest_is_counted() -> None:
    table = [row | {"deaths": f"n{number}"} for number, row in enumerate(SOUND)]
    found = problems(counts(table))
    assert len(found) == LISTED + 1
    assert found[-1].others == 140 - LISTED - 1
    assert (found[-1].row, found[-1].last_row, found[-1].rows) == (22, 141, 120)
    assert found[-1].found == "“n20” and 119 other values"


def test_faults_of_all_kinds_come_at_once() -> None:
    table = setting(SOUND, ONE, deaths="1,204")
    table = setting(table, where(table, area="south", sex="m"), sex="x")
    table = setting(table, where(table, area="south", year=2014, age="0"), age="-")
    assert set(keys(counts(table))) == {"thousands_separator", "unknown_sex", "unreadable_age"}


def test_what_is_missing_for_a_fault_is_not_missed_too() -> None:
    assert keys(deaths(SOUND), population(setting(SOUND, ONE, population="?"))) == ["not_a_number"]
    assert keys(deaths(setting(SOUND, ONE, age="old")), population(SOUND)) == ["unreadable_age"]


def test_blank_lines_are_no_rows_but_count_as_lines() -> None:
    content = csv(SOUND).replace(b"\nnorth,2012,f,0", b"\n\n\nnorth,2012,x,0", 1) + b"\n\n"
    parsed = parse([counts(content)])
    assert [problem.row for problem in parsed.problems] == [32]
    assert (parsed.row_count, parsed.sound_count) == (140, 139)


@pytest.mark.parametrize(
    ("text", "key"),
    [
        ("1,204", "thousands_separator"),
        ("1 204", "thousands_separator"),
        ("1.204.000", "thousands_separator"),
        ("12,5", "decimal_comma"),
        ("1,2045", "decimal_comma"),
        ("12 or so", "not_a_number"),
        ("True", "not_a_number"),
        ("NaN", "not_a_number"),
        ("nan", "not_a_number"),
        ("n/a", "not_a_number"),
        ("1_000", "not_a_number"),
        ("0x10", "not_a_number"),
        (" ", "missing_count"),
        ("-1", "negative_count"),
        ("-inf", "negative_count"),
        ("Infinity", "not_finite"),
        ("1e12", "not_finite"),
        ("1e999", "not_finite"),
    ],
)
@pytest.mark.parametrize("picked", [ONE, SOUND], ids=["one row", "all rows"])
def test_what_is_no_count(text: str, key: str, picked: list[dict[str, object]]) -> None:
    assert keys(counts(setting(SOUND, picked, deaths=text))) == [key]


@pytest.mark.parametrize("text", ["642", " 642", "642.0", "6.42e2", "+642", "642."])
def test_what_is_a_count(text: str) -> None:
    parsed = parse([counts(setting(SOUND, ONE, deaths=text))])
    assert parsed.problems == ()
    assert parsed.cells[Key("north", "f", "2012", "deaths")].values[-1] == 642


@pytest.mark.parametrize(
    ("number", "sex", "trips"), [(42, "p", 0), (41, "p", 10), (21, "f", 0), (20, "f", 10)]
)
def test_infants_may_be_as_many_as_were_born(number: int, sex: str, trips: int) -> None:
    table = setting(SOUND, where(SOUND, age="0"), deaths=21)
    found = keys(counts(table), births(number, sex=sex))
    assert found == ["infant_deaths_exceed_births"] * trips


@pytest.mark.parametrize(("number", "trips"), [(21, False), (22, True)])
def test_all_infant_deaths_may_be_before_28_days(number: int, trips: bool) -> None:
    table = setting(SOUND, where(SOUND, age="0"), deaths=21)
    found = keys(counts(table), births(4_000, sex="f", areas=("south",), neonatal_deaths=number))
    assert set(found) == {"neonatal_deaths_exceed_infant_deaths"} if trips else found == []


def test_a_total_may_be_off_by_rounding() -> None:
    people = persons(where(SOUND, area="north", year=2012))
    for extra, trips in ((1, False), (2, True)):
        added = [row | {"population": int(str(row["population"])) + extra} for row in people]
        assert ("persons_differ" in keys(counts(SOUND + added))) == trips


def test_parts_that_stand_in_the_edition_are_not_missed() -> None:
    isle = rows(("isle",), times=2)
    files = [counts(where(SOUND, area="north") + isle, whole="isle", delivered=("isle",))]
    assert {problem.key for problem in parse(files).problems} == {"whole_differs"}
    standing = Standing((Area("isle", "Isle"), Area("south", "South", parent="isle")))
    assert parse(files, standing).problems == ()
