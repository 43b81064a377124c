"""From files to schedules."""

from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from server.intake.mapping import Mapping
from server.intake.parsing import Handed, Parsed, parse
from server.intake.reading import read
from server.intake.recognising.columns import recognise
from server.intake.report import Report
from server.intake.templates import TEMPLATES
from server.store import digests
from server.store.records import Area, Key
from tests.server.intake.cases import SOUND, WOMEN
from tests.server.intake.tables import (
    AGES,
    Row,
    births,
    counts,
    csv,
    deaths,
    persons,
    population,
    rows,
    setting,
    where,
    without,
)

GRID = AgeGrid((0, 1, 5, 15, 45, 65, 85))
WOMEN_2012 = Key("north", "f", "2012", "deaths")


def hashes(parsed: Parsed) -> dict[Key, object]:
    return {key: digests.of_schedule(key, cell) for key, cell in parsed.cells.items()}


def test_each_area_sex_and_year_gets_its_vectors() -> None:
    parsed = parse([counts(SOUND)])
    assert set(parsed.cells) == {
        Key(area, sex, str(year), measure)
        for area in ("north", "south")
        for sex in "fm"
        for year in range(2010, 2015)
        for measure in ("deaths", "person_years")
    }
    cell = parsed.cells[WOMEN_2012]
    assert cell.grid == GRID
    assert cell.values.tolist() == [float(str(row["deaths"])) for row in WOMEN]
    assert cell.status == "final"
    people = parsed.cells[WOMEN_2012._replace(measure="person_years")]
    assert people.values.tolist() == [float(str(row["population"])) for row in WOMEN]


def test_the_order_of_rows_and_the_form_of_the_file_do_not_matter() -> None:
    once = hashes(parse([counts(SOUND)]))
    mixed = [SOUND[place] for place in np.random.default_rng(1).permutation(len(SOUND))]
    content = csv(SOUND)
    for other in (
        [counts(mixed)],
        [population(SOUND), deaths(mixed)],
        [counts(content.replace(b",", b";"))],
        [counts(content.replace(b",", b"\t").replace(b"\n", b"\r\n"))],
        [counts(b"\xef\xbb\xbf" + content)],
        [counts(content.replace(b",f,", b",Women,").replace(b"85+", b'"85 and over"'))],
    ):
        parsed = parse(other)
        assert parsed.problems == ()
        assert hashes(parsed) == once


def test_the_same_bytes_give_the_same_content() -> None:
    files = [counts(SOUND), births(950)]
    assert hashes(parse(files)) == hashes(parse(files))
    assert parse(files).areas == parse(files).areas


def test_counts_are_rounded_to_six_decimals() -> None:
    table = setting(SOUND, WOMEN[:1], population="950.12345678")
    values = parse([counts(table)]).cells[WOMEN_2012._replace(measure="person_years")].values
    assert values[0] == 950.123457
    zero = parse([counts(setting(SOUND, WOMEN[:1], deaths="-0"))]).cells[WOMEN_2012].values[0]
    assert str(zero) == "0.0"


def test_a_number_too_many_decimals_apart_is_the_same_count() -> None:
    near = setting(SOUND, WOMEN[:1], population="950.1000000001")
    exact = setting(SOUND, WOMEN[:1], population="950.1")
    assert hashes(parse([counts(near)])) == hashes(parse([counts(exact)]))


def test_unneeded_columns_are_left_alone() -> None:
    table = [row | {"rate": "?", "remark": "a, b"} for row in SOUND]
    assert hashes(parse([counts(table)])) == hashes(parse([counts(SOUND)]))


@pytest.mark.parametrize(
    ("labels", "starts"),
    [
        ([str(age) for age in range(100)] + ["100+"], range(101)),
        (["0", "1", "5", "10", "15+"], (0, 1, 5, 10, 15)),
        (["<1", "1-4", "5-14", "15 and over"], (0, 1, 5, 15)),
        (["0", "10", "20", "30+"], (0, 10, 20, 30)),
        (["0-14", "15-44", "45+"], (0, 15, 45)),
        (["0+"], (0,)),
    ],
)
def test_grids_as_they_come(labels: list[str], starts: range | tuple[int, ...]) -> None:
    parsed = parse([counts(_of_ages(labels))])
    assert parsed.problems == ()
    assert parsed.cells[Key("a", "f", "2014", "deaths")].grid == AgeGrid(tuple(starts))


@pytest.mark.parametrize(
    ("labels", "key", "row"),
    [
        (["0", "1", "2", "4", "5+"], "gap_of_ages", 5),
        (["0", "1", "5", "15", "20", "25+"], "gap_of_ages", 5),
        (["0", "1", "5", "10", "15", "25+"], "gap_of_ages", 7),
        ([str(age) for age in range(81)] + ["85+"], "gap_of_ages", 83),
        (["0", "1-4", "10+"], "gap_of_ages", 4),
        (["0", "1-4", "4-9", "10+"], "overlap_of_ages", 4),
        (["0", "1-4", "5+", "10+"], "overlap_of_ages", 5),
        (["0", "1", "2", "3"], "no_open_interval", 5),
        (["0", "0", "1+"], "duplicate_cell", 3),
        (["1", "2", "3+"], "ages_start_late", 2),
        (["0", "1", "98", "99+"], "gap_of_ages", 4),
    ],
)
def test_grids_with_a_fault(labels: list[str], key: str, row: int) -> None:
    (problem,) = parse([counts(_of_ages(labels))]).problems
    assert (problem.key, problem.row) == (key, row)


