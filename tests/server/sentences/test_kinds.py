"""Kinds of change, and how small a one could have been seen: no part is named that chance may have
made, and no advice is given that nobody could follow."""

from dataclasses import replace

import numpy as np
import pytest

from engine.estimates import Estimate, Reason
from engine.indicators import INDICATORS
from engine.laws import MAKEHAM_INFANT, fit
from engine.settings import find as named
from engine.shift import ShiftSqueeze
from server.sentences import kinds as say
from server.sentences.pieces import Sentence, plain
from tests.server.sentences.test_movements import estimate

PLAIN, POOLED = named("almanac-1"), named("almanac-1-3-years")
TIMES = 1.959963984540054 + 0.8416212335729143  # of the standard error, for 80 % power at 95 %
FIT = fit(MAKEHAM_INFANT, np.arange(0.5, 90), np.ones(90), np.full(90, 1e3), widths=np.ones(90))


def words(sentence: Sentence) -> str:
    return plain(sentence).replace("\N{NO-BREAK SPACE}", " ")


def parted(**parts: Estimate) -> ShiftSqueeze:
    none = estimate(0.0, -0.1, 0.1)
    every = dict.fromkeys(("shift", "squeeze", "background", "infant", "unexplained"), none) | parts
    total = estimate(sum(float(one.value) for one in every.values()))
    return ShiftSqueeze(
        **every, difference=total, laws=(FIT, FIT), misfits=(np.zeros(()), np.zeros(()))
    )


# ---- kinds ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("key", "said"),
    [
        ("shift", "deaths of old age coming later or earlier (shift): +1.9 years"),
        ("squeeze", "(squeeze): +1.9 years"),
        ("background", "at all ages alike: +1.9 years"),
        ("infant", "in the first year: +1.9 years"),
    ],
)
def test_the_largest_part_is_named_where_chance_leaves_it_clear(key: str, said: str) -> None:
    clear = words(say.told(parted(**{key: estimate(1.9, 1.2, 2.6)})))
    assert "largest part of the difference in life expectancy comes from" in clear
    assert said in clear
    unclear = words(say.told(parted(**{key: estimate(1.9, -0.2, 4.0)})))
    assert "no kind of change stands out" in unclear
    assert "1.9" not in unclear


def test_the_largest_is_so_whatever_its_sign() -> None:
    kinds = parted(shift=estimate(0.8, 0.5, 1.1), infant=estimate(-1.4, -1.9, -0.9))
    assert "in the first year: −1.4 years" in words(say.told(kinds))


def test_what_the_laws_miss_is_no_kind_of_change() -> None:
    kinds = parted(shift=estimate(0.3, 0.1, 0.5), unexplained=estimate(0.9, 0.8, 1.0))
    assert "no kind of change stands out" in words(say.told(kinds))


def test_without_a_law_nothing_is_said() -> None:
    none = replace(estimate(np.nan), reason=np.array(Reason.NO_LAW, np.uint8))
    assert say.told(parted(shift=none)) == ()


def test_parts_stand_in_one_order_and_are_all_there() -> None:
    keys = [key for key, _words, _part in say.parts(parted())]
    assert keys == ["shift", "squeeze", "background", "infant", "unexplained"]


def test_ratios_come_about_in_two_ways() -> None:
    uneven = words(say.unevenness(-0.0042, -0.0066))
    assert "−4.2 thousandths" in uneven
    assert "−6.6 because life is longer or shorter" in uneven
    crude = words(say.crude(0.00357, -0.00418))
    assert "+357.0 per 100,000 person-years are owed to older or younger people" in crude
    assert "−418.0 to their death rates" in crude


# ---- the smallest change -------------------------------------------------------------------------


def change(value: float, se: float) -> Estimate:
    return replace(estimate(value, value - 1.96 * se, value + 1.96 * se), se=np.array(se))


def seen(value: float, se: float, *, of: str = "e0", pooled: bool = False) -> str:
    settings = POOLED if pooled else PLAIN
    return words(say.could_be_seen(INDICATORS[of], change(value, se), settings))


def test_beside_an_unclear_change_it_is_said_how_large_one_had_to_be() -> None:
    said = seen(0.3, 0.2)
    assert f"A difference of {TIMES * 0.2:.1f} of a year would have been seen four times" in said
    years = np.ceil((TIMES * 0.2 / 0.3) ** 2)
    assert f"would be seen as often with {years:.0f} years added up on each side" in said


def test_years_that_are_added_up_already_are_counted_in() -> None:
    alone, three = seen(0.3, 0.2), seen(0.3, 0.2, pooled=True)
    assert "with 4 years added up" in alone
    assert "with 12 years added up" in three
    assert alone.split(".")[0] == three.split(".")[0]


@pytest.mark.parametrize("pooled", [False, True])
def test_nobody_is_told_to_add_up_more_than_thirty_years(*, pooled: bool) -> None:
    just = TIMES / np.sqrt(30 / (3 if pooled else 1)) * 1.0001
    assert "with 30 years added up" in seen(just, 1, pooled=pooled)
    for value in (0.95 * just, -0.95 * just, 0.0):
        said = seen(value, 1, pooled=pooled)
        assert "would not be seen even with 30 years added up" in said
        assert "as often" not in said


def test_of_a_clear_change_or_one_without_interval_nothing_is_said() -> None:
    assert seen(0.5, 0.2) == ""
    assert seen(-0.5, 0.2) == ""
    assert say.could_be_seen(INDICATORS["e0"], estimate(0.1), PLAIN) == ()
    assert say.could_be_seen(INDICATORS["e0"], estimate(0.1, -0.3, 0.5), PLAIN) == ()
    assert say.could_be_seen(INDICATORS["e0"], estimate(np.nan), PLAIN) == ()


@pytest.mark.parametrize(
    ("of", "se", "size"),
    [
        ("e0", 0.5, "1.4 years"),
        ("H", 0.002, "0.006"),
        ("asr_esp2013", 1e-4, "28.0 per 100,000 person-years"),
        ("5q0", 1e-3, "2.8 per 1,000 births"),
        ("ageing_rate", 1e-3, "0.3 percentage points"),
    ],
)
def test_the_size_has_the_unit_of_a_change(of: str, se: float, size: str) -> None:
    assert f"A difference of {size} would have been seen" in seen(0.1 * se, se, of=of)


def test_a_size_that_rounds_to_nought_is_given_as_a_bound() -> None:
    assert "A difference of less than 0.1 of a year would" in seen(0.001, 0.01)
    assert "A difference of less than 0.001 would" in seen(1e-5, 1e-4, of="H")
