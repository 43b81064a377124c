"""The pictures of a what-if page: death rates before and after, and deaths fewer by age."""

import numpy as np

from engine.ages import Array
from server.charts.chart import At, Chart, Series
from server.charts.scales import log_ticks, ticks
from server.pages import what_if_tables as tables
from server.pages.drawing import LONGER_LIFE, WHOLE_LIFE, at_age, places, values
from server.results.what_if import Findings
from server.sentences import what_if as say
from server.sentences.numbers import number
from server.sentences.text import _

PER = 1000


def axis(found: Findings) -> tuple[float, float]:
    return WHOLE_LIFE if found.grid.open_age < WHOLE_LIFE[1] else LONGER_LIFE


def rates(found: Findings, source: str) -> Chart | None:
    """Death rates of all causes as they were and as changed, on a ratio scale."""
    if not found.anything:
        return None
    grid = found.grid.fives
    own = found.changed.own
    lived = found.grid.regroup(own.panel.exposure, grid)
    was = tables.by_group(found, own.parts.deaths)
    then = was - tables.by_group(found, found.changed.numbers.fewer)
    gone = found.withheld_on(grid)
    with np.errstate(all="ignore"):
        now, later = (
            np.where((deaths > 1e-9) & ~gone, PER * deaths / lived, np.nan)[:-1]
            for deaths in (was, then)
        )
    both = np.concatenate([now, later])
    if not np.isfinite(both).any():
        return None
    low, high = float(np.nanmin(both)), float(np.nanmax(both))
    who = _("as they were"), _("as changed")
    return Chart(
        key="rates",
        finding=say.finding_rates(tables.said(found)),
        unit=_("Deaths per 1,000 person-years by age, all causes, ratio scale"),
        source=source,
        described=_(
            "Two lines of death rates by age, as they were and as changed; the deaths behind them"
            " are in the table of deaths by age."
        ),
        x_kind="age",
        x_range=axis(found),
        y_title=_("per 1,000"),
        y_range=(low / 1.3, high * 1.3),
        y_ticks=log_ticks(low / 1.3, high * 1.3),
        y_log=True,
        hover=_("age %{customdata}: %{y:.3g} per 1,000"),
        table="deaths",
        series=(
            _line(found, later, who[1], "s1", "this", low),
            _line(found, now, who[0], "s2", "that", low),
        ),
    )


def _line(found: Findings, column: Array, label: str, role: str, weight: str, low: float) -> Series:
    grid = found.grid.fives
    upper = weight == "that"
    at = max(low, at_age(grid, np.append(column, np.nan), 50 if upper else 56))
    place = At(48, 2.1 * at, "right", 0, narrow_x=52) if upper else At(60, at / 2.1, "left", 0)
    return Series(
        label,
        places(grid.mids[:-1]),
        values(column),
        sex=found.at.sex,  # type: ignore[arg-type]
        role=role,
        weight=weight,  # type: ignore[arg-type]
        names=grid.labels[:-1],
        at=place,
    )


def fewer(found: Findings, source: str) -> Chart | None:
    """How many deaths fewer, or more, at each age."""
    grid = found.grid.fives
    by_group = tables.by_group(found, found.changed.numbers.fewer)
    total = float(by_group.sum())
    if not found.anything or abs(total) < 0.05:
        return None
    top = axis(found)[1]
    widths = np.append(grid.widths[:-1], min(10.0, top - grid.open_age))
    mids = np.array(grid.starts, float) + widths / 2
    shown = np.where(found.withheld_on(grid), np.nan, by_group if total > 0 else -by_group)
    low, high = float(np.nanmin([0.0, *shown])), float(np.nanmax([0.0, *shown]))
    if high - low < 0.05:  # all that changes is withheld
        return None
    room = 0.06 * (high - low)
    on_scale = ticks(low, high)
    where, share = _most(found, np.nan_to_num(shown))
    places_after = 0 if high >= 20 else 1
    return Chart(
        key="fewer",
        finding=say.finding_fewer(where, share, fewer=total > 0),
        unit=_(
            "Deaths fewer in each age group among the people there were; hatched: against the rest"
        )
        if total > 0
        else _(
            "Deaths more in each age group among the people there were; hatched: against the rest"
        ),
        source=source,
        described=_("Deaths fewer or more by age; the numbers are in the table of deaths by age."),
        size="low",
        x_kind="age",
        x_range=axis(found),
        y_title=_("deaths"),
        y_range=(low - room if low < 0 else 0.0, high + room),
        y_ticks=on_scale,
        hover="%{customdata}: %{y:,.1f}",
        table="deaths",
        series=(
            Series(
                _("deaths"),
                places(mids),
                values(shown),
                draw="bars",
                widths=places(widths),
                names=grid.labels,
            ),
        ),
        foot_row=tuple(
            (float(mid), number(float(value), places_after))
            for mid, value in zip(mids, shown, strict=True)
            if np.isfinite(value)
        ),
        foot_sum=number(abs(total), places_after),
    )


def _most(found: Findings, by_group: Array) -> tuple[str, float]:
    """The shortest run of groups with at least half of all, and its share."""
    grid = found.grid.fives
    starts, total = grid.starts, float(by_group.sum())
    ends = (*starts[1:], max(starts[-1] + 5, 105))
    sums = np.concatenate([[0.0], np.cumsum(by_group)])
    best = (float(ends[-1]), 0.0, 0, len(starts))
    for begin in range(len(starts)):
        for end in range(begin + 1, len(starts) + 1):
            held = float(sums[end] - sums[begin]) / total
            if held >= 0.5:
                best = min(best, (float(ends[end - 1] - starts[begin]), -held, begin, end))
    _width, held, begin, end = best
    if end == len(starts):
        return _("{first} and over", first=starts[begin]), -held
    if end - begin == 1:
        return grid.labels[begin], -held
    return _("{first} to {last}", first=starts[begin], last=starts[end] - 1), -held
