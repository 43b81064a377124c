"""The tables of a trend page: years by series as printed, and every estimate in long form."""

import numpy as np

from engine.estimates import Estimate
from server.exports import status
from server.exports.table import Cell, Column, Row, Table
from server.pages import breaks as of_breaks
from server.pages.cells import columns, triple
from server.results.questions import PopulationYear
from server.results.series import Series
from server.sentences import breaks as say
from server.sentences import names
from server.sentences.text import _


def years(found: Series) -> Table:
    """One row a year, the newest first; one column a series, under the name of its area."""
    unit = found.indicator.unit
    heads = [Column("year", _("year"))]
    for area, sex in found.lines:
        heads.append(
            Column(
                f"{area}.{sex}",
                names.sex(sex),
                decimals=unit.decimals,
                span=found.holdings.name(area),
            )
        )
    rows = []
    for at in reversed(range(len(found.periods))):
        cells: list[Cell] = [found.periods[at]]
        cells += [_triple(found, line, at)[0] for line in range(len(found.lines))]
        provisional = any(status[at] == "provisional" for status in found.status)
        here = [one for one in found.broken if one.period == found.periods[at]]
        own = tuple(mark(found, line, at) for line in range(len(found.lines)))
        rows.append(
            Row(tuple(cells), provisional=provisional, second=say.second(here), marks=("", *own))
        )
    label = _(found.indicator.label)
    return Table("years", f"{label}, {_(unit.label)}", tuple(heads), tuple(rows))


def estimates(found: Series) -> Table:
    """One row an area, sex and year, with interval and status: for machines, and for the intervals
    that the printed table has no room for."""
    unit = found.indicator.unit
    heads = (
        Column("area", _("area")),
        Column("sex", _("sex")),
        Column("year", _("year")),
        *columns("value", _(found.indicator.label), unit.decimals, unit=_(unit.label)),
        Column("status", _("status")),
    )
    rows = []
    for line, (area, sex) in enumerate(found.lines):
        for at, period in enumerate(found.periods):
            cells: tuple[Cell, ...] = (area, sex, period, *_triple(found, line, at))
            own = mark(found, line, at)
            one = PopulationYear(area, sex, period)
            rows.append(
                Row(
                    (*cells, found.status[line][at]),
                    revised=one in found.holdings.revised,
                    marks=("", "", "", own, own, own, ""),
                )
            )
    return Table("estimates", _("Every figure with its interval"), heads, tuple(rows))


def mark(found: Series, line: int, at: int) -> str:
    """The mark of one figure (server/exports/status.py)."""
    one = PopulationYear(*found.lines[line], found.periods[at])
    return status.first_of(
        status.BREAK if found.holdings.broken(one) else "",
        status.ESTIMATED if found.protected[line][at] or found.shared_out[line][at] else "",
        status.PROVISIONAL if found.status[line][at] == "provisional" else "",
    )


def breaks(found: Series) -> tuple[Table, ...]:
    """What parts these years, where anything does."""
    return (of_breaks.table(found.broken, found.holdings),) if found.broken else ()


def _triple(found: Series, line: int, at: int) -> tuple[Cell, ...]:
    return triple(found.estimate[line, at], found.indicator.unit, found.settings)


def widest(estimate: Estimate, line: int) -> float:
    """The width of the newest interval there is on a line; nan where there is none."""
    width = (estimate.high - estimate.low)[line]
    known = width[np.isfinite(width)]
    return float(known[-1]) if len(known) else float("nan")
