"""A file looked at: proposed, answered, remembered."""

from dataclasses import replace

import pytest

from server.intake.mapping import Form, Mapping
from server.intake.parsing import Handed, parse
from server.intake.recognising.look import Before, Looked, Said, look, said_in
from tests.server.intake.workbooks import xlsx

LONG = b"year,sex,age,area,deaths\n2014,f,0,N1,3\n2014,f,1+,N1,90\n"
CODED = b"""year,sex,age,area,deaths
2014,1,0,N1,4
2014,1,1+,N1,1.204
2014,2,0,N1,3
2014,2,1+,N1,999
"""
WIDE = b"""Population in thousands
area,year,age,Males,Females
N1,2014,0,1.2,1.1
N1,2014,1+,30.5,31.0
"""


def answered(content: bytes, role: str, looked: Looked, **changes: object) -> Looked:
    """The page sent back with other answers."""
    shown = looked.mapping.form
    said = replace(said_in(looked.mapping, role), shown=shown, marks="marks" not in looked.open)
    return look(content, "a.csv", role, replace(said, **changes))


def test_a_clear_file_leaves_no_question() -> None:
    looked = look(LONG, "a.csv", "deaths")
    assert looked.open == ()
    assert (looked.mapping.year, looked.mapping.deaths) == ("year", "deaths")
    assert looked.numbers == ("deaths",)


def test_what_can_be_read_in_two_ways_is_asked_until_it_is_answered() -> None:
    looked = look(CODED, "a.csv", "deaths")
    assert looked.open == ("marks", "sexes")
    assert answered(CODED, "deaths", looked).open == ("marks", "sexes")
    once = answered(CODED, "deaths", looked, sex_codes=(("1", "m"), ("2", "f")))
    assert once.open == ("marks",)
    form = replace(looked.mapping.form, decimal=",", thousands=".")
    done = answered(
        CODED, "deaths", looked, marks=True, form=form, sex_codes=(("1", "m"), ("2", "f"))
    )
    assert done.open == ()
    parsed = parse([Handed("deaths", "a.csv", CODED, done.mapping)])
    counts = {key.sex: float(vector.values.sum()) for key, vector in parsed.cells.items()}
    assert counts == {"m": 1208.0, "f": 1002.0}


def test_units_that_a_title_speaks_of_are_asked() -> None:
    looked = look(WIDE, "a.csv", "population")
    assert looked.mapping.form.across == ("sex",)
    assert (looked.units, looked.open) == ((("population", "1000"),), ("units",))
    assert answered(WIDE, "population", looked, units=(("population", "1000"),)).open == ()
    alone = answered(WIDE, "population", looked, units=(("population", "1"),))
    assert (alone.open, alone.mapping.units) == ((), (("population", "1"),))


def test_a_unit_of_one_that_nobody_asked_for_is_not_kept() -> None:
    looked = look(LONG, "a.csv", "deaths")
    assert answered(LONG, "deaths", looked, units=(("deaths", "1"),)).mapping.units == ()


def test_what_holds_no_name_is_asked_for_its_kind() -> None:
    content = b"year,sex,age,x\n2014,f,0,3\n"
    looked = look(content, "a.csv", "deaths")
    assert "kind" in looked.open
    assert "kind" not in answered(content, "deaths", looked, kind="deaths").open


def test_another_row_of_headings_makes_another_table() -> None:
    looked = look(LONG, "a.csv", "deaths")
    form = replace(looked.mapping.form, heading=2)
    again = answered(LONG, "deaths", looked, form=form)
    assert again.changed
    assert again.reading.columns == ("2014", "f", "0", "N1", "3")


def test_another_sign_between_fields_makes_all_else_new() -> None:
    content = b"a title\nyear;sex;age;area;deaths\n2014;f;0;N1;3\n2014;f;1+;N1;4\n"
    looked = look(content, "a.csv", "deaths", Said(form=Form(delimiter=","), shown=Form()))
    assert looked.changed
    again = look(
        content, "a.csv", "deaths", Said(form=Form(delimiter=";"), shown=looked.mapping.form)
    )
    assert again.changed
    assert (again.mapping.form.heading, again.mapping.deaths) == (2, "deaths")


def test_a_table_can_be_said_to_stand_otherwise() -> None:
    looked = look(WIDE, "a.csv", "population")
    again = answered(WIDE, "population", looked, wide=())
    assert again.changed
    assert again.mapping.form.across == ()
    assert not answered(WIDE, "population", looked, wide=("sex",)).changed


