"""Columns are recognised by their headings, then by their values."""

import json
from dataclasses import fields, replace

import pytest

from server.intake.mapping import COLUMNS, Form, Mapping
from server.intake.reading import read
from server.intake.recognising import columns
from server.intake.recognising.columns import Recognised, recognise


def recognised(content: bytes, role: str = "counts") -> dict[str, Recognised]:
    return {known.column: known for known in recognise(read(content, "a.csv"), role).columns}


def test_a_usual_heading_is_enough() -> None:
    recognition = recognise(
        read(b"Year;Sex;Age group;Deaths;Person-years;Rate per 1000\n1974;male;0;3;9;1\n", "a"),
        "counts",
    )
    assert replace(recognition.mapping, form=Form()) == Mapping(
        year="Year", sex="Sex", age="Age group", deaths="Deaths", population="Person-years"
    )
    assert recognition.mapping.form.delimiter == ";"
    assert recognition.columns[0] == Recognised("Year", "year", "sure", columns.BY_HEADING)
    assert recognition.columns[-1] == Recognised("Rate per 1000", "", "not used", columns.RATE)


def test_values_tell_what_headings_do_not() -> None:
    found = recognised(b"Q1,Q2,Q3,Q4,Q5\n1974,male,1-4,3,North\n1974,women,85+,4,South\n", "deaths")
    assert [(found[f"Q{n}"].field, found[f"Q{n}"].confidence) for n in range(1, 6)] == [
        ("year", "likely"),
        ("sex", "likely"),
        ("age", "likely"),
        ("deaths", "likely"),
        ("", "not used"),
    ]


def test_two_numbers_without_a_name_are_not_guessed() -> None:
    found = recognised(b"year,sex,age,a,b\n1974,f,0,3,4\n", "deaths")
    assert found["a"].field == found["b"].field == ""
    assert found["a"].why == columns.UNKNOWN


def test_a_number_named_count_goes_before_others() -> None:
    assert (
        recognised(b"year,sex,age,flag,count\n1974,f,0,3,4\n", "deaths")["count"].field == "deaths"
    )


def test_a_second_column_for_the_same_is_not_used() -> None:
    found = recognised(b"year,period,sex,age,deaths\n1974,1974,f,0,3\n", "deaths")
    assert (found["year"].field, found["period"].field) == ("year", "")
    assert found["period"].why == columns.TAKEN


def test_columns_of_another_kind_of_file_are_not_needed() -> None:
    found = recognised(b"year,sex,age,deaths,population\n1974,f,0,3,9\n", "population")
    assert (found["deaths"].field, found["deaths"].why) == ("", columns.OTHER_COUNT)


def test_a_count_that_says_what_it_is_is_not_taken_for_another() -> None:
    found = recognised(b"year,sex,age,person_years\n1974,f,0,34382.8\n", "deaths")["person_years"]
    assert (found.field, found.why) == ("", columns.OTHER_COUNT)


def test_births_have_no_age() -> None:
    found = recognised(b"year,sex,age,births\n1974,f,20-24,3\n", "births")
    assert (found["age"].field, found["age"].why) == ("", columns.NOT_NEEDED)


def test_a_region_that_is_no_code_is_a_name() -> None:
    codes = recognised(b"region,year,sex,age,deaths\nN1,1974,f,0,3\n", "deaths")
    names = recognised(b"region,year,sex,age,deaths\nNorth Shore,1974,f,0,3\n", "deaths")
    assert (codes["region"].field, names["region"].field) == ("area", "area_name")
    rows = b"".join(b"North,1974,f,%d,3\n" % age for age in range(40))
    late = recognised(
        b"region,year,sex,age,deaths\n" + rows + b"South Shore,1974,f,0,3\n", "deaths"
    )
    assert late["region"].field == "area_name"


WIDE = b"""area;year;sex;0;1-4;5+;Total
N1;2014;f;3;1;90;94
N1;2014;m;4;1;95;100
"""


def test_ages_in_headings_are_taken_for_ages() -> None:
    found = recognise(read(WIDE, "a.csv"), "deaths")
    form = found.mapping.form
    assert (form.across, form.across_number) == (("age",), "deaths")
    assert form.across_columns == (("0", "0"), ("1-4", "1-4"), ("5+", "5+"), ("Total", "Total"))
    assert (found.mapping.area, found.mapping.year, found.mapping.sex) == ("area", "year", "sex")
    assert found.mapping.age == found.mapping.deaths == ""
    assert found.columns[3] == Recognised("0", "", "likely", columns.ACROSS)


