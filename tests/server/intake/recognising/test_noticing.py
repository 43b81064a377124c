"""Totals, counts that do not state something, and codes of sexes."""

import pytest

from server.intake.labels import NOT_STATED
from server.intake.mapping import Mapping
from server.intake.reading import read
from server.intake.recognising.columns import recognise
from server.intake.recognising.noticing import Code, Noticed, notice

LONG = "area;year;sex;age;deaths\n"


def noticed(*rows: str, codes: tuple[tuple[str, str], ...] = ()) -> Noticed:
    reading = read((LONG + "\n".join(rows) + "\n").encode(), "a.csv")
    mapping = recognise(reading, "deaths").mapping
    return notice(reading, Mapping(**{**fields(mapping), "sex_codes": codes}))


def fields(mapping: Mapping) -> dict[str, object]:
    return {name: getattr(mapping, name) for name in Mapping.__slots__}


def test_totals_and_what_is_not_stated_are_named_as_they_are_written() -> None:
    found = noticed(
        "N1;2014;f;0;3",
        "N1;2014;m;Alle;3",
        "Insgesamt;2014;Total;1+;4",
        "Unknown;2014;ukendt;Age not stated;1",
    )
    assert found.totals == (("sex", ("Total",)), ("age", ("Alle",)), ("area", ("Insgesamt",)))
    assert found.unstated == (
        ("sex", ("ukendt",)),
        ("age", ("Age not stated",)),
        ("area", ("Unknown",)),
    )
    assert found.whole == "Insgesamt"


def test_a_late_row_is_noticed_too() -> None:
    rows = [f"N1;{year};f;{age};3" for year in range(1900, 2000) for age in ("0", "1+")]
    assert noticed(*rows, "N1;2000;f;unbekannt;3").unstated == (("age", ("unbekannt",)),)


def test_a_file_of_persons_alone_has_no_total_of_sexes() -> None:
    assert noticed("N1;2014;p;0;3", "N1;2014;p;1+;3").totals == ()


@pytest.mark.parametrize(
    ("sexes", "codes"),
    [
        ("fm", ()),
        ("12", (Code("1"), Code("2"))),
        ("HF", (Code("H", "m"),)),  # hommes, femmes
        ("HM", (Code("H", "m"), Code("M", "f"))),  # hombres, mujeres
        ("VM", (Code("V"), Code("M"))),  # vrouwen, mannen; varones, mujeres
        ("fq", (Code("q", asked=False),)),  # a slip
    ],
)
def test_codes_that_differ_between_places_are_asked(sexes: str, codes: tuple[Code, ...]) -> None:
    assert noticed(*(f"N1;2014;{sex};0;3" for sex in sexes)).sexes == codes


def test_a_code_can_say_that_the_sex_is_not_stated() -> None:
    found = noticed("N1;2014;1;0;3", "N1;2014;9;0;3", codes=(("9", NOT_STATED), ("1", "m")))
    assert found.unstated == (("sex", ("9",)),)


def test_an_oldest_group_that_nothing_marks_as_open_is_named() -> None:
    assert noticed("N1;2014;f;98;3", "N1;2014;f;99;3").last_age == "99"
    assert noticed("N1;2014;f;98;3", "N1;2014;f;99+;3").last_age == ""


def test_values_in_headings_count_like_those_in_columns() -> None:
    content = b"year;age;H;F;Total\n2014;0;3;4;7\n2014;1+;3;4;7\n"
    reading = read(content, "a.csv")
    found = notice(reading, recognise(reading, "deaths").mapping)
    assert found.sexes == (Code("H", "m"),)
    assert found.totals == (("sex", ("Total",)),)
