"""What the deaths at the highest ages say of one population, and where fewer would add a month."""

from engine.estimates import Estimate
from engine.standardisation import FEW_DEATHS
from server.sentences.numbers import interval, number, whole
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _


def implied(ratio: Estimate, age: int, whole_area: str) -> Sentence:
    """Whether deaths and people at the highest ages fit together, as in the larger area."""
    percent, low, high = (100 * (float(part) - 1) for part in (ratio.value, ratio.low, ratio.high))
    decimals = 0 if abs(percent) >= 1 else 1
    limits = interval(low, high, decimals, signed=True)
    if low <= 0 <= high:
        return phrase(
            _(
                "Deaths and people at {age} and over fit together as they do in {area}: the people"
                " that the deaths imply are as many as were counted, within what chance can do"
                " ({interval} %)."
            ),
            age=str(age),
            area=whole_area,
            interval=limits,
        )
    text = (
        _(
            "At {age} and over the deaths imply {percent} % more people than were counted"
            " ({interval} %), set against {area}. People or deaths may be miscounted there, or the"
            " very old of this area differ; a few per cent tell nothing."
        )
        if percent > 0
        else _(
            "At {age} and over the deaths imply {percent} % fewer people than were counted"
            " ({interval} %), set against {area}. People or deaths may be miscounted there, or the"
            " very old of this area differ; a few per cent tell nothing."
        )
    )
    size = number(abs(percent), decimals)
    return phrase(text, age=str(age), area=whole_area, percent=size, interval=limits)


def exchange() -> str:
    """How the table of deaths to avoid is to be read."""
    return _(
        "Arithmetic, all other ages as they are: it says neither what can be done nor what it"
        " costs, and ranks no lives."
    )


def out_of_reach() -> str:
    return _("Not even without all deaths of this age.")


def avoid(ages: str, deaths: float, there: float) -> Sentence:
    """Where, among ages that few deaths do not decide, the fewest deaths make a month; in a small
    population not one whole death may do."""
    if deaths < 1:
        return phrase(
            _(
                "Of the age groups with at least {least} deaths, the group {ages} takes fewest for"
                " a month of life expectancy: one fewer of {there} is more than enough, all other"
                " ages as they are."
            ),
            least=whole(FEW_DEATHS),
            ages=ages,
            there=whole(there),
        )
    return phrase(
        _(
            "Of the age groups with at least {least} deaths, the group {ages} takes fewest for a"
            " month of life expectancy: {deaths} fewer of {there}, all other ages as they are."
        ),
        least=whole(FEW_DEATHS),
        ages=ages,
        deaths=whole(deaths),
        there=whole(there),
    )
