"""The tables of a page of causes, from which its pictures and twins are made too."""

import numpy as np

from engine.estimates import Estimate
from engine.indicator import Unit
from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.pages import cause_choices
from server.pages.cells import columns, count, number, triple
from server.results.cause_course import OF as STANDARDISED
from server.results.cause_figures import NUMBERS, PREMATURE, RATES, CauseFigures
from server.sentences import breaks as breaks_say
from server.sentences import causes as say
from server.sentences import names
from server.sentences.text import _

UNITS: dict[str, Unit] = {one.key: one.unit for one in NUMBERS} | {
    one.key: one.unit for one in RATES
}
SHARE = say.PERCENT
CAUSE = "cause"


def years(found: CauseFigures) -> Unit:
    """The unit of years lost and gained: finer where causes are many."""
    return say.FINER if found.each else say.YEARS


def deaths(found: CauseFigures) -> Table:
    """Deaths of each cause, their share, and rates."""
    heads = (
        Column(CAUSE, _("cause")),
        Column("deaths", _("deaths"), decimals=0, counted=True),
        *columns("share", _("share"), 1, unit="%"),
        *columns("rate", _("death rate"), 1, unit=_("per 100,000 person-years")),
        *columns("standardised", _("standardised rate"), 1, unit=_("E2013, per 100,000")),
    )
    rows = tuple(
        _row(
            found,
            at,
            (
                count(float(found.deaths.deaths[at])),
                *_cells(found, found.deaths.share[at], SHARE),
                *_of(found, "cdr", at),
                *_of(found, "asr_esp2013", at),
            ),
        )
        for at in _listed(found)
    )
    total = _total(
        found.panel.deaths.sum(),
        (100.0, "", ""),
        _cells(found, found.all["cdr"], UNITS["cdr"]),
        _cells(found, found.all["asr_esp2013"], UNITS["asr_esp2013"]),
    )
    note = _("Of fewer than 10 deaths there is no standardised rate.")
    return Table("causes", _title(found, _("Deaths by cause")), heads, rows, note, total=total)


def lives(found: CauseFigures) -> Table:
    """What each cause means in a life table."""
    decimals = years(found).decimals
    heads = (
        Column(CAUSE, _("cause")),
        *columns("chance", _("chance of dying of it"), 1, unit=_("per 100 births")),
        *columns("mean_age", _("mean age at death"), 1, unit=_("years")),
        *columns("lost", _("years lost per death"), decimals, unit=_("e-dagger, adds up")),
        *columns("unevenness", _("unevenness"), 3, unit=_("H, adds up")),
        *columns("gain", _("gain without it"), decimals, unit=_("years, does not add up")),
    )
    keys = ("chance", "mean_age", "edagger", "H", "gain")
    rows = tuple(
        _row(found, at, tuple(cell for key in keys for cell in _of(found, key, at)))
        for at in _listed(found)
    )
    all_ = found.all
    total = _total(
        *((100.0, "", ""), _cells(found, all_["e0"], UNITS["mean_age"])),
        *(_cells(found, all_[key], UNITS[key]) for key in ("edagger", "H")),
        ("", "", ""),
    )
    return Table("lives", _title(found, _("Life tables by cause")), heads, rows, total=total)


def premature(found: CauseFigures) -> Table:
    """Deaths before 75."""
    heads = (
        Column(CAUSE, _("cause")),
        Column("deaths", _("deaths before 75"), decimals=0, counted=True),
        *columns("rate", _("standardised rate before 75"), 1, unit=_("E2013, per 100,000")),
        *columns("chance", _("chance of dying of it before 75"), 1, unit=_("per 100 births")),
        *columns("lost", _("years of life lost before 75"), 0, unit=_("per 100,000 person-years")),
    )
    keys = ("asr75_esp2013", "chance75", "yll75")
    own = young_deaths(found)
    rows = tuple(
        _row(
            found,
            at,
            (count(float(own[at])), *(cell for key in keys for cell in _of(found, key, at))),
        )
        for at in _listed(found)
    )
    total = _total(
        own.sum(),
        _cells(found, found.all["asr75_esp2013"], UNITS["asr75_esp2013"]),
        _cells(found, found.all["75q0"], UNITS["chance75"]),
        _cells(found, found.all["yll75"], UNITS["yll75"]),
    )
    title = _title(found, _("Deaths before 75 by cause"))
    return Table("premature", title, heads, rows, total=total)


def young_deaths(found: CauseFigures) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    """Deaths before 75 of each cause, [cause]."""
    young = np.array(found.panel.grid.starts) < PREMATURE
    return np.asarray((found.held.counts.deaths * young).sum(axis=-1))


def by_age(found: CauseFigures) -> Table:
    """Years lost per death by cause and age, which add up."""
    labels = found.panel.grid.labels
    places = _listed(found)
    heads = (
        Column("age", _("age")),
        *(
            Column(found.causes[at].code, cause_choices.name(found.causes[at]), decimals=3)
            for at in places
        ),
        Column("all", _("all causes"), decimals=3),
    )
    rows = tuple(
        Row((label, *(number(float(found.lost[at, x])) for at in places), _sum(found, x)))
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
        Column("codes", _("codes of ICD-10")),
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
        Column("deaths", _("deaths"), decimals=0, counted=True),
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


def _listed(found: CauseFigures) -> tuple[int, ...]:
    """Causes that somebody died of, in the order of what they cost; then the others of the list."""
    first = found.order
    return (*first, *(at for at in range(len(found.causes)) if at not in first))


def _row(found: CauseFigures, at: int, cells: tuple[Cell, ...]) -> Row:
    cause = found.causes[at]
    kinds = {
        "ill_defined": _("says little of what people died of"),
        "pending": _("a cause may still come"),
    }
    return Row(
        (cause.code, *cells), shown=cause_choices.name(cause), second=kinds.get(cause.kind, "")
    )


def _of(found: CauseFigures, key: str, at: int) -> tuple[Cell, ...]:
    return _cells(found, found.estimates[key][at], UNITS[key])


def _cells(found: CauseFigures, one: Estimate, unit: Unit) -> tuple[Cell, ...]:
    return tuple(triple(one, unit, found.settings))


def _total(*parts: object) -> Row:
    """A row of all causes; a number alone is a count."""
    cells: list[Cell] = ["all"]
    for part in parts:
        if isinstance(part, tuple):
            cells += part
        else:
            cells.append(count(float(part)))  # type: ignore[arg-type]
    return Row(tuple(cells), shown=_("all causes"))


def _title(found: CauseFigures, what: str) -> str:
    return _(
        "{what}, {who} in {year}",
        what=what,
        who=names.population(found.of.sex, found.name),
        year=found.period,
    )
