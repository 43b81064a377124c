"""The table of breaks, and how a chart draws them."""

from collections.abc import Callable, Sequence
from itertools import groupby

from server.charts.chart import Break as Rule
from server.charts.chart import Shock
from server.exports.table import Column, Row, Table
from server.pages import cause_choices
from server.results.holdings import Holdings
from server.sentences import breaks as say
from server.sentences.text import _
from server.store.records import Break


def table(several: Sequence[Break], held: Holdings) -> Table:
    """One row a break or year of shock, by year, with the names of what is held."""
    called = {cause.code: cause_choices.name(cause) for cause in held.causes}
    rows = tuple(
        Row(
            (
                one.period,
                held.name(one.area) if one.area else _("every area"),
                say.kind(one.kind),
                called.get(one.cause, one.cause),
                one.note,
                say.ratio(one),
            )
        )
        for one in several
    )
    columns = (
        Column("year", _("from")),
        Column("area", _("area")),
        Column("kind", _("what changed")),
        Column("cause", _("cause of death")),
        Column("note", _("why")),
        Column("ratio", _("comparability ratio")),
    )
    filled = [
        at
        for at, column in enumerate(columns)
        if column.key not in ("cause", "note", "ratio") or any(row.cells[at] for row in rows)
    ]
    return Table(
        "breaks",
        _("Breaks and years of shock"),
        tuple(columns[at] for at in filled),
        tuple(Row(tuple(row.cells[at] for at in filled)) for row in rows),
        say.note_of_ratios(several),
    )


def rules(
    several: Sequence[Break], drawn: Sequence[str], name: Callable[[str], str]
) -> tuple[Rule, ...]:
    """Vertical rules half a year before the first year of the new kind. Of the areas drawn, one
    that alone has the break is named."""
    found = []
    for (period, kind), same in groupby(several, key=lambda one: (one.period, one.kind)):
        areas = sorted({one.area for one in same})
        own = areas != [""] and set(areas) != set(drawn)
        of = ", ".join(name(area) for area in areas if area) if own else ""
        one = Break("", period, kind)
        found.append(Rule(float(period) - 0.5, say.label(one, of), f"{period} {say.short(kind)}"))
    return tuple(found)


def shocks(periods: Sequence[str]) -> tuple[Shock, ...]:
    """Hatched bands over years of shock; years that follow one another make one."""
    years = sorted({int(period) for period in periods})
    runs: list[list[int]] = []
    for year in years:
        if runs and runs[-1][-1] == year - 1:
            runs[-1].append(year)
        else:
            runs.append([year])
    return tuple(
        Shock(
            run[0] - 0.5,
            run[-1] + 0.5,
            _("year of shock") if len(run) == 1 else _("years of shock"),
            _("shock"),
        )
        for run in runs
    )
