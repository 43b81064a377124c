"""The words of a table."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.intake.areas import code_of, is_code
from server.intake.labels import (
    AGE_NOT_STATED,
    ALL_AGES,
    NOT_STATED,
    Age,
    is_total,
    not_stated,
    read_age,
    read_sex,
    read_status,
    read_year,
)

SAID = {
    Age(0): ["0", "00", "0 år", "0 Jahre", "0 ans", "0 lat", "0¹", "Y0", "age 0", "Alter 0"],
    Age(7): ["7.0", "7", "7,0", "Age 7", "7 years", "7 anni", "7 jaar", "7 jahre *"],
    Age(0, 0): [
        *("<1", "< 1", "Under 1", "under one year", "less than 1 year", "Unter 1 Jahr"),
        *("unter einem Jahr", "moins d'un an", "Moins de 1 an", "- de 1 an", "Menos de 1 año"),
        *("menores de 1 año", "menos de 1 ano", "meno di 1 anno", "jonger dan 1 jaar"),
        *("Under 1 år", "poniżej 1 roku", "Y_LT1", "0-0", "[0,1)", "0-11 months", "<12 months"),
        *("0-364 days", "under 365 days", "0 bis 11 Monate", "0-11 mois"),
    ],
    Age(0, 4): ["0-4", "00-04", "less than 5", "0 to 4", "Y0T4", "0 a 4 anos"],
    Age(1, 4): [
        *("1-4", "01–04", "1 − 4 years", "1 to 4", "1 à 4 ans", "de 1 a 4 años", "1 bis 4"),
        *(
            "1 bis unter 5 Jahre",
            "1 til 4 år",
            "1 tot 5 jaar",
            "1 tot en met 4",
            "1 t/m 4 jaar",
            "1 do 4",
            "1 - <5",
        ),
        *("[1,5)", "12-59 months", "(1-4)", "1-4 2)"),
    ],
    Age(5, 9): ["5 to 9", "5–9 år", "05-09", "5 - 9 lat", "5 a 9", "5 till 9", "Y5-9"],
    Age(85, None, True): [
        *("85+", "85 +", "aged 85 or older", "85 plus", "85 and over", "85 years and over"),
        *("85 ans et plus", "85 et plus", "85 ans ou plus", "85 und älter", "85 Jahre und mehr"),
        *("85 u. m.", "85 u.m.", "85 u. älter", "ab 85", "85 y más", "85 años y más", "85 o más"),
        *("85 anos ou mais", "85 e mais", "85 anni e più", "85 e oltre", "85 jaar of ouder"),
        *("85 en ouder", "85 år og over", "85 år og derover", "85 år eller eldre"),
        *("85 år och äldre", "85 lat i więcej", "≥85", ">= 85", "Y_GE85", "85+ *", "85+¹"),
        *("85 & over", "85 or more", "85 years+"),
    ],
    Age(100, None, True): ["100 u.m.", "≥100", "100 and older", "100 år och äldre"],
    ALL_AGES: [
        *("All ages", "Total", "TOTAL", "Alle", "Ensemble", "Insgesamt", "I alt", "Totalt"),
        *("Total, all ages", "Tous âges", "Todas las edades", "Todas as idades", "Ogółem"),
        *("Tutte le età", "Alle leeftijden", "Zusammen", "Totaal", "Alder i alt"),
    ],
    AGE_NOT_STATED: [
        *("not stated", "unknown", "NS", "Age unknown", "of unknown age", "ukendt", "inconnu"),
        *("unbekannt", "9999", "999", "..", "Âge non déclaré", "edad desconocida", "Ignorada"),
        *("uoplyst alder", "Alter unbekannt", "okänd", "ukjent", "onbekend", "nieznany", "n/a"),
        *("ikke oppgitt", "Non indicato", "não declarado", "Ohne Angabe", "(unknown)"),
    ],
}


@pytest.mark.parametrize(
    ("text", "age"), [(text, age) for age, texts in SAID.items() for text in texts]
)
def test_ages_as_people_write_them(text: str, age: Age) -> None:
    assert read_age(text) == age


@pytest.mark.parametrize(
    "text",
    [
        *("", "4-1", "-5", "131", "1-4-9", "04-Jan", "5.5", "<0", "85++", "1,4", "x1", "1e1"),
        *("0-27 days", "28-364 days", "under 1 month", "1-11 months", "0-7 days"),  # parts of age 0
        *("over 85", ">85", "plus de 85 ans", "über 85", "85-", "841)"),  # 85 or 86, nobody knows
        *("1 and 4", "2014", "male", "1000", "[5,10]", "(5,10]"),
    ],
)
def test_what_is_no_age(text: str) -> None:
    assert read_age(text) is None


@given(start=st.integers(0, 119), width=st.integers(1, 10))
def test_a_group_is_the_same_however_it_is_written(start: int, width: int) -> None:
    last = start + width - 1
    said = [f"{start}-{last}", f"{start:02} – {last:02}", f"{start} to {last} years"]
    said += [f"{start} bis unter {last + 1}", f"[{start},{last + 1})", f"Y{start}T{last}"]
    assert {read_age(text) for text in said} == {Age(start, last)}


@given(start=st.integers(0, 130))
def test_a_last_group_keeps_its_start(start: int) -> None:
    said = [f"{start}+", f"{start} ans et plus", f"{start} or over", f"Y_GE{start}"]
    assert {read_age(text) for text in said} == {Age(start, None, True)}


@pytest.mark.parametrize(
    ("sex", "texts"),
    [
        (
            "f",
            [
                *("f", "F", "female", "Females", "women", "Woman", "w", "K", "Kvinder", "Femmes"),
                *("weiblich", "Frauen", "mujeres", "Mulheres", "femmine", "vrouwen", "kvinnor"),
                *("kvinner", "kobiety", "Sex: female", "féminin"),
            ],
        ),
        (
            "m",
            [
                *("m", "Male", "males", "men", "man", "Mænd", "hommes", "Männer", "männlich"),
                *("hombres", "varones", "Homens", "maschi", "mannen", "män", "menn", "mężczyźni"),
            ],
        ),
        (
            "p",
            [
                *("p", "persons", "total", "Both sexes", "all", " both ", "Insgesamt", "i alt"),
                *("Ensemble", "T", "_T", "Ambos sexos", "beide Geschlechter"),
            ],
        ),
        (NOT_STATED, ["unknown", "Sex not stated", "ukendt", "sexe inconnu", "..", "NA", "_U"]),
        # they mean different things in different places, so they are asked
        (None, ["1", "2", "0", "9", "", "F/M", "x", "mf", "h", "v", "u"]),
    ],
)
def test_sexes_as_people_write_them(sex: str | None, texts: list[str]) -> None:
    assert {text: read_sex(text) for text in texts} == dict.fromkeys(texts, sex)


def test_the_files_own_codes_go_first() -> None:
    codes = (("1", "m"), ("2", "f"), ("W", "m"), ("9", NOT_STATED))
    assert [read_sex(text, codes) for text in ("1", "2", "w", "women", "9")] == [
        *("m", "f", "m", "f", NOT_STATED)
    ]


def test_an_area_is_not_stated_in_words_only() -> None:
    said = [
        "Unknown",
        "Area not stated",
        "Residence unknown",
        "Wohnort unbekannt",
        "sin especificar",
    ]
    assert all(map(not_stated, said))
    assert not any(map(not_stated, ["NA", "NS", "9999", "..", "Unknownton", "North", "", "Total"]))


def test_an_area_that_is_the_sum_is_known_by_its_word() -> None:
    assert all(map(is_total, ["Total", "Insgesamt", "I alt", "Ogółem", "ENSEMBLE"]))
    assert not any(map(is_total, ["North", "", "Denmark", "Allen County", "unknown"]))


def test_years_and_states() -> None:
    assert [read_year(text) for text in ("2014", " 2014.0 ", "14", "3014", "2014/15", "")] == [
        *(2014, 2014, None, None, None, None)
    ]
    said = ("Final", "p", "provisional", "vorläufig", "foreløbige", "définitif", "r", "")
    assert [read_status(text) for text in said] == [
        *("final", *["provisional"] * 4, "final", None, None)
    ]


@pytest.mark.parametrize(
    ("name", "code"),
    [
        ("North Shore", "north-shore"),
        ("Østre Mýrland (north)", "ostre-myrland-north"),
        ("Straße", "strasse"),
        ("x" * 60, "x" * 32),
        ("a" * 31 + " b", "a" * 31),
    ],
)
def test_codes_are_made_of_names(name: str, code: str) -> None:
    assert code_of(name) == code
    assert is_code(code)


def test_a_name_that_cannot_be_folded_still_has_a_code_of_its_own() -> None:
    assert code_of("東の島") != code_of("西の島")
    assert is_code(code_of("東の島"))
