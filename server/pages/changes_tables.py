"""The tables of what changed between two editions."""

import math
from collections import Counter

from engine import indicators
from engine.indicators import Indicator
from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.results.account import AccountQuestion
from server.results.changes import Altered, Changes
from server.results.headlines import Headline
from server.results.keys import PopulationYear
from server.results.questions import address
from server.sentences import breaks as breaks_say
from server.sentences import changes as say
from server.sentences import names
from server.sentences.numbers import number
from server.sentences.standing import basis_dated, basis_people, basis_population
from server.sentences.text import _
from server.store.records import Area, Break

# small tables, in the order of the page
FURTHER = ("statuses", "areas", "basis", "breaks", "causes")
NOT_HELD = GapKind.NOT_AVAILABLE


def all_(found: Changes, first: str) -> tuple[Table, ...]:
    """Those that have rows; `first` is the indicator of the answer."""
    made = (
        headlines(found, first),
        figures(found, first),
        counts(found),
        statuses(found),
        areas(found),
        basis(found),
        breaks(found),
        causes(found),
    )
    return tuple(table for table in made if table.rows)


def who(found: Changes, of: PopulationYear) -> str:
    """Northlade, men, 2021."""
    return f"{found.name(of.area)}, {names.sex(of.sex)}, {of.period}"


def account(found: Changes, one: Headline) -> str:
    """Where it is told why this figure moved."""
    heading, asked = found.heading, found.question
    question = AccountQuestion(
        one.of, found.then.number, one.key, asked.figures, asked.settings, asked.settings
    )
    return address(heading.collection.code, heading.edition.number, question)


def _whose() -> tuple[Column, ...]:
    return (Column("area", _("area")), Column("sex", _("sex")), Column("year", _("year")))


def _sides(found: Changes, decimals: int | None) -> tuple[Column, ...]:
    then, now = found.then.number, found.heading.edition.number
    return (
        Column("before", _("edition {number}", number=then), decimals=decimals),
        Column("after", _("edition {number}", number=now), decimals=decimals),
    )


def _moved(decimals: int) -> Column:
    return Column("change", _("change"), decimals=decimals, signed=True)


def headlines(found: Changes, key: str) -> Table:
    """One indicator wherever it moved, largest first."""
    of = indicators.find(key)
    decimals = of.unit.decimals + 1  # what a revision moves is small
    return Table(
        "headlines",
        _("{label}, {unit}", label=_(of.label), unit=_(of.unit.label)),
        (*_whose(), *_sides(found, decimals), _moved(decimals)),
        tuple(
            Row(
                (one.of.area, names.sex(one.of.sex), one.of.period, *_amounts(one, of)),
                href=account(found, one),
                shown=found.name(one.of.area),
            )
            for one in found.moves(key)
        ),
        _("Each row leads to why it moved. Change: taken before rounding."),
    )


def figures(found: Changes, but: str) -> Table:
    """Every other indicator wherever it moved."""
    return Table(
        "figures",
        _("Other figures that moved"),
        (
            Column("indicator", _("Indicator")),
            *_whose(),
            *_sides(found, 1),
            _moved(1),
        ),
        tuple(
            Row(
                (
                    one.key,
                    one.of.area,
                    names.sex(one.of.sex),
                    one.of.period,
                    *_amounts(one, of),
                ),
                second=_(of.unit.label),
                href=account(found, one),
                shown=_(names.brief(of.label)),
                decimals=of.unit.decimals + 1,
            )
            for one in found.moved
            if one.key != but
            for of in (indicators.find(one.key),)
        ),
    )


def _amounts(one: Headline, of: Indicator) -> tuple[Cell, ...]:
    return tuple(
        of.unit.scale * float(part)
        if math.isfinite(part)
        else Gap(GapKind.UNDEFINED, _("One of the two editions cannot give it."))
        for part in (one.before, one.after, one.move)
    )


def counts(found: Changes) -> Table:
    """Columns of ages whose numbers are others."""
    return Table(
        "counts",
        _("Counts that are others"),
        (
            *_whose(),
            Column("measure", _("counts")),
            Column("what", _("what befell them")),
            Column("ages", _("age groups"), decimals=0),
            *_sides(found, 0),
            _moved(0),
        ),
        tuple(
            Row(
                (
                    one.key.area,
                    names.sex(one.key.sex),
                    one.key.period,
                    say.measure(one.key.measure),
                    say.kind(one.kind),
                    float(one.ages),
                    *_totals(one),
                ),
                shown=found.name(one.key.area),
            )
            for one in found.numbers
        ),
        _("Totals over all ages; age groups: how many have another number."),
    )


