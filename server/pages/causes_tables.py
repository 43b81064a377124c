"""The tables of a page of causes, from which its pictures and twins are made too."""

import numpy as np

from engine.estimates import Estimate
from engine.indicator import Unit
from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.pages import cause_choices
from server.pages.cells import columns, count, number, triple, withheld
from server.results.cause_course import OF as STANDARDISED
from server.results.cause_figures import NUMBERS, PREMATURE, RATES, CauseFigures
from server.results.parted import hidden_causes
from server.sentences import breaks as breaks_say
from server.sentences import causes as say
from server.sentences import names
from server.sentences.text import _

UNITS: dict[str, Unit] = {one.key: one.unit for one in NUMBERS} | {
    one.key: one.unit for one in RATES
}
SHARE = say.PERCENT
CAUSE = "cause"
WHOLE: tuple[Cell, ...] = (100.0, "", "")


def years(found: CauseFigures) -> Unit:
    """The unit of years lost and gained: finer where causes are many."""
    return say.FINER if found.each else say.YEARS


def deaths(found: CauseFigures) -> Table:
    """Deaths of each cause, their share, and the years lost per death that go with them."""
    heads = (
        Column(CAUSE, _("cause")),
        Column("deaths", _("deaths"), decimals=0, counted=not found.loaded.protected),
        *columns("share", _("share"), 1, unit="%"),
        *columns("lost", _("years lost per death"), years(found).decimals, unit=_("e-dagger")),
    )
    rows = [
        _row(
            found,
            at,
            (
                count(float(found.deaths.deaths[at])),
                *_cells(found, found.deaths.share[at], SHARE),
                *_of(found, "edagger", at=at),
            ),
        )
        for at in found.order
    ]
    rows.append(
        _total(count(float(found.panel.deaths.sum())), *WHOLE, *_all(found, "edagger", "edagger"))
    )
    note = _("Shares and years lost add up over causes.")
    spread = found.question.causes.spread if found.question.causes else ()
    none = [
        names.inside(cause_choices.name(cause))
        for at, cause in enumerate(found.causes)
        if found.deaths.deaths[at] == 0 and cause.kind not in spread
    ]
    if none:
        note += " " + _("No deaths: {causes}.", causes=names.listed(none))
    return Table("causes", _title(found, _("Deaths by cause")), heads, tuple(rows), note)


def rates(found: CauseFigures) -> Table:
    """Death rates and years of life lost of each cause."""
    heads = (
        Column(CAUSE, _("cause")),
        *columns("rate", _("death rate"), 1, unit=_("per 100,000")),
        *columns("standardised", _("standardised"), 1, unit=_("E2013, per 100,000")),
        *columns("years", _("years of life lost"), 0, unit=_("reference, per 100,000")),
    )
    keys = ("cdr", "asr_esp2013", "yll_ref")
    rows = [_row(found, at, _of(found, *keys, at=at)) for at in found.order]
    rows.append(_total(*(cell for key in keys for cell in _all(found, key, key))))
    note = _(
        "For every 100,000 person-years; E2013 is the European Standard Population 2013. Of fewer"
        " than 10 deaths there is no standardised rate. Years of life lost are against the"
        " reference life table of 2010."
    )
    return Table("rates", _title(found, _("Death rates by cause")), heads, tuple(rows), note)


def lives(found: CauseFigures) -> Table:
    """What each cause means in a life table."""
    heads = (
        Column(CAUSE, _("cause")),
        *columns("chance", _("chance of dying of it"), 1, unit=_("per 100 births")),
        *columns("mean_age", _("mean age at death"), 1, unit=_("years")),
        *columns("gain", _("gain without it"), years(found).decimals, unit=_("years")),
    )
    keys = ("chance", "mean_age", "gain")
    rows = [_row(found, at, _of(found, *keys, at=at)) for at in found.order]
    rows.append(_total(*WHOLE, *_all(found, "e0", "mean_age"), "", "", ""))
    note = _("Gains in life expectancy without a cause do not add up.")
    return Table("lives", _title(found, _("Life tables by cause")), heads, tuple(rows), note)


def unevenness(found: CauseFigures) -> Table:
    """The parts of the relative unevenness of length of life, which add up."""
    heads = (
        Column(CAUSE, _("cause")),
        *columns("unevenness", _("unevenness"), 4, unit=_("H, adds up")),
    )
    rows = [_row(found, at, _of(found, "H", at=at)) for at in found.order]
    rows.append(_total(*_all(found, "H", "H")))
    title = _title(found, _("Unevenness of length of life by cause"))
    return Table("unevenness", title, heads, tuple(rows))


