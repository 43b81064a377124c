"""Why a figure or its interval is missing, in words."""

import numpy as np

from engine.chance import cautious
from engine.estimates import Reason
from engine.indicator import Indicator
from engine.settings import Settings
from server.sentences.numbers import number, whole
from server.sentences.text import _


def reason(code: int, settings: Settings) -> str:
    """One sentence, for a note under a table or in the place of an answer."""
    share = number(100 * settings.open_share, 0)
    sentences = {
        Reason.NONE: "",
        Reason.NOT_AVAILABLE: _("No counts were delivered for this area, sex and year."),
        Reason.NO_POPULATION: _(
            "Nobody was counted at some ages, and no neighbouring age can stand in for them."
        ),
        Reason.NO_DEATHS_IN_OPEN_GROUP: _(
            "Nobody died in the last, open age group, so that its death rate is not known."
        ),
        Reason.OPEN_GROUP_TOO_LARGE: _(
            "More than {share} % of those born would reach the last, open age group, and how their"
            " deaths are spread over the ages beyond is not known.",
            share=share,
        ),
        Reason.TOO_FEW_PERSON_YEARS: _(
            "Fewer than {least} person-years were lived: too few for this figure to mean anything.",
            least=whole(settings.least_exposure),
        ),
        Reason.AGE_NOT_ON_GRID: _(
            "An age it begins or ends at is not the beginning of an age group here."
        ),
        Reason.MODE_AT_EDGE: _("Deaths have no peak below the last, open age group."),
        Reason.NO_DEATHS: _("Nobody died at the ages it is read from."),
        Reason.TOO_FEW_AGES: _(
            "There are too few age groups, or too few with deaths, to read it from."
        ),
        Reason.NO_SAMPLING_INTERVAL: _(
            "The same deaths are counted on both sides, so that chance plays no part."
        ),
        Reason.NOT_SIMULATED: _("No interval was simulated for it."),
        Reason.WITHHELD: withheld(),
        Reason.OFTEN_LOST: _(
            "No interval can be given: with slightly other deaths it could often not be read."
        ),
        Reason.NO_LAW: _(
            "No law that rises with age fits the death rates from {age} on.", age=settings.fit_from
        ),
        Reason.OPEN_AGE_TOO_LOW: _(
            "The last, open age group begins below {age}: closed by its own death rate, it could"
            " make life expectancy more than a year too long.",
            age=settings.least_open_age,
        ),
        Reason.NO_BIRTHS: _(
            "The births it is counted over, or the deaths around birth it counts, were not handed"
            " in."
        ),
        Reason.NO_WHOLE: _(
            "The area is part of no larger one whose death rates are known at every age, in age"
            " groups as fine."
        ),
        Reason.NO_STANDARD: _(
            "The population whose ages it is weighted by is not held, lacks an age, or has coarser"
            " age groups."
        ),
        Reason.TOO_FEW_DEATHS: _("Too few people died for this figure to mean anything."),
        Reason.ACROSS_A_BREAK: _(
            "The years added up lie on both sides of a break, which no figure crosses."
        ),
        Reason.A_STANDARD: _("It is read off a printed table, in which chance has no part."),
        Reason.NOT_DECOMPOSED: _("No exact share of this difference belongs to an age."),
    }
    return sentences[Reason(code)]


def withheld() -> str:
    """Why a number is not shown that is there."""
    return _(
        "It is withheld: so few deaths that a person might be recognised, or a number from which"
        " such a one could be worked out."
    )


def caution(one: Indicator, person_years: float) -> str:
    """What is said of an interval that is wider than its level; empty where it is not."""
    if not cautious(one, np.array(person_years)):
        return ""
    return _(
        "In a population this small few deaths may decide the figure, and its interval errs on the"
        " safe side: it is wider than its level asks for, never narrower."
    )
