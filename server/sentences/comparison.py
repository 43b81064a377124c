"""What is said of two population-years: the answer, and the finding of each picture."""

from dataclasses import dataclass

from engine.estimates import Estimate
from engine.indicators import Indicator
from server.sentences import names
from server.sentences.movements import (
    Movement,
    bracketed,
    has_interval,
    limits,
    movement,
    shown,
    size_limits,
    with_unit,
    years,
)
from server.sentences.numbers import number
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _

HARDLY = (Movement.BARELY_MORE, Movement.BARELY_LESS)
HIGHER = (Movement.MORE, Movement.BARELY_MORE)


@dataclass(frozen=True, slots=True)
class Named:
    """One side as sentences call it."""

    sex: str
    area: str  # its name
    period: str

    @property
    def who(self) -> str:
        """Inside a sentence, without the year."""
        return names.population(self.sex, self.area)

    @property
    def at_head(self) -> str:
        return names.population_first(self.sex, self.area)

    @property
    def whole(self) -> str:
        """Inside a sentence, with the year: men of Northlade in 2014."""
        return _("{who} in {year}", who=self.who, year=self.period)


@dataclass(frozen=True, slots=True)
class Pair:
    """Both sides, and what they share."""

    this: Named
    that: Named

    @property
    def same_people(self) -> bool:
        """One area and sex: only the year differs."""
        return (self.this.sex, self.this.area) == (self.that.sex, self.that.area)

    @property
    def same_year(self) -> bool:
        return self.this.period == self.that.period

    def short(self, side: Named) -> str:
        """A side as a label: no more words than tell it from the other."""
        parts = []
        if self.this.area != self.that.area:
            parts.append(side.area)
        if self.this.sex != self.that.sex or not parts:
            parts.append(names.sex(side.sex))
        if not self.same_year:
            parts.append(side.period)
        return ", ".join(parts)


@dataclass(frozen=True, slots=True)
class Answer:
    """The indicator asked for on both sides, and its difference."""

    indicator: Indicator
    this: Estimate
    that: Estimate
    difference: Estimate

    @property
    def kind(self) -> Movement:
        return movement(self.difference, self.indicator.unit)

    @property
    def clear(self) -> bool:
        """The difference goes beyond chance, and is seen after rounding."""
        return self.kind in (Movement.MORE, Movement.LESS, *HARDLY)


def answer(pair: Pair, of: Answer, why_not: str) -> Sentence:
    """The page's first line. `why_not` says why there is no difference where there is none."""
    label = _(names.brief(of.indicator.label))
    inside = names.inside(label)
    if of.kind is Movement.UNKNOWN:
        return phrase(
            _("The difference in {label} between {this} and {that} cannot be given. {why}"),
            label=inside,
            this=pair.this.whole,
            that=pair.that.whole,
            why=why_not,
        )
    if pair.this == pair.that:
        return phrase(
            _(
                "Both sides are {this}: there is nothing to compare. Choose another area, sex or"
                " year."
            ),
            this=pair.this.whole,
        )
    if of.kind in (Movement.NOT_CLEAR, Movement.TOO_SMALL):
        return _no_clear_difference(pair, of, inside)
    parts: dict[str, Piece | str] = {
        "amount": _amount(of),
        "interval": _size(of),
        "here": shown(of.this, of.indicator.unit),
        "there": shown(of.that, of.indicator.unit),
    }
    if of.indicator.key == "e0":
        return _life_expectancy(pair, of, parts)
    text = (
        _(
            "{label} stood {amount} higher for {this} than for {that} {interval}: {here} against"
            " {there}."
        )
        if of.difference.value > 0
        else _(
            "{label} stood {amount} lower for {this} than for {that} {interval}: {here} against"
            " {there}."
        )
    )
    return phrase(text, label=label, this=pair.this.whole, that=pair.that.whole, **parts)


