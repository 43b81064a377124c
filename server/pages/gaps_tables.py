"""The tables and the picture of a page of gaps."""

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.estimates import Estimate
from engine.indicators import find
from server.charts.chart import Chart, Series
from server.charts.scales import ticks
from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.pages import cause_choices
from server.pages.cells import columns, count, number, withheld
from server.results.gaps import Closed, Gaps
from server.sentences import gaps as say
from server.sentences import names
from server.sentences.gaps import DAYS
from server.sentences.text import _

SHOWN = 12  # gaps in the picture
RATE = 100_000


def places(found: Gaps) -> list[tuple[str, str]]:
    """Ages and cause of each cell, in order."""
    closed = _closed(found)
    causes = [cause_choices.name(one) for one in closed.causes] or [""]
    return [(ages, cause) for cause in causes for ages in closed.panel.grid.labels]


def _closed(found: Gaps) -> Closed:
    if found.closed is None:
        raise ValueError("there is no benchmark, so there are no gaps to show")
    return found.closed


def order(found: Gaps) -> list[int]:
    """Cells with a gap that is not withheld, the largest gain first."""
    closed = _closed(found)
    gain = np.nan_to_num(closed.numbers.change["e0"].value)
    gone = closed.hidden.ravel()
    return [at for at in np.argsort(-gain, kind="stable").tolist() if gain[at] > 0 and not gone[at]]


def clear(found: Gaps) -> tuple[int, ...]:
    """The clear gaps, the largest first."""
    flags = _closed(found).clear.ravel()
    return tuple(at for at in order(found) if flags[at])


def gain(found: Gaps, at: int) -> Estimate:
    return _closed(found).numbers.change["e0"][at]


def cells(found: Gaps) -> Table:
    """Every gap, the largest gain first, and then the cells without one."""
    closed = _closed(found)
    by_cause, gone = bool(closed.causes), closed.hidden.ravel()
    first = order(found)
    rest = [at for at in range(closed.excess.size) if at not in set(first)]
    named = places(found)
    rows = tuple(_row(found, at, named[at], bool(gone[at])) for at in (*first, *rest))
    heads = [Column("age", _("age"))]
    heads += [Column("cause", _("cause"))] if by_cause else []
    heads += [
        Column("deaths", _("deaths"), decimals=0, counted=True),
        Column("own", _("own rate"), _("per 100,000"), 1),
        Column("benchmark", _("benchmark"), _("per 100,000"), 1),
        *columns("gain", _("gain"), 1, unit=_("days")),
        Column("alike", _("if all alike"), _("days"), 1),
        *columns("unevenness", _("change of H"), 2, unit=_("thousandths"), signed=True),
        Column("clear", _("clear?")),
        Column("first", _("first five"), _("chance, %"), 0),
    ]
    note = _(
        "Gain: by what life expectancy at birth would be longer with the benchmark’s rate there"
        " alone. If all alike: what chance alone shows here on average if all areas are alike."
        " First five: the chance of being one of the five that add most. Rates that lie below the"
        " benchmark’s have no gap."
    )
    title = _("Gaps of {who} to the benchmark", who=names.sex_and_year(found.of.sex, found.period))
    return Table("gaps", title, tuple(heads), rows, note)


def _row(found: Gaps, at: int, place: tuple[str, str], gone: bool) -> Row:
    closed = _closed(found)
    cause, age = np.unravel_index(at, closed.excess.shape)
    head: list[Cell] = [place[0], *([place[1]] if closed.causes else [])]
    if gone:
        return Row((*head, *[withheld()] * 10, "", withheld()))
    with np.errstate(all="ignore"):
        own = RATE * closed.parts.deaths[cause, age] / closed.parts.exposure[cause, age]
    lent = RATE * closed.benchmark.rates[cause, age]
    counted: list[Cell] = [count(float(closed.parts.deaths[cause, age])), count(own), count(lent)]
    alike: Cell = number(DAYS * float(closed.alike.expected[cause, age]))
    first: Cell = number(100 * float(closed.first[cause, age]))
    if not closed.excess[cause, age] > 0:
        none = Gap(GapKind.NIL)
        return Row((*head, *counted, *[none] * 3, alike, *[none] * 3, "", first))
    gained = _triple(gain(found, at), DAYS)
    uneven = _triple(closed.numbers.change["H"][at], 1000.0)
    word = say.clear_word(bool(closed.clear[cause, age]))
    return Row((*head, *counted, *gained, alike, *uneven, word, first))


