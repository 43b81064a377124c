"""Death rates, their rise with age and what lower ones would add: the later pictures of a
population-year page."""

import math

import numpy as np

from engine.ages import AgeGrid, Array
from server.charts.chart import At, Chart, Note, Series
from server.charts.scales import log_ticks, ticks
from server.pages.drawing import at_age, isolated, places, single_years, values
from server.pages.population_year_living import axis, beyond, columns, shown, who
from server.pages.population_year_tables import DAYS, counted_groups
from server.results.population_year import Findings, finite
from server.sentences import population_year as say
from server.sentences.numbers import number
from server.sentences.text import _


def rates(found: Findings, source: str) -> Chart | None:
    table, top = found.chain.table, axis(found)[1]
    grid, counted = table.grid, counted_groups(found)
    per_thousand = shown(found, np.where(table.mx[:-1] > 0, 1000 * table.mx[:-1], np.nan))
    inside = grid.mids[:-1] < top
    if not np.isfinite(per_thousand[inside]).any():
        return None
    low, high = float(np.nanmin(per_thousand[inside])), float(np.nanmax(per_thousand[inside]))
    closed = min(counted, len(per_thousand))
    series = [
        Series(
            who(found),
            places(grid.mids[:closed]),
            values(per_thousand[:closed]),
            sex=found.of.sex,  # type: ignore[arg-type]
            names=grid.labels[:closed],
            at=At(68, at_age(grid, per_thousand, 53) or low),
        )
    ]
    alone = isolated(per_thousand[:closed])
    if alone:
        series.append(
            Series(
                who(found),
                places(grid.mids[alone]),
                values(per_thousand[alone]),
                draw="dots",
                names=tuple(grid.labels[at] for at in alone),
            )
        )
    if found.chain.modelled:
        of_law = np.flatnonzero(inside & (np.arange(len(inside)) >= counted))
        series.append(
            Series(
                _("fitted law"),
                places(grid.mids[of_law]),
                values(per_thousand[of_law]),
                sex="p",
                role="s2",
                weight="that",
                names=tuple(grid.labels[at] for at in of_law),
                at=At(103, 0.25 * (at_age(grid, per_thousand, 103) or low), "center"),
            )
        )
    on_scale = log_ticks(low / 2.5, high * 1.5)
    gaps = bool(np.any(table.mx[:closed] == 0))
    return Chart(
        key="rates",
        finding=say.rates(*_lowest(found), found.estimates, found.settings.ageing_span),
        unit=_(
            "Deaths per 1,000 person-years, drawn at the middle of each age group; each step of"
            " the scale is a tenfold rate"
        ),
        source=source,
        described=_(
            "Death rates by age on a ratio scale, {who}; the numbers are in the life table below.",
            who=who(found),
        ),
        x_kind="age",
        x_range=axis(found),
        y_title=_("per 1,000, ratio scale"),
        y_range=(low / 2.5, high * 1.5),
        y_ticks=on_scale,
        y_text=tuple(f"{at:,g}" for at in on_scale),
        y_log=True,
        hover=_("age %{customdata}: %{y:,.2f} per 1,000"),
        table="life",
        series=tuple(series),
        notes=(Note(_("gaps: no deaths at that age"), At(16, low / 1.6)),) if gaps else (),
    )


