"""How many live on and when they die: the first two pictures of a population-year page."""

import math
from collections.abc import Iterable

import numpy as np

from engine.ages import AgeGrid, Array
from server.charts.chart import At, Chart, Drop, Mark, Note, Series
from server.charts.scales import ticks
from server.pages.drawing import ages, at_age, bars, places, single_years, values
from server.pages.population_year_tables import RADIX, counted_groups
from server.results.population_year import Findings, finite
from server.sentences import names
from server.sentences import population_year as say
from server.sentences.numbers import number, whole
from server.sentences.text import _

THOUSANDS = tuple(f"{at}" for at in (0, 25, 50, 75, 100))


def survivors(found: Findings, source: str) -> Chart | None:
    if not found.readable:
        return None
    table, (_low, top) = found.chain.table, axis(found)
    starts = np.array(table.grid.starts, float)
    lx = np.where(starts <= top, table.lx, np.nan)
    drawn = (starts <= top) & ~found.withheld_of_table
    reach = {
        age: float(table.lx[table.grid.position(age)]) for age in (65, 85) if table.grid.has(age)
    }
    reach = {age: share for age, share in reach.items() if math.isfinite(share)}
    return Chart(
        key="survivors",
        finding=say.survivors(found.of.sex, reach, found.estimates),
        unit=_(
            "Survivors to each age, of 100,000 born, at the death rates of {year}",
            year=found.period,
        ),
        source=source,
        described=_(
            "Curve of survivors by age, {who}; the numbers are in the life table below.",
            who=who(found),
        ),
        x_kind="age",
        x_range=axis(found),
        y_title=_("survivors, thousands"),
        y_range=(0, 1.03 * RADIX),
        y_ticks=tuple(RADIX * at / 4 for at in range(5)),
        y_text=THOUSANDS,
        hover=_("age %{x}: %{y:,.0f} survivors"),
        table="life",
        series=(
            Series(
                who(found),
                places(starts[drawn]),
                values(RADIX * lx[drawn]),
                sex=found.of.sex,  # type: ignore[arg-type]
                at=At(48, RADIX * (at_age(table.grid, lx, 48) - 0.12), side="right"),
            ),
        ),
        drops=tuple(
            Drop(
                age,
                RADIX * share,
                _("{count} reach {age}", count=whole(RADIX * share), age=age),
                height,
            )
            for (age, share), height in zip(reach.items(), (17_000, 7_000), strict=False)
        ),
    )


def deaths(found: Findings, source: str) -> Chart | None:
    if not found.readable:
        return None
    grid = found.chain.table.grid
    density = shown(found, RADIX * found.chain.table.dx[:-1] / grid.widths[:-1])
    highest = float(np.nanmax(density)) if np.isfinite(density).any() else 1.0
    return Chart(
        key="deaths",
        finding=say.deaths(found.estimates),
        unit=_deaths_unit(found),
        source=source,
        described=_(
            "Deaths by age, {who}, with the mean, the median and the most common age marked; the"
            " numbers are in the life table below.",
            who=who(found),
        ),
        x_kind="age",
        x_range=axis(found),
        y_title=_("deaths"),
        y_range=(0, 1.35 * highest),
        y_ticks=ticks(0, highest),
        y_text=tuple(whole(at) for at in ticks(0, highest)),
        hover=_("age %{customdata}: %{y:,.0f} deaths"),
        table="life",
        series=columns(found, density),
        marks=tuple(_marks(found)),
        marks_top=1.1 * highest,
        notes=_first_year(grid, density, highest),
    )


def _deaths_unit(found: Findings) -> str:
    text = (
        _("Deaths at each single year of age, of 100,000 born")
        if single_years(found.chain.table.grid)
        else _("Deaths per year of age in each age group, of 100,000 born")
    )
    last = RADIX * float(found.chain.table.dx[-1])
    if found.withheld_of_table[-1]:
        return beyond(found, text, _("number"))
    return beyond(found, text, whole(last) if math.isfinite(last) else "")


def beyond(found: Findings, text: str, last: str) -> str:
    """A unit line, with what is drawn, or not, of the open group."""
    age = found.loaded.panel.grid.open_age
    if found.chain.modelled:
        return _("{text}; from {age} on single years by the fitted law", text=text, age=age)
    if not last:
        return text
    return _(
        "{text}; the {amount} at {age} and over are not drawn", text=text, amount=last, age=age
    )


def shown(found: Findings, column: Array) -> Array:
    """A column of the closed groups without those whose deaths are withheld."""
    return np.where(found.withheld_of_table[: len(column)], np.nan, column)


def columns(found: Findings, density: Array) -> tuple[Series, ...]:
    """Values of the closed groups; the ages of a law stand apart."""
    grid, counted = found.chain.table.grid, counted_groups(found)
    own = bars(grid, density, range(min(counted, len(density))), who(found))
    if not found.chain.modelled:
        return (own,)
    top = axis(found)[1]
    ages_of_law = [at for at in range(counted, len(density)) if grid.starts[at] < top]
    return own, bars(grid, density, ages_of_law, _("fitted law"), role="s2")


def _marks(found: Findings) -> Iterable[Mark]:
    words = {
        "e0": _("mean {age}"),
        "median": _("median {age}"),
        "mode": _("most common {age}"),
    }
    for key, text in words.items():
        if finite(found.estimates[key]):
            age = float(found.estimates[key].value)
            yield Mark(age, text.format(age=number(age, 1)))


def _first_year(grid: AgeGrid, density: Array, highest: float) -> tuple[Note, ...]:
    """The first year's bar is named where its neighbours are too low to show."""
    below = [
        float(d)
        for start, d in zip(grid.starts, density, strict=False)
        if 0 < start < 40 and math.isfinite(d)
    ]
    if grid.starts[1:2] != (1,) or not density[0] > 3 * max(below, default=0):
        return ()
    text = _("{count} in the first year", count=whole(float(density[0])))
    return (Note(text, At(2.5, max(below, default=0) + 0.06 * highest)),)


def who(found: Findings) -> str:
    return _("{sex}, {year}", sex=names.sex(found.of.sex), year=found.period)


def axis(found: Findings) -> tuple[float, float]:
    return ages(found.loaded.panel.grid, modelled=found.chain.modelled)