def _of_ages(labels: list[str]) -> list[Row]:
    return [
        {"area": "a", "year": 2014, "sex": "f", "age": age, "deaths": 3, "population": 90}
        for age in labels
    ]


def test_the_last_age_may_be_declared_open() -> None:
    table = _of_ages(["0", "1", "2"])
    parsed = parse([counts(table, last_age_open=True)])
    assert parsed.problems == ()
    assert parsed.cells[Key("a", "f", "2014", "deaths")].grid.labels == ("0", "1", "2+")


def test_a_closed_range_is_not_opened_by_declaration() -> None:
    (problem,) = parse([counts(_of_ages(["0", "1-4", "5-9"]), last_age_open=True)]).problems
    assert problem.key == "no_open_interval"


def test_unlike_grids_meet_in_the_finest_common_one() -> None:
    fine, coarse = _of_ages(["0", "1-4", "5-9", "10+"]), _of_ages(["0-4", "5-9", "10-14", "15+"])
    parsed = parse([deaths(fine), population(coarse)])
    assert [problem.key for problem in parsed.problems] == ["grids_differ"]
    key = Key("a", "f", "2014", "deaths")
    assert parsed.cells[key].grid == AgeGrid((0, 5, 10))
    assert parsed.cells[key].values.tolist() == [6, 3, 3]
    assert parsed.cells[key._replace(measure="person_years")].values.tolist() == [90, 90, 180]


def test_persons_beside_both_sexes_are_not_kept() -> None:
    total = [row | {"sex": "both"} for row in persons(SOUND)]
    parsed = parse([counts(SOUND + total)])
    assert parsed.problems == ()
    assert hashes(parsed) == hashes(parse([counts(SOUND)]))


def test_persons_alone_are_kept() -> None:
    parsed = parse([counts(without(SOUND, where(SOUND, sex="m")), only_sex="p", sex="")])
    assert parsed.problems == ()
    assert {key.sex for key in parsed.cells} == {"p"}


def test_all_ages_together_only_check() -> None:
    total = [
        {
            **row,
            "age": "total",
            "deaths": sum(d + 2 for d, _ in AGES.values()),
            "population": 68_264,
        }
        for row in WOMEN[:1]
    ]
    parsed = parse([counts(SOUND + total)])
    assert parsed.problems == ()
    assert hashes(parsed) == hashes(parse([counts(SOUND)]))


WHOLE = rows(("isle",), times=2)


def test_a_whole_that_is_summed_is_not_kept() -> None:
    parsed = parse([counts(SOUND + WHOLE, whole="isle", whole_name="Isle")])
    assert parsed.problems == ()
    assert hashes(parsed) == hashes(parse([counts(SOUND)]))
    assert parsed.areas == (
        Area("isle", "Isle"),
        Area("north", "", parent="isle"),
        Area("south", "", parent="isle"),
    )


def test_a_whole_that_is_delivered_is_kept() -> None:
    parsed = parse([counts(SOUND + WHOLE, whole="isle", delivered=("isle",))])
    assert parsed.areas[0] == Area("isle", "", delivered=True)
    assert parsed.cells[WOMEN_2012._replace(area="isle")].values[0] == 23 + 33


def test_a_whole_without_rows_is_still_named() -> None:
    parsed = parse([counts(SOUND, whole_name="The Isle")])
    assert parsed.areas[-1] == Area("the-isle", "The Isle")
    assert parsed.whole == "the-isle"


def test_codes_are_made_of_names() -> None:
    table = [row | {"area": f"Nørre {str(row['area']).title()}"} for row in SOUND]
    parsed = parse([counts(table, area="", area_name="area")])
    assert parsed.problems == ()
    assert parsed.areas == (
        Area("norre-north", "Nørre North"),
        Area("norre-south", "Nørre South"),
    )


def test_names_beside_codes_are_kept() -> None:
    table = [row | {"name": str(row["area"]).title()} for row in SOUND]
    assert parse([counts(table, area_name="name")]).areas == (
        Area("north", "North"),
        Area("south", "South"),
    )


def test_codes_that_look_like_numbers_stay_as_written() -> None:
    """Leading zeros are part of a code; nothing is merged, and nothing moves to another code."""
    codes = ("01", "1", "1.0", "1e3", "1000")
    parsed = parse([counts(rows(codes))])
    assert tuple(area.code for area in parsed.areas) == tuple(sorted(codes))
    assert parsed.problems == ()
    assert {key.area for key in parsed.cells} == set(codes)


