"""The glossary holds every figure and the four marks that are never 0."""

import pytest

from engine.indicators import INDICATORS
from server.exports.table import GapKind
from server.pages import words


def test_every_figure_is_explained() -> None:
    figures = [
        word
        for heading, entries in words.build().groups
        if heading.startswith("Figures: ")
        for word, _meaning in entries
    ]
    assert figures == [one.label for one in INDICATORS.values()]


@pytest.mark.parametrize(
    "word",
    [
        *("years added up", "standardised rate", "SMR", "years of life lost", "stillbirths"),
        *("threshold age", "shift and squeeze", "could have been seen", "borrowed rate"),
        *("Gompertz", "Gompertz-Makeham", "Kannisto", "Siler", "smoothed rates"),
    ],
)
def test_the_terms_that_pages_use_are_explained(word: str) -> None:
    entries = [said for _heading, group in words.build().groups for said, _meaning in group]
    assert any(word in said for said in entries)


def test_every_mark_is_explained_once() -> None:
    assert [kind for kind, _name, _meaning in words.build().marks] == list(GapKind)


def test_no_word_is_explained_twice() -> None:
    found = [word for _heading, entries in words.build().groups for word, _meaning in entries]
    assert len(found) == len(set(found))
    assert all(meaning for _heading, entries in words.build().groups for _w, meaning in entries)