def _no_clear_difference(pair: Pair, of: Answer, label: str) -> Sentence:
    parts: dict[str, Piece | str] = {
        "label": label,
        "value": _amount(of, signed=True),
        "interval": bracketed(limits(of.difference, of.indicator.unit, signed=True)),
    }
    if pair.same_people and pair.this.period > pair.that.period:
        return phrase(
            _(
                "No clear change in {label} among {who} between {first} and {last}: {value}"
                " {interval}."
            ),
            who=pair.this.who,
            first=pair.that.period,
            last=pair.this.period,
            **parts,
        )
    return phrase(
        _("No clear difference in {label} between {this} and {that}: {value} {interval}."),
        this=pair.this.whole,
        that=pair.that.whole,
        **parts,
    )


def _life_expectancy(pair: Pair, of: Answer, parts: dict[str, Piece | str]) -> Sentence:
    more = of.difference.value > 0
    amount = (
        _("{amount} more", amount=parts["amount"])
        if more
        else _("{amount} less", amount=parts["amount"])
    )
    parts = {**parts, "amount": amount, "this": pair.this.at_head, "that": pair.that.who}
    if pair.same_people:
        return phrase(
            _(
                "{this} could expect {amount} of life in {year} than in {other} {interval}: {here}"
                " against {there}."
            ),
            year=pair.this.period,
            other=pair.that.period,
            **parts,
        )
    if pair.same_year:
        return phrase(
            _(
                "{this} in {year} could expect {amount} of life than {that} {interval}: {here}"
                " against {there}."
            ),
            year=pair.this.period,
            **parts,
        )
    return phrase(
        _(
            "{this} in {year} could expect {amount} of life than {that} in {other} {interval}:"
            " {here} against {there}."
        ),
        year=pair.this.period,
        other=pair.that.period,
        **parts,
    )


def _amount(of: Answer, *, signed: bool = False) -> str:
    """The size of the difference with its unit."""
    unit = of.indicator.unit
    if unit.key == "years" and not signed:
        return years(float(of.difference.value), unit.decimals)
    value = unit.scale * float(of.difference.value)
    return with_unit(number(value if signed else abs(value), unit.decimals, signed=signed), unit)


def _size(of: Answer) -> Piece:
    if not has_interval(of.difference):
        return bracketed(_("no interval can be given"))
    text = size_limits(of.difference, of.indicator.unit)
    if of.kind in HARDLY:
        text = _("{interval}, hardly more than chance alone could do", interval=text)
    return bracketed(text)


def evenness(pair: Pair, of: Answer) -> Sentence:
    """Whether lives were of more equal length; `of` is H."""
    if of.kind in (Movement.UNKNOWN, Movement.WITHOUT_INTERVAL):
        return ()
    parts = {
        "here": shown(of.this, of.indicator.unit),
        "there": shown(of.that, of.indicator.unit),
        "this": pair.this.who if pair.same_year else pair.this.whole,
        "that": pair.that.who if pair.same_year else pair.that.whole,
    }
    if of.kind in (Movement.NOT_CLEAR, Movement.TOO_SMALL):
        return phrase(
            _(
                "How unequal length of life is did not clearly differ: relative unevenness {here}"
                " against {there}."
            ),
            **parts,
        )
    later = pair.same_people and pair.this.period > pair.that.period
    texts = {
        (True, True): _(
            "Length of life became less even: relative unevenness rose from {there} to {here}."
        ),
        (True, False): _(
            "Length of life was less even among {this} than among {that}: relative unevenness"
            " {here} against {there}."
        ),
        (False, True): _(
            "Length of life became more even: relative unevenness fell from {there} to {here}."
        ),
        (False, False): _(
            "Length of life was more even among {this} than among {that}: relative unevenness"
            " {here} against {there}."
        ),
    }
    return phrase(texts[of.kind in HIGHER, later], **parts)


def regrouped(sides: list[str], ages: str, open_age: int) -> tuple[str, str]:
    return _("Age groups"), _(
        "The two were counted in different age groups. Both are read on those they share ({ages},"
        " open at {open_age}); regrouped for it: {sides}.",
        ages=ages,
        open_age=open_age,
        sides=names.listed(sides),
    )


def counted_twice(which: str) -> tuple[str, str]:
    return _("Counted in both"), _(
        "The deaths of {which} are part of both sides. The intervals of the differences and of the"
        " ages’ contributions count them once.",
        which=which,
    )
