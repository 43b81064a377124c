"""What is said of a population at other death rates: the change, what it stands for, and what it
would take. Nothing is said of what brings such rates about."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from engine.estimates import Estimate
from engine.indicators import Indicator, Unit
from server.sentences import names
from server.sentences.death_rates import NAMED
from server.sentences.movements import (
    Movement,
    bracketed,
    has_interval,
    limits,
    movement,
    shown,
    size_limits,
    value,
    with_unit,
    years,
)
from server.sentences.numbers import NO_BREAK, number, whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_


def _amount(moved: float, unit: Unit) -> str:
    """The size of a change with its unit."""
    size = abs(unit.scale * moved)
    if unit.key == "years":
        return years(size, unit.decimals)
    return with_unit(number(size, unit.decimals), unit)


def unchanged(who: str, period: str, one: Indicator, now: Estimate, why_not: str) -> Sentence:
    """The answer where no death rate is changed yet."""
    label = names.first_capital(_(names.brief(one.label)))
    if not math.isfinite(float(now.value)):
        return phrase(
            _("{label} of {who} in {year} cannot be given. {why}"),
            label=label, who=who, year=period, why=why_not,
        )  # fmt: skip
    return phrase(
        _(
            "{label} of {who} in {year} was {value} at the death rates there were: change some, and"
            " this page works out what it would be."
        ),
        label=label,
        who=who,
        year=period,
        value=value(float(now.value), one.unit),
    )


@dataclass(frozen=True, slots=True)
class Moved:
    """The indicator asked for now, at the changed rates, and the change."""

    indicator: Indicator
    now: Estimate
    then: Estimate
    change: Estimate

    @property
    def kind(self) -> Movement:
        return movement(self.change, self.indicator.unit)


def answer(who: str, period: str, changes: Sequence[str], of: Moved, why_not: str) -> Sentence:
    """The page's first line; `why_not` says why there is no figure where there is none."""
    unit, kind = of.indicator.unit, of.kind
    made = (
        names.listed(list(changes))
        if len(changes) <= NAMED
        else n_("{count} change of death rates", "{count} changes of death rates", len(changes))
    )
    parts: dict[str, Piece | str] = {
        "changes": made,
        "label": names.inside(_(names.brief(of.indicator.label))),
        "who": who,
        "year": period,
    }
    if kind is Movement.UNKNOWN:
        return phrase(
            _("With {changes}, what {label} of {who} in {year} would be cannot be given. {why}"),
            **parts,
            why=why_not,
        )
    parts |= {"then": value(float(of.then.value), unit), "now": shown(of.now, unit)}
    if of.change.value == 0:
        return phrase(
            _("With {changes}, {label} of {who} in {year} would stay at {then}."), **parts
        )
    if kind is Movement.TOO_SMALL:
        least = _amount(10.0**-unit.decimals / unit.scale, unit)
        return phrase(
            _(
                "With {changes}, {label} of {who} in {year} would move by less than {least}: it"
                " would stay at {then}."
            ),
            **parts,
            least=least,
        )
    parts["amount"] = _amount(float(of.change.value), unit)
    if kind is Movement.NOT_CLEAR:
        return phrase(
            _(
                "With {changes}, {label} of {who} in {year} would be {then} instead of {now}, no"
                " clear change {interval}."
            ),
            **parts,
            interval=bracketed(limits(of.change, unit, signed=True)),
        )
    text = (
        _(
            "With {changes}, {label} of {who} in {year} would be {amount} higher {interval}: {then}"
            " instead of {now}."
        )
        if of.change.value > 0
        else _(
            "With {changes}, {label} of {who} in {year} would be {amount} lower {interval}: {then}"
            " instead of {now}."
        )
    )
    if of.indicator.key == "e0":
        text = (
            _(
                "With {changes}, life expectancy at birth of {who} in {year} would be {amount}"
                " longer {interval}: {then} instead of {now}."
            )
            if of.change.value > 0
            else _(
                "With {changes}, life expectancy at birth of {who} in {year} would be {amount}"
                " shorter {interval}: {then} instead of {now}."
            )
        )
    known = has_interval(of.change)
    size = bracketed(size_limits(of.change, unit)) if known else _("(chance not known)")
    return phrase(text, **parts, interval=size)


def listed(changes: Sequence[str]) -> Sentence:
    """All changes, where the answer only counts them."""
    return phrase(_("Changed: {changes}."), changes="; ".join(changes))


