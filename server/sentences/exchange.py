"""What is said of deaths to avoid for a month of life expectancy: arithmetic, no ranking."""

import math

from engine.standardisation import FEW_DEATHS
from engine.whatif_reach import Reach
from server.sentences import names
from server.sentences.movements import bracketed
from server.sentences.numbers import NO_BREAK, interval, number, whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


def answer(who: str, period: str, everywhere: Reach, deaths: float) -> Sentence:
    """The page's first line: what a month takes if it is spread over all ages alike."""
    factor = float(everywhere.factor)
    if not math.isfinite(factor):
        return phrase(
            _(
                "No share of all deaths, taken at all ages alike, makes life expectancy of {who} in"
                " {year} a month longer."
            ),
            who=who,
            year=period,
        )
    low, high = (100 * (1 - float(end)) for end in (everywhere.high, everywhere.low))
    known = math.isfinite(low) and math.isfinite(high)
    return phrase(
        _(
            "To make life expectancy of {who} in {year} a month longer takes {percent} fewer deaths"
            " {interval}, at every age and of every cause alike: {fewer} of {deaths}."
        ),
        who=who,
        year=period,
        percent=f"{number(100 * (1 - factor), 2)}{NO_BREAK}%",
        fewer=whole((1 - factor) * deaths),
        deaths=whole(deaths),
        interval=bracketed(interval(low, high, 2) if known else _("chance not known")),
    )


def no_answer(who: str, period: str, why: str) -> Sentence:
    return phrase(
        _(
            "{who} in {year}: no life expectancy can be given, hence no deaths for a month of it."
            " {why}"
        ),
        who=names.first_capital(who),
        year=period,
        why=why,
    )


def from_to(few: tuple[str, float], many: tuple[str, float], short: int) -> Sentence:
    """At which ages alone the fewest and the most deaths make a month; `short`: at how many ages
    not even all deaths do."""
    text = (
        _(
            "Fewer deaths at one age alone, of those where at least {bound} died: from {few} at"
            " {young} to {many} at {old}. At {short} age groups not even all deaths there were make"
            " a month."
        )
        if short
        else _(
            "Fewer deaths at one age alone, of those where at least {bound} died: from {few} at"
            " {young} to {many} at {old}."
        )
    )
    return phrase(
        text,
        few=_count(few[1]),
        young=few[0],
        many=_count(many[1]),
        old=many[0],
        short=str(short),
        bound=str(FEW_DEATHS),
    )


def _count(deaths: float) -> str:
    return number(deaths, 1 if deaths < 10 else 0)


def finding(short: int) -> str:
    """Over the picture of deaths there were and deaths to avoid."""
    if short:
        return _(
            "Deaths there were at each age, and deaths fewer for a month of life expectancy: where"
            " the second line lies above the first, not even all deaths make a month"
        )
    return _("Deaths there were at each age, and deaths fewer for a month of life expectancy")


def out_of_reach_cause() -> str:
    return _("Not even without all deaths of this cause.")


def arithmetic() -> tuple[str, str]:
    return _("Arithmetic"), _(
        "A death at a young age moves life expectancy more because more years would have been left"
        " on average: that is how the figure is made. It says neither what can be done nor what it"
        " costs, and ranks no lives."
    )


def whichever_cause() -> tuple[str, str]:
    return _("Causes"), _(
        "A death fewer at an age counts the same, of whichever cause: beside how many it takes"
        " stand the deaths of each cause that there were. Those who do not die of one cause are"
        " taken to run the risks of all others."
    )


def computed() -> tuple[Sentence, ...]:
    def named(name: str, sentence: str) -> Sentence:
        return phrase("{name} {sentence}", name=Piece(name, emphasis="strong"), sentence=sentence)

    return (
        named(
            _("Deaths for a month."),
            _(
                "The whole table is made anew with fewer deaths at one age, person-years and all"
                " other ages as they are, until life expectancy is a twelfth of a year longer; not"
                " by its derivative, which would ask for more deaths than there were where these"
                " are few."
            ),
        ),
        named(
            _("At all ages alike."),
            _(
                "The deaths of all ages, or of one cause, are multiplied by one factor until the"
                " month is reached."
            ),
        ),
    )
