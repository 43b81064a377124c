"""What is said of the ages at death on two sides, of the ratio of their death rates, and of how
fast these rise with age."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from server.sentences.comparison import HIGHER, Answer, Pair
from server.sentences.movements import Movement, shown
from server.sentences.numbers import interval, number
from server.sentences.text import _, n_


def spread(of: Answer, pair: Pair) -> str:
    """Finding of the two curves of deaths by age; `of` is years lost per death."""
    parts = {"here": _value(of, this=True), "there": _value(of, this=False)}
    if not all(parts.values()):
        return _("Deaths by age on the two sides")
    if of.exact:
        return _("A death cost {here} years of further life on average, against {there}", **parts)
    if not of.clear:
        return _(
            "How far ages at death lie apart did not clearly differ: a death cost {here} years of"
            " further life on average, against {there}",
            **parts,
        )
    if of.kind in HIGHER:
        return _(
            "Ages at death lie farther apart: a death cost {here} years of further life on"
            " average, against {there}",
            **parts,
        )
    return _(
        "Ages at death lie closer together: a death cost {here} years of further life on average,"
        " against {there}",
        **parts,
    )


def _value(of: Answer, *, this: bool) -> str:
    estimate = of.this if this else of.that
    return shown(estimate, of.indicator.unit) if math.isfinite(float(estimate.value)) else ""


@dataclass(frozen=True, slots=True)
class Telling:
    """The ratio of the death rates of one age group."""

    ages: str
    value: float
    low: float
    high: float
    exact: bool = False  # a revision: no limits are needed

    @property
    def clear(self) -> bool:
        """Beyond chance, and seen after rounding to whole per cents."""
        if number(abs(100 * (self.value - 1)), 0) == "0":
            return False
        if self.exact:
            return True
        return self.low > 1 or self.high < 1


def _least_apart(one: Telling) -> float:
    """How far the rates are apart at the least, as a logarithm: the end of the band nearest 1."""
    if one.exact:
        return abs(math.log(one.value))
    return math.log(one.low) if one.low > 1 else -math.log(one.high)


def ratios(groups: Sequence[Telling], pair: Pair) -> str:
    """At how many ages the rates are clearly apart, and where most surely; in a revision, where
    most. What stands farthest apart is often an age at which few died."""
    if not groups:
        return _("Death rates of the two sides, by age")
    clear = [one for one in groups if one.clear and one.value > 0]
    if not clear:
        return (
            _("Death rates are the same in both editions, as printed, at every age")
            if groups[0].exact
            else _("At no age do the death rates of the two lie clearly apart")
        )
    most = max(clear, key=_least_apart)
    lower = most.value < 1
    percent = _percent(most.value)
    count = n_(
        "Death rates lie clearly apart at {count} of {all} age groups",
        "Death rates lie clearly apart at {count} of {all} age groups",
        len(clear),
        all=len(groups),
    )
    if most.exact:
        count = _(
            "Death rates are others at {count} of {all} age groups",
            count=len(clear),
            all=len(groups),
        )
        return (
            _(
                "{count}, most at {ages}: {percent} lower",
                count=count,
                ages=most.ages,
                percent=percent,
            )
            if lower
            else _(
                "{count}, most at {ages}: {percent} higher",
                count=count,
                ages=most.ages,
                percent=percent,
            )
        )
    limits = _limits(most)
    return (
        _(
            "{count}, most surely at {ages}: {percent} lower ({interval})",
            count=count,
            ages=most.ages,
            percent=percent,
            interval=limits,
        )
        if lower
        else _(
            "{count}, most surely at {ages}: {percent} higher ({interval})",
            count=count,
            ages=most.ages,
            percent=percent,
            interval=limits,
        )
    )


def _percent(ratio: float) -> str:
    return f"{number(abs(100 * (ratio - 1)), 0)}\N{NO-BREAK SPACE}%"


def _limits(one: Telling) -> str:
    ends = sorted(abs(100 * (end - 1)) for end in (one.low, one.high) if math.isfinite(end))
    if len(ends) < 2:
        return _("at least {low}", low=number(ends[0], 0))
    return interval(ends[0], ends[1], 0)


def rise(of: Answer, pair: Pair, span: tuple[int, int]) -> str:
    """Of the rise of death rates with age: never that people age faster, but where progress was
    faster; `of` is the rate of rise."""
    parts = {
        "here": _value(of, this=True),
        "there": _value(of, this=False),
        "first": span[0],
        "last": span[1],
    }
    if of.kind is Movement.UNKNOWN:
        return _("Rise of death rates with age on the two sides")
    if pair.revised:
        return _(
            "From {first} to {last} death rates rise by {here} % with each year of age, against"
            " {there} in the other edition",
            **parts,
        )
    if not of.clear:
        return _(
            "From {first} to {last} the rise of death rates with age did not clearly differ:"
            " {here} against {there} % with each year",
            **parts,
        )
    steeper = of.kind in HIGHER
    if pair.same_people and not pair.same_year:
        younger = steeper == (pair.this.period > pair.that.period)
        return (
            _(
                "Progress was faster at younger ages: from {first} to {last} death rates rise by"
                " {here} % with each year of age, against {there}",
                **parts,
            )
            if younger
            else _(
                "Progress was faster at older ages: from {first} to {last} death rates rise by"
                " {here} % with each year of age, against {there}",
                **parts,
            )
        )
    return (
        _(
            "Set against the other side, death rates compare better at younger ages than at older"
            " ones: from {first} to {last} they rise by {here} % with each year of age, against"
            " {there}",
            **parts,
        )
        if steeper
        else _(
            "Set against the other side, death rates compare better at older ages than at younger"
            " ones: from {first} to {last} they rise by {here} % with each year of age, against"
            " {there}",
            **parts,
        )
    )