def _deaths_alone(parts: dict[str, str], fewer: float) -> str:
    """Where the table does not tell how many years would have been left."""
    if fewer > 0:
        return n_(
            "Among the people there were in {year} that stands for one death fewer.",
            "Among the people there were in {year} that stands for {deaths} deaths fewer.",
            round(abs(fewer)),
            **parts,
        )
    return n_(
        "Among the people there were in {year} that stands for one death more.",
        "Among the people there were in {year} that stands for {deaths} deaths more.",
        round(abs(fewer)),
        **parts,
    )


def stands_for(period: str, fewer: float, left: float) -> Sentence:
    """Deaths and years of life behind the change, in the year's own population; where some rates
    rise and others fall, the balance."""
    count = abs(fewer)
    if not count >= 0.5:
        return ()
    parts = {"year": period, "deaths": whole(count)}
    if not math.isfinite(left):
        return phrase("{text}", text=_deaths_alone(parts, fewer))
    parts["years"] = whole(abs(left))
    text = (
        n_(
            "Among the people there were in {year} that stands for one death fewer and for {years}"
            " years of life that would have been left at the death rates there were.",
            "Among the people there were in {year} that stands for {deaths} deaths fewer and for"
            " {years} years of life that would have been left at the death rates there were.",
            round(count),
            **parts,
        )
        if fewer > 0
        else n_(
            "Among the people there were in {year} that stands for one death more and for {years}"
            " years of life lost at the death rates there were.",
            "Among the people there were in {year} that stands for {deaths} deaths more and for"
            " {years} years of life lost at the death rates there were.",
            round(count),
            **parts,
        )
    )
    return phrase("{text}", text=text)


def finding_rates(changes: Sequence[str]) -> str:
    """Over the picture of death rates."""
    if len(changes) == 1:
        return _("Death rates as they were, and with {change}", change=changes[0])
    return _("Death rates as they were, and as changed")


def finding_fewer(most: str, share: float, *, fewer: bool) -> str:
    """Over the picture of deaths by age."""
    part = f"{whole(100 * share)}{NO_BREAK}%"
    if fewer:
        return _("Of the deaths fewer {share} are at ages {ages}", share=part, ages=most)
    return _("Of the deaths more {share} are at ages {ages}", share=part, ages=most)


def arithmetic() -> tuple[str, str]:
    return _("Arithmetic"), _(
        "The page says what figures would be at other death rates, not what would bring such rates"
        " about or what they would cost. People are taken to be as many as there were, and all"
        " rates that are not changed as they were."
    )


def one_by_one() -> tuple[str, str]:
    return _("Causes"), _(
        "Those who do not die of one cause are taken to run the risks of all others that everybody"
        " of their age runs. Changes of several causes do not add up exactly."
    )


def both_counted() -> tuple[str, str]:
    return _("Counted in both"), _(
        "Some deaths are part of this population and of the one whose rates stand in. The interval"
        " of the change counts them once."
    )


def by_sex_held() -> tuple[str, str]:
    return _("Benchmark"), _(
        "Women take the death rates of the benchmark’s women and men those of its men, where both"
        " are held by sex; at an age where it has no people, the own rate stays."
    )


def computed() -> tuple[Sentence, ...]:
    """How the page’s own numbers come about."""

    def named(name: str, sentence: str) -> Sentence:
        return phrase("{name} {sentence}", name=Piece(name, emphasis="strong"), sentence=sentence)

    return (
        named(
            _("Changed rates."),
            _(
                "The deaths at the chosen ages, sexes and causes are multiplied, or replaced by the"
                " benchmark’s rates times the person-years there were; changes that meet multiply."
                " From these the whole table is made anew, so that a figure is exact and no"
                " estimate. Deaths before 28 days move as those of the first year do."
            ),
        ),
        named(
            _("First order."),
            _(
                "Beside it stands what the derivatives at the rates there were make of the change;"
                " where the two part, the change is too large to be read off sensitivities. Figures"
                " that jump have none."
            ),
        ),
        named(
            _("Chance."),
            _(
                "The same deaths stand behind a figure before and after, so their chance largely"
                " cancels; the interval of the change is that of the difference. Where a"
                " benchmark’s rates stand in, the chance in its deaths is part of it."
            ),
        ),
        named(
            _("Years of life."),
            _(
                "A death fewer counts with the years that were left on average at its age, at the"
                " death rates there were."
            ),
        ),
    )