def rise(found: Findings, source: str) -> Chart | None:
    k = found.rises
    known = np.isfinite(k.value)
    if not known.any():
        return None
    first, last = found.settings.ageing_span
    slope = found.estimates["ageing_rate"]
    lowest, highest = 100 * float(np.min(k.low[known])), 100 * float(np.max(k.high[known]))
    floor, ceiling = min(0.0, 1.05 * lowest), 1.08 * max(highest, 1.0)
    series = [
        Series(
            who(found),
            places(k.at[known]),
            values(100 * k.value[known]),
            draw="dots",
            sex=found.of.sex,  # type: ignore[arg-type]
            low=values(100 * k.low[known]),
            high=values(100 * k.high[known]),
        )
    ]
    if finite(slope):
        level = 100 * float(slope.value)
        series.append(
            Series(
                _("slope, {first} to {last}", first=first, last=last),
                (float(first), float(last)),
                (level, level),
                role="s2",
                weight="that",
                at=At(first, level, "right", -6),
            )
        )
    return Chart(
        key="rise",
        finding=say.rise(found.estimates, found.settings.ageing_span),
        unit=_(
            "Rise of death rates from one five-year age group to the next, at the age that parts"
            " them (a hundred times the change of the logarithm), with {level} % intervals; drawn"
            " where both have 100 deaths",
            level=round(100 * found.settings.level),
        ),
        source=source,
        described=_(
            "Rise of death rates with age, by age, with intervals, {who}; the numbers are in the"
            " table below it.",
            who=who(found),
        ),
        size="low",
        x_kind="age",
        x_range=axis(found),
        y_title=_("% per year of age"),
        y_range=(floor, ceiling),
        y_ticks=ticks(floor, ceiling),
        hover=_("at age %{x}: %{y:.1f} %"),
        table="rise",
        series=tuple(series),
    )


def gain(found: Findings, source: str) -> Chart | None:
    if not found.gainful:
        return None
    grid, days = found.chain.table.grid, DAYS * found.gain
    density = shown(found, days[:-1] / grid.widths[:-1])
    highest = float(np.nanmax(density)) if np.isfinite(density).any() else float(days.max())
    on_scale = ticks(0, 1.2 * highest)
    span, share = _most(grid, days)
    unit = (
        _(
            "Days of life expectancy gained if the death rate at that single year of age were 1 %"
            " lower"
        )
        if single_years(grid)
        else _(
            "Days of life expectancy gained, per year of age, if the death rate in that age group"
            " were 1 % lower"
        )
    )
    return Chart(
        key="gain",
        finding=say.gain(span, share),
        unit=beyond(found, unit, _("{days} days", days=number(float(days[-1]), 1))),
        source=source,
        described=_(
            "Days of life expectancy gained by lower death rates, by age, {who}; the numbers are in"
            " the table below it.",
            who=who(found),
        ),
        size="low",
        x_kind="age",
        x_range=axis(found),
        y_title=_("days"),
        y_range=(0, 1.2 * highest),
        y_ticks=on_scale,
        hover=_("age %{customdata}: %{y:.2f} days"),
        table="gain",
        series=columns(found, density),
        notes=(
            Note(
                _("all ages together: {days} days", days=number(float(days.sum()), 1)),
                At(24, on_scale[-1] - on_scale[1] / 2, narrow_x=6),  # between two guides
            ),
        ),
    )


def _most(grid: AgeGrid, gain: Array) -> tuple[str, float]:
    """The shortest run of age groups with at least half of the gain, the one with most of it where
    several are as short; and its share."""
    total, last = float(gain.sum()), len(grid) - 1
    best = (math.inf, 0.0, last, last + 1)  # the open group, if no other will do
    sums = np.concatenate([[0.0], np.cumsum(gain)]) / total
    for begin in range(last):
        for end in range(begin + 1, last + 1):
            share = float(sums[end] - sums[begin])
            if share >= 0.5:
                best = min(best, (grid.starts[end] - grid.starts[begin], -share, begin, end))
    _width, _share, begin, end = best
    share = float(sums[end] - sums[begin])
    if begin == last:
        return grid.labels[last], share
    return _("{first} to {last}", first=grid.starts[begin], last=grid.starts[end] - 1), share


def _lowest(found: Findings) -> tuple[str, int, int]:
    """The ages with the lowest rate; how many groups have no deaths; how many there are. Groups
    are of at least five years after the first ones."""
    grid = found.loaded.panel.grid
    wide = AgeGrid(tuple(at for at in grid.starts if at % 5 == 0 or at == 1))
    panel = found.loaded.panel.regroup(wide)
    with np.errstate(all="ignore"):
        rates = panel.deaths / panel.exposure
    known = np.isfinite(rates)
    lowest = wide.labels[int(np.argmin(np.where(known, rates, np.inf)))]
    return lowest, int(np.sum(known & (rates == 0))), len(wide)
