"""Death rates and changes of them in words: which, of whom, at which ages, of which cause."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.sentences import names
from server.sentences.numbers import NO_BREAK, number
from server.sentences.text import _

NAMED = 2  # of several, how many are named


@dataclass(frozen=True, slots=True)
class Changed:
    """One change in words: by how much, of whom, at which ages, of which cause."""

    percent: float
    first: int
    last: int | None  # None: and over
    cause: str = ""  # label; empty: all causes
    sex: str = "p"  # f or m: of these alone


def ages(first: int, last: int | None) -> str:
    """At which ages.

    >>> ages(30, 59), ages(0, None), ages(85, None), ages(0, 0)
    ('at ages 30 to 59', 'at all ages', 'at ages 85 and over', 'at age 0')
    """
    if last is None:
        return _("at all ages") if first == 0 else _("at ages {first} and over", first=first)
    if first == last:
        return _("at age {age}", age=first)
    return _("at ages {first} to {last}", first=first, last=last)


def rates(cause: str = "", sex: str = "p") -> str:
    """Which death rates, inside a sentence."""
    if cause and sex != "p":
        return _("death rates of {who} from {cause}", who=names.sex(sex), cause=names.inside(cause))
    if cause:
        return _("death rates from {cause}", cause=names.inside(cause))
    return _("death rates of {who}", who=names.sex(sex)) if sex != "p" else _("death rates")


def by(percent: float) -> str:
    """How much higher or lower, inside a sentence.

    >>> by(-20).replace(NO_BREAK, " "), by(12.5).replace(NO_BREAK, " "), by(-100), by(0)
    ('20 % lower', '12.5 % higher', 'of nil', 'as they are')
    """
    if percent == -100:
        return _("of nil")
    if percent == 0:
        return _("as they are")
    size = f"{number(abs(percent), _decimals(percent))}{NO_BREAK}%"
    return _("{size} lower", size=size) if percent < 0 else _("{size} higher", size=size)


def _decimals(percent: float) -> int:
    """As many as were typed, at most two."""
    return next(places for places in range(3) if places == 2 or round(percent, places) == percent)


def change(of: Changed) -> str:
    """One change, inside a sentence: death rates 20 % lower at ages 30 to 59."""
    return _(
        "{rates} {by} {ages}", rates=rates(of.cause, of.sex), by=by(of.percent),
        ages=ages(of.first, of.last),
    )  # fmt: skip


def lent(whose: str, where: Changed) -> str:
    """The change to another population's rates, inside a sentence."""
    return _(
        "{rates} of {whose} {ages}",
        rates=_("the {rates}", rates=rates(where.cause)),
        whose=whose,
        ages=ages(where.first, where.last),
    )


def chosen(of: Sequence[Changed]) -> str:
    """The death rates that a target is sought for, inside a sentence."""
    if not of:
        return _("all death rates")
    said = [
        _("{rates} {ages}", rates=rates(one.cause, one.sex), ages=ages(one.first, one.last))
        for one in of
    ]
    return names.listed(said[:NAMED]) if len(said) <= NAMED else _("the death rates chosen")