def _totals(one: Altered) -> tuple[Cell, ...]:
    parts = (one.before, one.after, one.after - one.before)
    return tuple(part if math.isfinite(part) else Gap(NOT_HELD) for part in parts)


def statuses(found: Changes) -> Table:
    """Areas, sexes and years that changed from provisional to final, or back."""
    whose: dict[PopulationYear, list[Altered]] = {}
    for one in found.statuses:
        whose.setdefault(PopulationYear(one.key.area, one.key.sex, one.key.period), []).append(one)
    moved = {PopulationYear(one.key.area, one.key.sex, one.key.period) for one in found.numbers}
    return Table(
        "statuses",
        _("Statuses that are others"),
        (
            *_whose(),
            Column("measure", _("counts")),
            *_sides(found, None),
            Column("numbers", _("numbers")),
        ),
        tuple(
            Row(
                (
                    of.area,
                    names.sex(of.sex),
                    of.period,
                    names.listed([say.measure(one.key.measure) for one in ones]),
                    *_statuses(ones[0]),
                    _("moved") if of in moved else _("the same"),
                ),
                shown=found.name(of.area),
            )
            for of, ones in whose.items()
        ),
    )


def _statuses(one: Altered) -> tuple[str, str]:
    then, now = (say.status(side.status if side else "") for side in (one.then, one.now))
    return then, now


def areas(found: Changes) -> Table:
    """Areas that are new, gone or placed elsewhere."""

    def place(area: Area | None) -> str:
        if area is None:
            return _("not held")
        part = _("part of {area}", area=found.name(area.parent)) if area.parent else _("the whole")
        return _("{place}, as delivered", place=part) if area.delivered else part

    return Table(
        "areas",
        _("Areas"),
        (Column("area", _("area")), *_sides(found, None)),
        tuple(
            Row(((now or then).code, place(then), place(now)), shown=found.name((now or then).code))  # type: ignore[union-attr]
            for then, now in found.areas
        ),
    )


def basis(found: Changes) -> Table:
    """How the counts are made, where it is another way."""
    worded = {"people": basis_people, "dated_by": basis_dated, "population": basis_population}

    def said(part: str, text: str) -> str:
        if part == "vintage" and not text:
            return _("not named")
        return worded[part](text) if part in worded else text

    return Table(
        "basis",
        _("How the counts are made"),
        (Column("part", _("about")), *_sides(found, None)),
        tuple(
            Row((say.basis_part(part), said(part, then), said(part, now)))
            for part, then, now in found.basis
        ),
    )


def breaks(found: Changes) -> Table:
    """Dated breaks and years of shock."""

    def told(one: Break | None) -> str:
        if one is None:
            return _("none")
        ratio = _("ratio {ratio}", ratio=number(one.ratio, 4)) if one.ratio is not None else ""
        return "; ".join(part for part in (one.note or _("told of"), ratio) if part)

    rows = []
    for then, now in found.breaks:
        one = now or then
        assert one is not None
        rows.append(
            Row(
                (
                    one.period,
                    found.name(one.area) if one.area else _("every area"),
                    breaks_say.kind(one.kind),
                    told(then),
                    told(now),
                )
            )
        )
    return Table(
        "breaks",
        _("Breaks and years of shock"),
        (
            Column("year", _("year")),
            Column("area", _("area")),
            Column("kind", _("what changes")),
            *_sides(found, None),
        ),
        tuple(rows),
    )


def causes(found: Changes) -> Table:
    """How many areas, sexes and years have other deaths by cause, of each cause."""
    counted = Counter(
        (one.key.cause, one.kind) for one in found.by_cause if one.key.measure == "deaths"
    )
    kinds = ("added", "numbers", "groups", "marks", "dropped")
    said = [kind for kind in kinds if any(counted[one.code, kind] for one in found.causes)]
    return Table(
        "causes",
        _("Deaths by cause: areas, sexes and years that are others"),
        (
            Column("cause", _("cause")),
            *(Column(kind, say.kind(kind), decimals=0) for kind in said),
        ),
        tuple(
            Row((one.code, *(float(counted[one.code, kind]) for kind in said)), shown=_(one.label))
            for one in found.causes
            if any(counted[one.code, kind] for kind in said)
        ),
    )
