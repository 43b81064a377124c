"""Pages that name suicide, overdose or violence carry the operator's text, or a neutral one."""

import pytest

from server.sentences import care
from server.sentences.pieces import plain
from server.store.records import CARE, Cause

pytestmark = pytest.mark.fast
STROKE, FALLS = Cause("stroke", "Stroke"), Cause("falls", "Falls", kind="external")


@pytest.mark.parametrize("kind", CARE)
def test_each_kind_asks_for_the_text_wherever_it_stands(kind: str) -> None:
    named = [STROKE, Cause("x", "X", care=kind), FALLS]
    assert care.needed(named)
    assert "help line" in plain(care.told(named))


def test_other_causes_do_not() -> None:
    assert not care.needed([STROKE, FALLS])
    assert care.told([STROKE, FALLS]) == ()
    assert care.told([]) == ()


def test_the_operators_text_takes_its_place_as_it_is() -> None:
    named = [Cause("x", "X", care="suicide")]
    neutral = plain(care.told(named))
    with care.helped_by("  Day and night: {116 123}. "):
        assert plain(care.told(named)) == "Day and night: {116 123}."
        assert care.help_line() == "Day and night: {116 123}."
    with care.helped_by(" "):
        assert plain(care.told(named)) == neutral
    assert care.help_line() == ""


def test_it_tells_no_method_ranks_nothing_and_gives_no_cause() -> None:
    text = plain(care.told([Cause("x", "X", care="overdose")])).lower()
    for word in ("hang", "poison", "jump", "drug", "epidemic", "worst", "because", "due to"):
        assert word not in text
