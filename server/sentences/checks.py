"""What is said of the checks of an upload as such."""

import datetime as dt

from server.sentences.dates import day
from server.sentences.numbers import number, whole
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _

Facts = tuple[tuple[str, str], ...]


def answer(errors: int, warnings: int) -> Sentence:
    return phrase(
        _(
            "Every upload goes through {count} checks: {errors} find what must be put right, "
            "{warnings} what wants a second look."
        ),
        count=whole(errors + warnings),
        errors=whole(errors),
        warnings=whole(warnings),
    )


def lead(lines: int, found: float) -> Sentence:
    """How often they are wrong: findings in so many clean areas, sexes and years."""
    return phrase(
        _(
            "A warning is a question, not a verdict: the figure may be right, and then the note "
            "says why. In {lines} clean areas, sexes and years all checks together found {found}."
        ),
        lines=whole(lines),
        found=whole(round(found)) if found >= 0.5 else _("nothing"),
    )


def measured(when: str) -> Sentence:
    """`when` is an ISO date."""
    return phrase(
        _(
            "Measured on {day}: the whole reading went over clean open counts of Denmark, and over "
            "made-up areas of 10,000 to 1,000,000 persons whose deaths vary as chance has it, or "
            "more."
        ),
        day=day(dt.date.fromisoformat(when)),
    )


def name(key: str) -> str:
    """The name of a check: its key in words."""
    return _(key.replace("_", " ").capitalize())


def facts(meaning: str, why: str, remedy: str, source: str, alarms: str) -> Facts:
    """What a check means, why it is made, what to do, who says so, how often it is wrong."""
    told = [(_("Means"), _(meaning))]
    if why:
        told.append((_("Why"), _(why)))
    told.append((_("What to do"), _(remedy)))
    if source:
        told.append((_("Source"), _(source)))
    return (*told, (_("False alarms"), alarms))


def no_alarm(lines: int) -> str:
    return _("Not one in {lines} clean areas, sexes and years.", lines=whole(lines))


def some_alarms(mean: float, worst: float, where: str) -> str:
    """In 1,000 areas, sexes and years."""
    return _(
        "{mean} in 1,000 clean areas, sexes and years; at worst {worst}, in {data}.",
        mean=_rate(mean),
        worst=_rate(worst),
        data=data(where),
    )


def data(name: str) -> str:
    """The name of clean counts that were looked at."""
    return _(name)


def _rate(value: float) -> str:
    return number(value, 2 if value < 1 else 1)
