"""What is said of the deaths at the highest ages, and of where fewer would add a month."""

import pytest

from server.sentences import models as say
from server.sentences.pieces import Sentence, plain
from tests.server.sentences.test_movements import estimate


def words(sentence: Sentence) -> str:
    return plain(sentence).replace("\N{NO-BREAK SPACE}", " ")


def implied(value: float, low: float, high: float) -> str:
    return words(say.implied(estimate(value, low, high), 90, "Isle"))


@pytest.mark.parametrize("limits", [(0.96, 1.06), (1.0, 1.06), (0.96, 1.0)])
def test_deaths_and_people_fit_where_chance_may_have_parted_them(
    limits: tuple[float, float],
) -> None:
    said = implied(1.01, *limits)
    assert "at 90 and over fit together as they do in Isle" in said
    assert "more" not in said
    assert "fewer" not in said


@pytest.mark.parametrize(
    ("value", "low", "high", "said"),
    [
        (1.2, 1.12, 1.29, "imply 20 % more people than were counted (+12 to +29 %)"),
        (0.8, 0.74, 0.86, "imply 20 % fewer people than were counted (−26 to −14 %)"),
        (1.004, 1.002, 1.006, "imply 0.4 % more people than were counted (+0.2 to +0.6 %)"),
    ],
)
def test_where_they_do_not_fit_it_is_said_which_way(
    value: float, low: float, high: float, said: str
) -> None:
    told = implied(value, low, high)
    assert said in told
    assert "set against Isle" in told
    assert "a few per cent tell nothing" in told


def test_fewest_deaths_for_a_month() -> None:
    many = words(say.avoid("0", 41.6, 96.0))
    assert "the group 0 takes fewest for a month of life expectancy: 42 fewer of 96" in many
    few = words(say.avoid("0", 0.4, 21.0))
    assert "one fewer of 21 is more than enough" in few
    assert "0 fewer" not in few