def test_a_first_row_beyond_what_is_shown_of_it_is_read() -> None:
    table = [row | {"a": "x" * 150_000 if place == 0 else ""} for place, row in enumerate(SOUND)]
    content = csv(table, ("a", *SOUND[0]))
    assert parse([counts(content)]).cells.keys() == parse([counts(SOUND)]).cells.keys()


def test_one_area_for_the_whole_file() -> None:
    table = where(SOUND, area="north")
    parsed = parse([counts(table, area="", only_area_name="North Shore")])
    assert parsed.areas == (Area("north-shore", "North Shore"),)
    assert {key.area for key in parsed.cells} == {"north-shore"}


def test_a_state_stands_in_a_column_or_in_the_mapping() -> None:
    table = [row | {"state": "p" if row["year"] == 2014 else "Final"} for row in SOUND]
    for parsed in (
        parse([counts(table, status="state")]),
        parse([counts(SOUND, provisional_years=("2014",))]),
    ):
        provisional = {key.period for key, cell in parsed.cells.items() if cell.status != "final"}
        assert provisional == {"2014"}


def test_one_provisional_row_makes_its_year_provisional() -> None:
    table = [row | {"state": "f"} for row in SOUND]
    table[-1]["state"] = "p"
    parsed = parse([counts(table, status="state")])
    assert [key for key, cell in parsed.cells.items() if cell.status != "final"] == [
        Key("south", "m", "2014", "deaths"),
        Key("south", "m", "2014", "person_years"),
    ]


def test_stillbirths_and_neonatal_deaths_come_with_births() -> None:
    parsed = parse([counts(SOUND), births(4_000, sex="f", stillbirths=17, neonatal_deaths=9)])
    assert parsed.problems == ()
    for measure, count in (("births", 4_000), ("stillbirths", 17), ("neonatal_deaths", 9)):
        assert parsed.cells[Key("south", "f", "2012", measure)].values.tolist() == [count]


def test_births_are_of_one_age_group_and_of_persons_unless_said() -> None:
    handed = births(950)
    mapping = Mapping(year="year", area="area", births="births")
    parsed = parse([counts(SOUND), replace(handed, mapping=mapping)])
    cell = parsed.cells[Key("north", "p", "2012", "births")]
    assert (cell.grid.starts, cell.values.tolist()) == ((0,), [950.0])


def test_rows_of_two_files_are_both_counted() -> None:
    parsed = parse([deaths(SOUND), population(SOUND)])
    assert (parsed.row_count, parsed.sound_count) == (280, 280)


def test_a_file_that_cannot_be_read_does_not_hide_the_other() -> None:
    bad = deaths(setting(SOUND, WOMEN, sex="x"))
    parsed = parse([bad, Handed("population", "population.csv", b"", Mapping())])
    assert [problem.key for problem in parsed.problems] == ["empty_file", "unknown_sex"]


def test_a_role_comes_once() -> None:
    with pytest.raises(ValueError, match="one file of each role"):
        parse([counts(SOUND), counts(SOUND)])


def test_templates_pass() -> None:
    for roles in (("deaths", "population"), ("deaths", "population", "births")):
        files = []
        for role in roles:
            content = TEMPLATES[role].encode()
            mapping = recognise(read(content, role), role).mapping
            files.append(Handed(role, f"{role}.csv", content, mapping))
        parsed = parse(files)
        assert parsed.problems == ()
        assert parsed.sound_count > 0


def test_the_report_says_what_the_upload_would_become() -> None:
    parsed = parse([counts(SOUND + WHOLE, whole="isle", provisional_years=("2014",)), births(30)])
    report = Report.of(parsed)
    assert (report.rows, report.sound, report.measures) == (
        220,
        220,
        ("births", "deaths", "person_years"),
    )
    assert (report.areas, report.sexes) == (("isle", "north", "south"), ("f", "m", "p"))
    assert (report.periods[0], report.periods[-1], report.provisional) == (
        "2010",
        "2014",
        ("2014",),
    )
    assert report.grids == (GRID.labels,)
    assert (report.whole, report.persons, report.delivered) == ("isle", True, ())
    assert [problem.key for problem in report.warnings] == ["infant_deaths_exceed_births"] * 10
    assert report.errors == ()


def test_a_report_survives_its_text() -> None:
    report = Report.of(parse([counts(setting(SOUND, WOMEN, deaths="1,204"))]))
    assert Report.from_json(report.to_json()) == report
    assert str(Report.from_json(report.to_json()).errors[0]) == str(report.errors[0])


def test_without_warnings_the_counts_and_the_errors_are_the_same() -> None:
    for change in ({}, {"deaths": "9000"}, {"deaths": "x"}):
        table = [row | change if number == 40 else row for number, row in enumerate(SOUND)]
        whole, errors = parse([counts(table)]), parse([counts(table)], warn=False)
        assert errors.errors == whole.errors
        assert hashes(errors) == hashes(whole)
        if "9000" in change.values():
            assert whole.problems
            assert not errors.problems
