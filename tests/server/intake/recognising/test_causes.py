"""Causes recognised by their heading, by their codes, and across; the list they fall into is
asked."""

from dataclasses import replace

import pytest

from server.intake.reading import read
from server.intake.recognising.causes import are_causes, fallen
from server.intake.recognising.kinds import kind
from server.intake.recognising.look import Before, look, said_in
from tests.server.intake.by_cause import NAMES, parted
from tests.server.intake.tables import csv, rows

TABLE = csv(parted(rows(years=(2014,))), NAMES)


def headed(heading: str) -> bytes:
    return TABLE.replace(b"cause", heading.encode(), 1)


# what the column is called in the offices' own tables
HEADINGS = (
    "cause of death|underlying cause|ICD-10 code|icd10|Cause de décès|Cause initiale|CIM-10|"
    "Todesursache|Todesursache (ICD-10)|Grundleiden|Causa de muerte|Causa básica|CIE-10|"
    "Causa de óbito|Causa básica do óbito|CID-10|Causa di morte|Causa iniziale|Doodsoorzaak|"
    "Primaire doodsoorzaak|Dødsårsag|Dødsårsager|Dødsårsak|Dödsorsak|Przyczyna zgonu"
)


@pytest.mark.parametrize("heading", HEADINGS.split("|"))
def test_a_column_of_causes_is_known_by_its_heading(heading: str) -> None:
    looked = look(headed(heading), "deaths.csv", "deaths")
    assert looked.mapping.cause == heading
    assert next(one for one in looked.columns if one.field == "cause").confidence == "sure"


@pytest.mark.parametrize("heading", ["code", "label", "x17"])
def test_a_column_of_causes_is_known_by_its_codes(heading: str) -> None:
    looked = look(headed(heading), "deaths.csv", "deaths")
    assert (looked.mapping.cause, looked.mapping.area) == (heading, "area")
    assert looked.open == ("cause_list",)


def test_codes_of_areas_and_ages_are_no_causes() -> None:
    assert not are_causes(["E06000001", "W06000002", "S12000005"])
    assert not are_causes(["north", "south", "east"])
    assert not are_causes(["F20", "F30", "M40"])
    assert not are_causes([])
    assert are_causes(["I21.9", "C34", "X64"])
    assert are_causes(["Stroke", "Suicide", "Lung cancer", "all causes"])


def test_only_deaths_may_be_by_cause() -> None:
    looked = look(headed("Todesursache").replace(b"deaths", b"births"), "births.csv", "births")
    assert not looked.mapping.cause
    assert not looked.by_cause


def test_the_list_is_asked_and_remembered() -> None:
    first = look(TABLE, "deaths.csv", "deaths")
    assert first.open == ("cause_list",)
    assert first.fallen is None
    said = replace(said_in(first.mapping, "deaths"), cause_list="short")
    answered = look(TABLE, "deaths.csv", "deaths", said)
    assert answered.open == ()
    kept = look(TABLE, "deaths.csv", "deaths", None, [Before(3, answered.mapping)])
    assert (kept.mapping.cause_list, kept.open) == ("short", ())
    strange = look(TABLE, "deaths.csv", "deaths", replace(said, cause_list="long"))
    assert strange.open == ("cause_list",)


def test_how_the_codes_fall_is_told() -> None:
    found = fallen(
        ("I21.9", "I25", "C34", "all causes", "I00-I99", "E95", "flu", "unknown"), "short"
    )
    assert found is not None
    assert found.leaves == (
        ("Lung cancer", ("C34",)),
        ("Heart attack and ischaemic heart", ("I21.9", "I25")),
    )
    assert (found.placed, found.sums, found.lost) == (3, ("all causes", "I00-I99"), ("E95", "flu"))
    assert fallen(("I21",), "own") is None


def test_causes_across_are_found() -> None:
    content = b"area,year,sex,age,All causes,A00-B99,C00-D48,I00-I99\nn,2014,f,0,9,2,3,4\n"
    looked = look(content, "deaths.csv", "deaths")
    form = looked.mapping.form
    assert (form.across, form.across_number) == (("cause",), "deaths")
    assert [column for column, _ in form.across_columns] == [
        "All causes",
        "A00-B99",
        "C00-D48",
        "I00-I99",
    ]
    assert looked.open == ("cause_list",)


def test_a_list_of_causes_is_no_file_of_counts() -> None:
    assert kind(read(b"code,name,codes\na,Heart,I00-I99\nb,Rest,\n", "list.csv")).role == "causes"
    assert kind(read(b"code,name,deaths\nn,North,4\ns,South,5\n", "list.csv")).role == "deaths"
