"""The tables of a population-year page, from which its pictures and twins are made too."""

from collections.abc import Mapping, Sequence

import numpy as np

from engine.ages import AgeGrid
from engine.estimates import Estimate, Reason
from engine.indicators import GROUPS, Group, find
from engine.settings import Settings
from engine.standardisation import used
from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.pages.cells import columns, count, number, triple, withheld
from server.results.estimating import USUAL
from server.results.population_year import Findings
from server.sentences import names
from server.sentences.reasons import reason
from server.sentences.text import _

RADIX = 100_000
DAYS = 365.25
NO_TWO = "Two ratios to a larger area do not compare with one another."


def figures(found: Findings) -> Table:
    """The few main numbers: this year, the year before, the change, each with its interval."""
    title = _("The figures of {who}", who=names.sex_and_year(found.of.sex, found.period))
    return _figures(found, "figures", title, USUAL)


def further(found: Findings) -> tuple[Table, ...]:
    """All other numbers, a table for each group of the registry."""
    return tuple(
        _figures(found, f"figures-{group.key}", about(group), keys, said=())
        for group in GROUPS
        if (keys := [one.key for one in group.indicators if one.key not in USUAL])
    )


def about(group: Group) -> str:
    """What a group of the registry holds: its name and its question."""
    return _("{group}. {question}", group=_(group.label), question=_(group.question))


def _figures(
    found: Findings,
    name: str,
    title: str,
    keys: Sequence[str],
    *,
    said: Sequence[Reason] = (Reason.OPEN_GROUP_TOO_LARGE,),
) -> Table:
    heads = [Column("indicator", _("Indicator"))]
    heads += columns("value", dated(found.period, found.loaded.status), 1)
    note = _(
        "Under each figure its {level} % interval, which covers chance in deaths only.",
        level=round(100 * found.settings.level),
    )
    before = found.before
    if before:
        heads += columns("before", dated(before.period, before.loaded.status), 1)
        heads += columns("change", _("change"), 1, signed=True)
        note += " " + _(
            "Change: {year} less {before}, taken before rounding.",
            year=found.period,
            before=before.period,
        )
    changes = before.change if before else {}
    shown = {
        key: [found.estimates[key], *([changes[key]] if key in changes else [])] for key in keys
    }
    note = " ".join([note, *why_missing(shown, found.settings, said)])
    if before and set(keys) - set(changes):
        note += " " + _(NO_TWO)
    rows = tuple(_figure_row(found, key) for key in keys)
    return Table(name, title, tuple(heads), rows, note)


def why_missing(
    shown: Mapping[str, Sequence[Estimate]], settings: Settings, said: Sequence[Reason]
) -> list[str]:
    """Each reason why a figure or its interval is missing, and what it is missing from; but for
    those `said` elsewhere on the page."""
    missing: dict[int, list[str]] = {}
    for key, sides in shown.items():
        for code in {int(side.reason) for side in sides}:
            if code not in (Reason.NONE, *said):
                missing.setdefault(code, []).append(_(find(key).label))
    if {len(labels) for labels in missing.values()} == {len(shown)}:
        return [reason(code, settings) for code in missing]
    return [
        _("{labels}: {why}", labels="; ".join(labels), why=reason(code, settings))
        for code, labels in sorted(missing.items())
    ]


def whole_of(found: Findings) -> str:
    """Name of the area that this one is part of; empty where there is none."""
    parent = next((one.parent for one in found.holdings.areas if one.code == found.of.area), "")
    return found.holdings.name(parent) if parent else ""


def _figure_row(found: Findings, key: str) -> Row:
    indicator = find(key)
    cells: list[Cell] = [key]
    sides: list[Estimate] = [found.estimates[key]]
    before = found.before
    if before:
        sides.append(before.estimates[key])
        sides += [before.change[key]] if key in before.change else []
    for side in sides:
        cells += triple(side, indicator.unit, found.settings)
    if before and key not in before.change:
        cells += [Gap(GapKind.UNDEFINED, _(NO_TWO))] * 3
    whole = whole_of(found)
    return Row(
        tuple(cells),
        second=what_it_counts(key, found.settings, found.loaded.panel.grid, whole),
        shown=called(key, found.loaded.panel.grid),
        decimals=indicator.unit.decimals,
    )


def called(key: str, grid: AgeGrid) -> str:
    """The name of a figure; that of a standard stands in its second line."""
    one = find(key)
    return _(names.brief(one.label)) if used(one, grid) else _(one.label)


def what_it_counts(key: str, settings: Settings, grid: AgeGrid, whole: str = "") -> str:
    """What the number counts, under its name, for people counted on this grid; `whole` is the area
    that theirs is part of."""
    one = find(key)
    first, last = settings.ageing_span
    standard = used(one, grid)
    if standard:
        return _(
            "{unit}; {standard}, {groups} age groups, the last {top}",
            unit=_(one.unit.label),
            standard=_(standard.standard),
            groups=standard.groups,
            top=standard.top,
        )
    if one.needs.whole and whole:
        return _("{unit}; expected at the rates of {area}", unit=_(one.unit.label), area=whole)
    even = _("0 if all died at one age")
    return {
        "e65": _("years still to live"),
        "median": _("age that half would reach"),
        "mode": _("years of age"),
        "mode_parabola": _("years of age"),
        "lower_quartile": _("age that three quarters would reach"),
        "upper_quartile": _("age that one quarter would reach"),
        "threshold_edagger": _("years of age"),
        "threshold_H": _("years of age"),
        "edagger": _("e-dagger, years"),
        "H": _("H: years lost per death, for each year of life expectancy"),
        "ageing_rate": _("% per year of age, {first} to {last}", first=first, last=last),
        "mode_raw": _("age at which it begins"),
        "gini": even,
        "cv": even,
        "theil": even,
        "mld": even,
    }.get(key) or _(one.unit.label)


