"""What a trend page says: no direction its interval does not bear out."""

from dataclasses import replace

from hypothesis import given

from engine.estimates import Estimate
from engine.indicators import INDICATORS
from server.sentences import trend as say
from server.sentences.pieces import Sentence, plain
from tests.server.sentences.test_movements import differences, estimate


def words(sentence: Sentence) -> str:
    return plain(sentence).replace("\N{NO-BREAK SPACE}", " ")


def course(change: Estimate, of: str = "e0") -> say.Course:
    return say.Course(
        INDICATORS[of],
        "f",
        "Northlade",
        "1995",
        "2012",
        estimate(77.8),
        estimate(82.0),
        change,
        "2003",
        estimate(1.5, 1.2, 1.8),
        estimate(0.1, -0.2, 0.4),
    )


def test_a_gain_and_how_it_was_spread() -> None:
    one = course(estimate(4.2, 3.9, 4.5))
    assert words(say.answer(one, "Life expectancy at birth", "")) == (
        "Women of Northlade gained 4.2 years of life expectancy at birth between 1995 and 2012"
        " (3.9 to 4.5)."
    )
    assert words(say.halves(one)) == (
        "In the two halves of these years: +1.5 years from 1995 to 2003 (+1.2 to +1.8); no clear"
        " change from 2003 to 2012 (−0.2 to +0.4)."
    )
    assert say.halves(replace(one, middle="")) == ()


def test_other_indicators_rise_and_fall() -> None:
    said = words(say.answer(course(estimate(-0.01, -0.02, -0.005), "H"), "Unevenness", ""))
    assert (
        said == "Unevenness among women of Northlade fell by 0.010 between 1995 and 2012 (0.005 to"
        " 0.020)."
    )


def test_too_few_years_are_said() -> None:
    said = words(say.answer(None, "Life-table median", "men of Tollbay"))
    assert "fewer than two of them have a figure" in said


@given(differences())
def test_no_direction_is_claimed_that_the_interval_does_not_bear_out(change: Estimate) -> None:
    one = course(change)
    said = words(say.answer(one, "Life expectancy at birth", ""))
    if "gained" in said:
        assert change.low > 0
    elif "lost" in said:
        assert change.high < 0
    else:
        assert "No clear change" in said or "how much of that is chance" in said
    other = words(say.others([one]))
    assert ("no clear change" in other) or one.kind in (*say.CLEAR, say.Movement.WITHOUT_INTERVAL)


def test_small_numbers_are_named() -> None:
    assert say.small([]) is None
    told = say.small(["women of Little Auk"])
    assert told is not None
    assert "women of Little Auk" in told[1]


def test_the_finding_gives_each_line_the_year_it_ends_in() -> None:
    women = course(estimate(4.2, 3.9, 4.5))
    men = replace(women, sex="m")
    both = say.finding("Life expectancy", [women, men])
    assert both == (
        "Life expectancy in 2012: 82.0 for women of Northlade and 82.0 for men of Northlade"
    )
    apart = say.finding("Life expectancy", [women, replace(men, last="2009")])
    assert apart.endswith("82.0 for women of Northlade and in 2009 82.0 for men of Northlade")
    assert say.finding("Life expectancy", []) == "Life expectancy"


def test_the_finding_of_many_lines_gives_the_lowest_and_the_highest_end() -> None:
    women = course(estimate(4.2, 3.9, 4.5))
    men = replace(women, sex="m", at_last=estimate(78.1))
    gone = replace(men, area="Tollbay", last="2009", at_last=estimate(70.0))
    assert say.finding("Life expectancy", [women, men, gone]) == (
        "Life expectancy in 2012: from 78.1 for men of Northlade to 82.0 for women of Northlade"
    )


def test_a_figure_not_met_every_day_is_explained() -> None:
    assert "more alike" in words(say.meaning("H"))
    assert say.meaning("e0") == ()