def test_a_wide_table_can_be_said_to_be_long() -> None:
    found = recognise(read(WIDE, "a.csv"), "deaths", ())
    assert found.mapping.form.across == found.mapping.form.across_columns == ()


def test_only_the_counts_of_the_role_are_taken_from_headings() -> None:
    content = b"year,age,deaths_m,deaths_f,pop_m,pop_f\n2014,0,3,4,900,901\n"
    form = recognise(read(content, "a.csv"), "deaths").mapping.form
    assert {column for column, *_ in form.across_columns} == {"deaths_m", "deaths_f"}
    both = recognise(read(content, "a.csv"), "counts").mapping.form
    assert len(both.across_columns) == 4


def test_what_the_cells_count_is_not_guessed_without_a_word_for_it() -> None:
    content = b"age,2014,2015\n0,3,4\n1+,5,6\n"
    assert recognise(read(content, "a.csv"), "counts").mapping.form.across_number == ""
    named = recognise(read(content, "population of the isle.csv"), "counts").mapping.form
    assert named.across_number == "population"


def test_columns_of_other_languages_are_known() -> None:
    content = b"Jahr;Geschlecht;Altersgruppe;Kreis;Gestorbene\n2014;m;0-4;Nord 1;3\n"
    found = recognise(read(content, "a.csv"), "deaths").mapping
    assert (found.year, found.sex, found.age) == ("Jahr", "Geschlecht", "Altersgruppe")
    assert (found.area_name, found.deaths) == ("Kreis", "Gestorbene")


def test_a_usual_name_goes_before_one_within_a_heading() -> None:
    found = recognised(b"year,sex,age,total deaths all causes,deaths\n1974,f,0,4,3\n", "deaths")
    assert found["deaths"].field == "deaths"
    assert found["total deaths all causes"].why == columns.TAKEN


def test_counts_may_be_withheld_here_and_there() -> None:
    content = b"year,sex,age,registered deaths 2014\n1974,f,0,3\n1974,f,1,..\n1974,f,2,4\n"
    assert recognised(content, "deaths")["registered deaths 2014"].field == "deaths"


def test_an_unknown_role_is_refused() -> None:
    with pytest.raises(ValueError, match="no role 'dead'; a file is one of counts, deaths"):
        recognise(read(b"a\n1\n", "a"), "dead")


def test_every_reason_is_a_text_without_values() -> None:
    reasons = {known.why for known in recognised(b"year,x,mx\n1974,a b,1\n").values()}
    assert not any("{" in reason for reason in reasons)


FULL = Mapping(
    year="Jahr",
    area_name="Straße",
    whole="isle",
    delivered=("isle", "north"),
    sex_codes=(("1", "m"), ("2", "f")),
    last_age_open=True,
    provisional_years=("2014",),
)


def test_a_mapping_survives_its_text() -> None:
    assert Mapping.from_json(FULL.to_json()) == FULL
    assert Mapping.from_json(Mapping().to_json()) == Mapping()


def test_the_text_of_a_mapping_is_canonical() -> None:
    text = FULL.to_json()
    backwards = dict(reversed(list(json.loads(text).items())))
    assert Mapping.from_json(json.dumps(backwards)).to_json() == text
    assert list(json.loads(text)) == sorted(field.name for field in fields(Mapping))
    assert replace(FULL, last_age_open=False).to_json() != text


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ('{"yeer": "a"}', "'yeer' is no field of a mapping; the fields are year, sex"),
        ('{"year": 3}', "mapping field year is 3; expected str"),
        ('{"last_age_open": "yes"}', "mapping field last_age_open is 'yes'; expected bool"),
        ("[1]", "a mapping is an object of named fields"),
        ('{"delivered": "isle"}', "mapping field delivered is 'isle'; expected a list"),
    ],
)
def test_what_is_no_mapping_is_refused(text: str, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        Mapping.from_json(text)


def test_a_mapping_has_a_field_for_each_column() -> None:
    assert set(COLUMNS) <= {field.name for field in fields(Mapping)}
    assert FULL.column("year") == "Jahr"