def test_the_sheet_is_the_one_that_holds_what_is_asked() -> None:
    row = (2014, "f", "0", "N1", 3)
    people = [("year", "sex", "age", "area", "population"), row]
    deaths = [("year", "sex", "age", "area", "deaths"), row]
    book = xlsx(deaths, name="Deaths", more={"People": people, "Notes": [("by hand",)]})
    assert look(book, "b.xlsx", "population").mapping.form.sheet == "People"
    assert look(book, "b.xlsx", "deaths").mapping.form.sheet == "Deaths"


def stated(content: bytes, role: str, **more: object) -> Mapping:
    """A mapping as it was stated for an earlier edition."""
    return replace(look(content, "a.csv", role).mapping, **more)


def test_a_file_like_the_one_before_is_read_like_it() -> None:
    kept = stated(
        CODED,
        "deaths",
        sex_codes=(("1", "m"), ("2", "f")),
        whole="isle",
        provisional_years=("2014",),
        unstated=(("age", "spread"),),
    )
    later = CODED.replace(b"2014", b"2015")
    looked = look(later, "a.csv", "deaths", before=[Before(3, kept)])
    assert looked.before == Before(3, kept)
    assert looked.lost == ()
    assert looked.mapping.sex_codes == kept.sex_codes
    assert (looked.mapping.whole, looked.mapping.unstated) == ("isle", (("age", "spread"),))
    assert looked.mapping.provisional_years == ()  # of other years
    assert looked.open == ("marks",)  # whether the marks are as they were nobody knows


def test_the_newest_edition_that_fits_goes_before_newer_ones_that_do_not() -> None:
    old, new = stated(LONG, "deaths", whole="isle"), stated(WIDE, "population")
    looked = look(LONG, "a.csv", "deaths", before=[Before(4, new), Before(3, old)])
    assert looked.before is not None
    assert (looked.before.edition, looked.mapping.whole) == (3, "isle")


def test_columns_that_are_gone_are_named() -> None:
    kept = stated(LONG, "deaths", whole="isle")
    looked = look(LONG.replace(b"area", b"district"), "a.csv", "deaths", before=[Before(3, kept)])
    assert looked.lost == (("area", "area"),)
    assert looked.mapping.area == "district"  # recognised anew
    assert looked.mapping.whole == ""


def test_where_no_edition_fits_the_newest_is_compared() -> None:
    kept = stated(LONG, "deaths")
    other = stated(LONG.replace(b"sex", b"gender"), "deaths")
    content = LONG.replace(b"area", b"district")
    looked = look(content, "a.csv", "deaths", before=[Before(4, kept), Before(3, other)])
    assert looked.before == Before(4, kept)
    assert looked.lost == (("area", "area"),)


def test_years_across_are_those_of_the_new_file() -> None:
    old = b"area,sex,age,2014,2015\nN1,f,0,3,4\nN1,f,1+,5,6\n"
    new = b"area,sex,age,2014,2015,2016\nN1,f,0,3,4,5\nN1,f,1+,5,6,7\n"
    looked = look(new, "a.csv", "deaths", before=[Before(1, stated(old, "deaths"))])
    assert looked.lost == ()
    assert [row[0] for row in looked.mapping.form.across_columns] == ["2014", "2015", "2016"]


@pytest.mark.parametrize("content", [b"", b"\0\1", b"x", b"PK\x03\x04", b"a,b\n"])
def test_a_file_that_is_no_table_is_looked_at_all_the_same(content: bytes) -> None:
    looked = look(content, "a.csv", "deaths", before=[Before(1, Mapping())])
    assert looked.open == () or not looked.reading.problems


def test_lists_have_no_questions() -> None:
    assert look(b"code,becomes\nN1,N2\n", "a.csv", "areas").open == ()


def test_a_small_table_is_looked_at_again_with_its_answers() -> None:
    content = b"code,becomes,name\nN1,N2,North\n"
    first = look(content, "a.csv", "areas")
    again = answered(content, "areas", first)
    assert (again.mapping, again.open) == (Mapping(form=first.mapping.form), ())


def test_headings_that_nothing_is_taken_from_may_be_the_same() -> None:
    noted = LONG.replace(b"deaths\n", b"deaths,note,note\n").replace(b"3\n", b"3,,\n")
    noted = noted.replace(b"90\n", b"90,,\n")
    looked = look(noted, "a.csv", "deaths")
    assert not looked.reading.problems
    handed = Handed("deaths", "a.csv", noted, looked.mapping)
    assert "doubled_heading" not in [one.key for one in parse([handed]).problems]
    twice = Handed("deaths", "a.csv", noted, replace(looked.mapping, area_name="note"))
    assert "doubled_heading" in [one.key for one in parse([twice]).problems]


def test_a_small_table_says_each_thing_once() -> None:
    content = b"code,becomes,becomes\nN1,N2,N3\n"
    handed = Handed("areas", "a.csv", content, Mapping())
    assert "doubled_heading" in [one.key for one in parse([handed]).problems]