def premature(found: CauseFigures) -> Table:
    """Deaths before 75."""
    heads = (
        Column(CAUSE, _("cause")),
        Column("deaths", _("deaths before 75"), decimals=0, counted=not found.loaded.protected),
        *columns("rate", _("standardised"), 1, unit=_("E2013, per 100,000")),
        *columns("chance", _("chance of dying"), 1, unit=_("per 100 births")),
        *columns("lost", _("years of life lost"), 0, unit=_("per 100,000")),
    )
    keys = ("asr75_esp2013", "chance75", "yll75")
    own = young_deaths(found)
    rows = [
        _row(found, at, (count(float(own[at])), *_of(found, *keys, at=at))) for at in found.order
    ]
    rows.append(
        _total(
            count(float(own.sum())),
            *_all(found, "asr75_esp2013", "asr75_esp2013"),
            *_all(found, "75q0", "chance75"),
            *_all(found, "yll75", "yll75"),
        )
    )
    title = _title(found, _("Deaths before 75 by cause"))
    return Table("premature", title, heads, tuple(rows), _("All before age 75, or under it."))


def young_deaths(found: CauseFigures) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    """Deaths before 75 of each cause, [cause]."""
    young = np.array(found.panel.grid.starts) < PREMATURE
    return np.asarray((found.held.counts.deaths * young).sum(axis=-1))


def by_age(found: CauseFigures) -> Table:
    """Years lost per death by cause and age, which add up."""
    labels = found.panel.grid.labels
    places = found.order
    heads = (
        Column("age", _("age")),
        *(
            Column(found.causes[at].code, cause_choices.name(found.causes[at]), decimals=3)
            for at in places
        ),
        Column("all", _("all causes"), decimals=3),
    )
    hidden = hidden_causes(found.loaded, found.panel.grid, found.causes)
    rows = tuple(
        Row(
            (
                label,
                *(
                    withheld() if hidden[at, x] else number(float(found.lost[at, x]))
                    for at in places
                ),
                _sum(found, x),
            )
        )
        for x, label in enumerate(labels)
    )
    sums = [number(float(found.lost[at].sum())) for at in places]
    total = Row((_("all ages"), *sums, number(float(found.lost.sum()))))
    title = _title(found, _("Years lost per death by cause and age"))
    return Table("ages", title, heads, rows, total=total)


def _sum(found: CauseFigures, x: int) -> Cell:
    return number(float(found.lost[:, x].sum()))


def targets(found: CauseFigures) -> Table:
    """Figures that international targets are stated in."""
    heads = (
        Column("target", _("indicator")),
        *columns("value", _("value"), 1),
        Column("unit", _("unit")),
        Column("codes", _("codes, ICD-10")),
        Column("source", _("source")),
    )
    rows = []
    for one in found.targets:
        of = one.target
        cells: tuple[Cell, ...]
        if one.estimate is None:
            why = Gap(
                GapKind.NOT_AVAILABLE, say.mixed([cause_choices.name(part) for part in one.mixed])
            )
            cells = (why, why, why)
        else:
            cells = _cells(found, one.estimate, of.unit)
        rows.append(
            Row(
                (of.number, *cells, _(of.unit.label), of.codes.replace(" ", ", "), _(of.source)),
                shown=f"{of.number} {_(of.label)}",
                second=cells[0].reason if isinstance(cells[0], Gap) else "",
            )
        )
    return Table("targets", _title(found, _("Figures of targets")), heads, tuple(rows))


def course(found: CauseFigures) -> Table | None:
    """One cause through the years."""
    of = found.course
    if of is None:
        return None
    heads = (
        Column("year", _("year")),
        Column("deaths", _("deaths"), decimals=0, counted=not found.loaded.protected),
        *columns("rate", _("standardised rate"), 1, unit=_("E2013, per 100,000")),
    )
    rows = tuple(
        Row(
            (
                period,
                count(of.deaths[at]),
                *_cells(found, of.estimate[at], STANDARDISED.unit),
            ),
            provisional=of.status[at] == "provisional",
            second=breaks_say.second([one for one in of.breaks if one.period == period]),
        )
        for at, period in enumerate(of.periods)
    )
    title = _("{cause} through the years", cause=cause_choices.name(of.cause))
    return Table("course", title, heads, rows)


def _row(found: CauseFigures, at: int, cells: tuple[Cell, ...]) -> Row:
    cause = found.causes[at]
    unclear = _("says little of what people died of")
    waiting = found.loaded.status == "provisional"
    kinds = {
        "ill_defined": unclear,
        "pending": _("a cause may still come") if waiting else unclear,
    }
    return Row(
        (cause.code, *cells), shown=cause_choices.name(cause), second=kinds.get(cause.kind, "")
    )


def _of(found: CauseFigures, *keys: str, at: int) -> tuple[Cell, ...]:
    """Numbers of one cause, each with its limits."""
    return tuple(
        cell for key in keys for cell in _cells(found, found.estimates[key][at], UNITS[key])
    )


def _all(found: CauseFigures, key: str, unit: str) -> tuple[Cell, ...]:
    """The same number of all causes, in the unit of one by cause."""
    return _cells(found, found.all[key], UNITS[unit])


def _cells(found: CauseFigures, one: Estimate, unit: Unit) -> tuple[Cell, ...]:
    return tuple(triple(one, unit, found.settings))


def _total(*cells: Cell) -> Row:
    return Row(("all", *cells), shown=_("all causes"))


def _title(found: CauseFigures, what: str) -> str:
    return _(
        "{what}, {who} in {year}",
        what=what,
        who=names.population(found.of.sex, found.name),
        year=found.period,
    )
