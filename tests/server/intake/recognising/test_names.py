"""The usual names of columns, in eleven languages."""

import pytest

from server.intake.mapping import COLUMNS
from server.intake.recognising.names import (
    is_count,
    is_rate,
    named,
    number_named,
    suggests,
)

HEADINGS = {
    "year": ["Year", "YEAR", "Année", "Jahr", "Año", "Ano", "Anno", "Jaar", "År", "Rok"],
    "sex": ["Sex", "gender", "Sexe", "Geschlecht", "Sexo", "Sesso", "Geslacht", "Køn", "Płeć"],
    "age": [
        *("Age", "Age group", "age_group", "Âge", "Groupe d’âge", "Altersgruppe", "Edad"),
        *("Grupo de edad", "Idade", "Età", "Leeftijd", "Alder", "Åldersgrupp", "Wiek"),
    ],
    "area": ["Area", "Region code", "Kommune", "Provincia", "Gemeente", "Län", "Województwo"],
    "deaths": [
        *("Deaths", "Number of deaths", "Décès", "Gestorbene", "Sterbefälle", "Defunciones"),
        *("Óbitos", "Decessi", "Overledenen", "Døde", "Dødsfald", "Döda", "Zgony"),
    ],
    "population": [
        *("Population", "Person-years", "Bevölkerung", "Población", "População", "Popolazione"),
        *("Bevolking", "Befolkning", "Folketal", "Ludność", "Einwohner"),
    ],
    "births": ["Live births", "Naissances vivantes", "Lebendgeborene", "Nacidos vivos"],
}


@pytest.mark.parametrize(
    ("heading", "field"), [(text, field) for field, texts in HEADINGS.items() for text in texts]
)
def test_usual_headings_are_known(heading: str, field: str) -> None:
    assert named(heading, COLUMNS) == field


def test_a_name_within_a_heading_suggests_a_field() -> None:
    said = {
        "Deaths, all causes": "deaths",
        "Number of deaths (registered)": "deaths",
        "Deaths under 28 days, registered": "neonatal_deaths",
        "Year of birth": "",
        "Colour": "",
        "Mid-year population (thousands)": "population",
        "Age of the deceased": "age",
    }
    assert {heading: suggests(heading, COLUMNS) for heading in said} == said


@pytest.mark.parametrize(
    ("heading", "rate"),
    [
        ("Deaths per 1,000", True),
        ("Death rate (thousands)", True),
        ("Sterbeziffer je 1000", True),
        ("Taux de mortalité", True),
        ("m(x)", True),
        ("Population (thousands)", False),
        ("Population", False),
        ("Operation", False),  # "ratio" is no part of a word
    ],
)
def test_rates_are_heard(heading: str, rate: bool) -> None:
    assert is_rate(heading) == rate


def test_a_number_may_be_named_without_its_matter() -> None:
    assert all(map(is_count, ["Number", "n", "Anzahl", "Wert", "OBS_VALUE", "Total"]))
    assert not any(map(is_count, ["deaths", "number of deaths", ""]))


def test_titles_name_counts() -> None:
    said = ("Table 3: deaths by age", "Bevölkerung am 30. Juni", "Quarterly notes", "pop_2014")
    assert [number_named(title) for title in said] == ["deaths", "population", "", "population"]
