"""Every reason has its sentence."""

import pytest

from engine.estimates import Reason
from engine.indicators import INDICATORS
from engine.settings import find
from server.sentences.reasons import caution, reason


@pytest.mark.parametrize("code", [code for code in Reason if code is not Reason.NONE])
def test_every_reason_is_a_sentence(code: Reason) -> None:
    said = reason(int(code), find("almanac-1"))
    assert said[0].isupper()
    assert said.endswith(".")


def test_numbers_in_it_are_those_of_the_settings() -> None:
    settings = find("almanac-1")
    assert "5,000" in reason(Reason.TOO_FEW_PERSON_YEARS, settings)
    assert "5 %" in reason(Reason.OPEN_GROUP_TOO_LARGE, settings)


def test_an_interval_of_few_deaths_is_said_to_be_wide() -> None:
    for key, people, wide in (
        ("e0", 99_000.0, True),
        ("e0", 101_000.0, False),
        ("imr", 101_000.0, True),
        ("imr", 1_000_001.0, False),
        ("median", 6_000.0, False),  # simulated
    ):
        said = caution(INDICATORS[key], people)
        assert bool(said) is wide
        assert not said or said.endswith(".")