def dated(period: str, status: str) -> str:
    """A year as a column's head."""
    return _("{year}, provisional", year=period) if status == "provisional" else period


def life(found: Findings) -> Table:
    """The life table, of 100,000 born."""
    heads = (
        Column("age", _("age")),
        Column("deaths", _("deaths"), decimals=0, counted=True),
        Column("person_years", _("person-years"), decimals=0, counted=True),
        Column("mx", "m_x", _("per 1,000"), 3),
        Column("ax", "a_x", _("years"), 2),
        Column("qx", "q_x", decimals=5),
        Column("lx", "l_x", decimals=0),
        Column("dx", "d_x", decimals=0),
        Column("Lx", "L_x", decimals=0),
        Column("ex", "e_x", _("years"), 2),
    )
    return Table(
        "life",
        _("Life table of {who}", who=names.sex_and_year(found.of.sex, found.period)),
        heads,
        tuple(_life_row(found, at) for at in range(len(found.chain.table.grid))),
        _("Survivors, deaths and years lived are those of 100,000 born."),
    )


def _life_row(found: Findings, at: int) -> Row:
    table, rates = found.chain.table, found.chain.rates
    why = reason(int(found.estimates["e0"].reason), found.settings)
    counted = at < counted_groups(found)
    if counted:
        counts = (count(rates.deaths[at]), number(rates.exposure[at]))
        rate = count(1000 * table.mx[at])
    else:
        none = Gap(GapKind.NOT_AVAILABLE, _("A fitted law stands in for counts at these ages."))
        counts, rate = (none, none), number(1000 * table.mx[at])
    read = [table.ax[at], table.qx[at]]
    read += [RADIX * column[at] for column in (table.lx, table.dx, table.Lx)]
    read.append(table.ex[at])
    shown: list[Cell] = [number(value if found.readable else np.nan, why) for value in read]
    if counted and found.withheld[at]:  # the last, years still to live, rests on all later ages
        counts, rate, shown = (withheld(), counts[1]), withheld(), [withheld()] * 5 + shown[5:]
    return Row(
        (table.grid.labels[at], *counts, rate, *shown),
        second=_("rate of joined ages") if counted and rates.joined[at] else "",
    )


def counted_groups(found: Findings) -> int:
    """How many groups of the table rest on counts of their own; above them a law may stand."""
    own = len(found.loaded.panel.grid)
    return own - 1 if found.chain.modelled else own


def rises(found: Findings) -> Table:
    """Rise of death rates between neighbouring five-year groups; only those with enough deaths."""
    k = found.rises
    rows = tuple(
        Row((int(at), 100 * value, 100 * low, 100 * high))
        for at, value, low, high in zip(k.at, k.value, k.low, k.high, strict=True)
        if np.isfinite(value)
    )
    heads = (
        Column("age", _("age"), decimals=0),
        *columns("rise", _("rise"), 1, unit=_("% per year of age")),
    )
    return Table("rise", _("Rise of death rates with age"), heads, rows)


def gains(found: Findings) -> Table:
    """Days of life expectancy for 1 % lower rates, by age group and per year of age in it; the
    elasticities, and what survival of the group is worth."""
    grid = found.chain.table.grid
    days = DAYS * found.gain
    no_end = _("The group has no end.")
    survival = np.append(found.by_survival, np.nan) / 1000
    rows = [
        Row(
            (
                label,
                *(
                    withheld() if gone else number(value, why)
                    for value, why in (
                        (gain, ""),
                        (gain / width if np.isfinite(width) else np.nan, no_end),
                        (part, ""),
                        (worth, no_end),
                    )
                ),
            )
        )
        for label, gain, width, part, worth, gone in zip(
            grid.labels,
            days,
            grid.widths,
            found.elasticity,
            survival,
            found.withheld_of_table,
            strict=True,
        )
    ]
    total = Row((_("all ages"), number(days.sum()), "", number(found.elasticity.sum()), ""))
    note = _(
        "The last, open age group has no end, so that its days cannot be given by year. The"
        " elasticities are taken at fixed years lived by those who die, so that they add up to"
        " −H. What survival is worth is summed over no ages."
    )
    heads = (
        Column("age", _("age")),
        Column("days", _("days"), _("for the group"), 2),
        Column("days_per_year", _("days"), _("per year of age"), 3),
        Column("elasticity", _("elasticity"), _("% for 1 % higher rates"), 4),
        Column("survival", _("years"), _("if one more in 1,000 survived the group"), 4),
    )
    return Table(
        "gain",
        _("Days of life expectancy gained if death rates were 1 % lower"),
        heads,
        tuple(rows),
        note,
        total=total,
    )
