"""The glossary holds every figure and the four marks that are never 0."""

from engine.indicators import INDICATORS
from server.exports.table import GapKind
from server.pages import words


def test_every_figure_is_explained() -> None:
    groups = dict(words.build().groups)
    assert [word for word, _meaning in groups["The figures"]] == [
        one.label for one in INDICATORS.values()
    ]


def test_every_mark_is_explained_once() -> None:
    assert [kind for kind, _name, _meaning in words.build().marks] == list(GapKind)


def test_no_word_is_explained_twice() -> None:
    found = [word for _heading, entries in words.build().groups for word, _meaning in entries]
    assert len(found) == len(set(found))
    assert all(meaning for _heading, entries in words.build().groups for _w, meaning in entries)
