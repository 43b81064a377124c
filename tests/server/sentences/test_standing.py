"""What is said of a pinned page's edition."""

import datetime as dt

import numpy as np
import pytest

from engine.indicators import INDICATORS
from server.sentences.pieces import Piece, plain
from server.sentences.standing import Headline, superseded, withdrawn

NEWER = Piece("Edition 4 of 2 September 2014", "/there")


@pytest.mark.parametrize(
    ("key", "here", "there", "said"),
    [
        ("e0", 82.03, 82.05, "gives 0.02 more here. Figure: 82.05 there, 82.03 on this page."),
        ("e0", 82.03, 81.9, "gives 0.13 less here. Figure: 81.90 there, 82.03 on this page."),
        ("e0", 82.03, 82.0301, "gives the same here (Figure: 82.03)."),
        ("ageing_rate", 0.1002, 0.1013, "gives 0.11 more here. Figure: 10.13 there, 10.02 on"),
        ("ageing_rate", 0.1, 0.101, "gives 0.1 more here. Figure: 10.1 there, 10.0 on"),
        ("e0", 82.03, np.nan, "has no figure to set beside this one."),
    ],
)
def test_by_how_much_a_newer_edition_moves_the_headline(
    key: str, here: float, there: float, said: str
) -> None:
    sentence = superseded(3, NEWER, Headline("Figure", INDICATORS[key].unit, here, there))
    assert plain(sentence).startswith("This page shows edition 3 and will go on showing it. ")
    assert said in plain(sentence)
    assert NEWER in sentence


def test_a_withdrawn_edition_can_still_be_read() -> None:
    when = dt.date(2013, 6, 3)
    said = plain(withdrawn(2, when, "wrong population base ", None))
    assert said.replace("\N{NO-BREAK SPACE}", " ").startswith(
        "Edition 2 was withdrawn on 3 June 2013: wrong population base. Its figures can still"
    )
    assert said.endswith("No edition stands now.")
    other = withdrawn(2, when, "  ", NEWER)
    assert ": " not in plain(other)
    assert NEWER in other


def test_what_a_revision_moves_is_the_difference_of_what_is_printed() -> None:
    moved = Headline("Figure", INDICATORS["e0"].unit, 74.6449, 76.8351)
    said = plain(superseded(1, NEWER, moved))
    assert "gives 2.20 more here. Figure: 76.84 there, 74.64 on this page." in said
