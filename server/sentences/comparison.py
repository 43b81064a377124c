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
    edition: int = 0  # told where both are one population-year of two editions
    table: str = ""  # a printed life table, which stands in the place of people
    brief: str = ""  # the area as a label, where its name is a longer one

    @property
    def _table(self) -> str:
        return _("the {table}", table=self.table) if self.table else ""

    @property
    def who(self) -> str:
        """Inside a sentence, without the year."""
        return self._table or names.population(self.sex, self.area)

    @property
    def at_head(self) -> str:
        return names.first_capital(self._table) or names.population_first(self.sex, self.area)

    @property
    def whole(self) -> str:
        """Inside a sentence, with the year: men of Northlade in 2014."""
        if self.table:
            return self._table
        dated = _("{who} in {year}", who=self.who, year=self.period)
        if not self.edition:
            return dated
        return _("{who}, edition {number}", who=dated, number=self.edition)


@dataclass(frozen=True, slots=True)
class Pair:
    """Both sides, and what they share."""

    this: Named
    that: Named

    @property
    def same_people(self) -> bool:
        """One area and sex: only the year differs."""
        both = (self.this, self.that)
        return len({(one.sex, one.area, one.edition, one.table) for one in both}) == 1

    @property
    def same_year(self) -> bool:
        return self.this.period == self.that.period

    @property
    def revised(self) -> bool:
        """One population-year of two editions."""
        return self.this.edition != self.that.edition

    def short(self, side: Named) -> str:
        """A side as a label: no more words than tell it from the other."""
        if side.table:
            return _("printed table")
        if self.revised:
            return _("edition {number}", number=side.edition)
        parts = []
        if self.this.area != self.that.area:
            parts.append(side.brief or side.area)
        if self.this.sex != self.that.sex or not parts:
            parts.append(names.sex(side.sex))
        if not self.same_year or self.that.table:
            parts.append(side.period)
        return ", ".join(parts)


@dataclass(frozen=True, slots=True)
class Answer:
    """The indicator asked for on both sides, and its difference."""

    indicator: Indicator
    this: Estimate
    that: Estimate
    difference: Estimate
    exact: bool = False  # the same people counted again: chance has no part in the difference

    @property
    def kind(self) -> Movement:
        found = movement(self.difference, self.indicator.unit)
        if not (self.exact and found is Movement.WITHOUT_INTERVAL):
            return found
        unit = self.indicator.unit
        value = unit.scale * float(self.difference.value)
        if number(abs(value), unit.decimals) == number(0, unit.decimals):
            return Movement.TOO_SMALL
        return Movement.MORE if value > 0 else Movement.LESS

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
    if pair.revised:
        return _revision(pair, of, inside)
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


def _revision(pair: Pair, of: Answer, label: str) -> Sentence:
    """Of two editions of one population-year: exact, since the same people were counted again."""
    who = Named(pair.this.sex, pair.this.area, pair.this.period).whole
    sides = {"here": shown(of.this, of.indicator.unit), "there": shown(of.that, of.indicator.unit)}
    editions = {"this": str(pair.this.edition), "that": str(pair.that.edition)}
    if of.kind is Movement.TOO_SMALL:
        return phrase(
            _(
                "Between editions {that} and {this} {label} of {who} did not move as printed:"
                " {here} against {there}. It is a revision, in which chance has no part."
            ),
            label=label,
            who=who,
            **sides,
            **editions,
        )
    text = (
        _(
            "Edition {this} puts {label} of {who} {amount} higher than edition {that}: {here}"
            " against {there}. It is a revision, in which chance has no part."
        )
        if of.difference.value > 0
        else _(
            "Edition {this} puts {label} of {who} {amount} lower than edition {that}: {here}"
            " against {there}. It is a revision, in which chance has no part."
        )
    )
    return phrase(text, label=label, who=who, amount=_amount(of), **sides, **editions)


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
    if pair.that.table:
        return phrase(
            _(
                "{this} in {year} could expect {amount} of life than {that} gives {interval}:"
                " {here} against {there}."
            ),
            year=pair.this.period,
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
    if of.exact and of.kind is Movement.TOO_SMALL:
        return ()
    parts = {
        "here": shown(of.this, of.indicator.unit),
        "there": shown(of.that, of.indicator.unit),
        "this": pair.this.whole if pair.revised or not pair.same_year else pair.this.who,
        "that": pair.that.whole if pair.revised or not pair.same_year else pair.that.who,
    }
    if of.kind in (Movement.NOT_CLEAR, Movement.TOO_SMALL):
        return phrase(
            _(
                "How unequal length of life is did not clearly differ: relative unevenness {here}"
                " against {there}."
            ),
            **parts,
        )
    if pair.that.table:
        text = (
            _(
                "Length of life was less even among {this} than in {that}: relative unevenness"
                " {here} against {there}."
            )
            if of.kind in HIGHER
            else _(
                "Length of life was more even among {this} than in {that}: relative unevenness"
                " {here} against {there}."
            )
        )
        return phrase(text, **parts)
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
