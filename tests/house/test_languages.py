"""Languages beside English: each says every text, with the same places to fill in."""

import re

import pytest

from server.sentences.languages import OTHERS, texts, translated
from server.sentences.numbers import as_needed, interval, number, whole
from server.sentences.text import _, n_, speaking
from tests.house.catalogue import everywhere, lacking

pytestmark = pytest.mark.house


@pytest.mark.parametrize("code", OTHERS)
def test_every_text_that_can_be_listed_is_translated(code: str) -> None:
    assert lacking(code) == [], f"python -m tests.house.catalogue {code} lists them"


@pytest.mark.parametrize("code", OTHERS)
def test_a_translation_fills_in_what_the_english_does(code: str) -> None:
    for english, other in texts(code).items():
        places = [sorted(re.findall(r"%?\{[^{}]*\}", one)) for one in (english, other)]
        assert places[0] == places[1], english
        assert [one[:1] == " " for one in (english, other)] in ([False] * 2, [True] * 2), english
        assert [one[-1:] == " " for one in (english, other)] in ([False] * 2, [True] * 2), english


@pytest.mark.parametrize("code", OTHERS)
def test_a_language_has_its_own_words(code: str) -> None:
    same = [
        english
        for english, other in texts(code).items()
        if english == other and len(re.findall(r"[a-z]{3,}", re.sub(r"\{\w+\}", "", english))) > 2
    ]
    assert same == []


def test_the_list_of_texts_knows_all_kinds_of_places() -> None:
    """A call, a plural, a template, a refusal, a registry and a check."""
    listed = everywhere()
    for text in (
        "No clear change from {year}: {value} {interval}.",
        "{count} age groups more than parameters",
        "This page shows edition {shown} and will go on showing it.",
        "Survivors to 65",
        "There is nothing in the file.",
    ):
        assert text in listed


def test_numbers_take_the_signs_of_the_language() -> None:
    with speaking("es"):
        assert number(1234.565, 2) == "1\N{NARROW NO-BREAK SPACE}234,56"
        assert whole(94011.6) == "94\N{NARROW NO-BREAK SPACE}012"
        assert as_needed(1.5) == "1,5"
        assert as_needed(120.0) == "120"
        assert interval(-0.04, 0.38, 1) == "0,0 a 0,4"
    assert number(1234.565, 2) == "1,234.56"


def test_a_text_with_other_numbers_is_the_same_text() -> None:
    assert translated("es", "Life expectancy at 83") == "Esperanza de vida a los 83 años"
    assert (
        translated("es", "Chance of dying between 20 and 40")
        == "Probabilidad de morir entre los 20 y los 40"
    )


def test_what_a_user_wrote_stays() -> None:
    with speaking("es"):
        assert _("Saltmarsh, 14 parishes") == "Saltmarsh, 14 parishes"
        assert n_("one row", "{count} rows", 1) == "una fila"
        assert n_("one row", "{count} rows", 7) == "7 filas"