def _triple(of: Estimate, scale: float) -> tuple[Cell, ...]:
    why = _("It cannot be read off this table.")
    return tuple(number(scale * float(part), why) for part in (of.value, of.low, of.high))


def candidates(found: Gaps) -> Table:
    """The areas among which the benchmark was chosen."""
    chosen = found.chosen
    unit = find("e0").unit
    ranked = sorted(
        zip(chosen.candidates, chosen.length, chosen.lived, chosen.member, strict=True),
        key=lambda one: (not one[3], -one[1] if np.isfinite(one[1]) else np.inf, one[0]),
    )
    rows = tuple(
        Row(
            (
                area,
                number(float(length), _("It cannot be given for these years.")),
                number(float(lived)),
                _("in the benchmark") if member else _("not"),
            ),
            shown=found.holdings.name(area),
        )
        for area, length, lived, member in ranked
    )
    heads = (
        Column("area", _("area")),
        Column("length", _("life expectancy"), _("years, the other years together"), unit.decimals),
        Column("lived", _("person-years"), decimals=0),
        Column("member", _("benchmark?")),
    )
    return Table("areas", _("Areas the benchmark was chosen from"), heads, rows)


def chart(found: Gaps, source: str) -> Chart | None:
    """The largest gains as bars from 0, those that are not clear in grey, with what chance alone
    would show."""
    closed, shown = _closed(found), order(found)[:SHOWN]
    if not shown:
        return None
    named, flags = places(found), closed.clear.ravel()
    labels = tuple(_label(named[at], bool(flags[at])) for at in shown)
    values = DAYS * closed.numbers.change["e0"].value[shown]
    alike = DAYS * closed.alike.expected.ravel()[shown]
    rows = [float(len(shown) - 1 - row) for row in range(len(shown))]
    top = 1.1 * float(max(values.max(), alike.max()))
    scale = ticks(0, top)

    def series(label: str, of: Array, which: NDArray[np.bool_], role: str, draw: str) -> Series:
        some = np.flatnonzero(which).tolist()
        return Series(
            label,
            tuple(float(of[at]) for at in some),
            tuple(rows[at] for at in some),
            draw=draw,  # type: ignore[arg-type]
            role=role,
            names=tuple(labels[at] for at in some),
        )

    is_clear = flags[shown]
    drawn = [
        series(_("clear"), values, is_clear, "s1", "reaches"),
        series(_("not clear"), values, ~is_clear, "ink-2/.4", "reaches"),
        series(_("if all were alike"), alike, np.ones(len(shown), bool), "s2", "dots"),
    ]
    return Chart(
        key="gaps",
        finding=say.finding(len(clear(found))),
        unit=_(
            "Days of life expectancy gained with the benchmark’s death rate there alone; grey, (?):"
            " not clear; dots alone: what chance shows on average if all areas are alike"
        ),
        source=source,
        described=_("The largest gains, one row each; the numbers are in the table of gaps."),
        size="tall" if len(shown) > 6 else "std",
        x_kind="amount",
        x_range=(0.0, top),
        x_ticks=scale,
        y_title=_("days"),
        y_range=(-0.7, len(shown) - 0.3),
        y_ticks=tuple(rows),
        y_text=labels,
        hover=_("%{customdata}: %{x:.1f} days"),
        table="gaps",
        series=tuple(one for one in drawn if one.x),
    )


def _label(place: tuple[str, str], is_clear: bool) -> str:
    """Cause, ages and whether the gap is clear: on the phone the last two are never cut."""
    ages, cause = place
    text = _("{cause}, {ages}", cause=names.inside(cause), ages=ages) if cause else ages
    return text if is_clear else _("{place} (?)", place=text)
