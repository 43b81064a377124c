"""Rules, guides and words on a figure, placed for one width."""

import html
from collections.abc import Callable, Iterator
from math import floor, log10
from typing import Any

from server.charts.chart import At, Chart
from server.charts.margins import cell, end_label, has_row, margins
from server.charts.places import spread, storeys
from server.charts.template import CHARACTER, DIVISION, RULE, Measure

Part = dict[str, Any]


def placed(chart: Chart, measure: Measure, say: Callable[[str], str]) -> dict[str, list[Part]]:
    """Shapes and annotations."""
    canvas = _Canvas(chart, measure, say)
    return {"shapes": [*canvas.shapes()], "annotations": [*canvas.words()]}


class _Canvas:
    """One chart at one width: knows where a number of its scales falls, in px."""

    def __init__(self, chart: Chart, measure: Measure, say: Callable[[str], str]) -> None:
        self.chart, self.measure, self.say = chart, measure, say
        self.margin = margins(chart, measure)
        self.width = measure.width - self.margin["l"] - self.margin["r"]
        self.height = measure.heights[chart.size] - self.margin["t"] - self.margin["b"]
        self.row = has_row(chart, measure, self.width)

    def scaled(self, y: float) -> float:
        """As an annotation wants it: on a ratio scale its logarithm."""
        return log10(y) if self.chart.y_log else y

    def lift(self, y: float) -> float:
        """How far words at this height must rise to stand clear of the rule, px."""
        return max(0.0, round(0.6 * self.measure.text + 3 - self.py(y)))

    def px(self, x: float) -> float:
        low, high = self.chart.x_range
        return (x - low) / (high - low) * self.width

    def py(self, y: float) -> float:
        low, high = (self.scaled(end) for end in self.chart.y_range)
        return (self.scaled(y) - low) / (high - low) * self.height

    # ---- shapes

    def shapes(self) -> Iterator[Part]:
        yield from self._rule()
        low, high = self.chart.y_range
        if self.chart.x_kind == "amount":
            yield _line({"xref": "x", "yref": "paper", "x0": 0, "x1": 0, "y0": 0, "y1": 1})
        elif low < 0 < high:
            yield _line({"xref": "paper", "yref": "y", "x0": 0, "x1": 1, "y0": 0, "y1": 0})
        for broken in self.chart.breaks:
            at = {"xref": "x", "yref": "paper", "x0": broken.x, "x1": broken.x, "y0": 0, "y1": 1}
            yield _line(at, color="@rubric", dash="2px,2px")
        foot = max(self.py(0) / self.height, 0) if not self.chart.y_log else 0
        for mark, (_, top) in zip(self.chart.marks, self._tops(), strict=True):
            at = {"xref": "x", "yref": "paper", "x0": mark.x, "x1": mark.x, "y0": foot, "y1": top}
            yield _line(at)
        for drop in self.chart.drops:
            at = {"xref": "x", "yref": "y", "x0": drop.x, "x1": drop.x, "y0": low, "y1": drop.y}
            yield _line(at)
        if self.row:
            over = 1 + (self.margin["r"] - 4) / self.width
            at = {"xref": "paper", "yref": "paper", "x0": 0, "x1": over, "y0": -33, "y1": -33}
            yield _line(at | {"ysizemode": "pixel", "yanchor": 0})

    def _rule(self) -> Iterator[Part]:
        """The graduated rule under the axis, every second division black."""
        low, high = self.chart.x_range
        step = self._division()
        base = {
            "type": "rect",
            "xref": "x",
            "yref": "paper",
            "ysizemode": "pixel",
            "yanchor": 0,
            "layer": "above",
            "y0": -1,
            "y1": -RULE,
        }
        yield base | {
            "x0": low,
            "x1": high,
            "line": {"color": "@ink", "width": 1},
            "fillcolor": "@ground",
        }
        for index in range(floor(low / step), floor(high / step) + 1):
            start, end = max(index * step, low), min((index + 1) * step, high)
            if index % 2 == 0 and start < end:
                yield base | {"x0": start, "x1": end, "line": {"width": 0}, "fillcolor": "@ink"}

    def _division(self) -> float:
        """How far the graduated rule changes from black to white, in units of x."""
        chart = self.chart
        if chart.x_kind != "amount":
            return DIVISION[chart.x_kind]
        return (chart.x_ticks[1] - chart.x_ticks[0]) / 2 if len(chart.x_ticks) > 1 else 1.0

    def _tops(self) -> list[tuple[int, float]]:
        """For each mark the side of its label and its top as a share of the height; it may rise
        above the scale."""
        if not self.chart.marks:
            return []
        marks, top = self.chart.marks, self.py(self.chart.marks_top)
        return [
            (side, (top + storey * 17) / self.height)
            for storey, side in storeys(marks, self.px, self.width)
        ]

    # ---- words

    def words(self) -> Iterator[Part]:
        chart, margin = self.chart, self.margin
        yield self._word(
            chart.y_title,
            "@ink-2",
            x=0,
            xref="paper",
            xanchor="left",
            xshift=-margin["l"] - 2,
            **self._above(),
        )
        yield from self._axis_word()
        yield from self._dated()
        for mark, (side, top) in zip(chart.marks, self._tops(), strict=True):
            yield self._word(
                mark.label,
                x=mark.x,
                xref="x",
                xanchor="left" if side == 1 else "right",
                xshift=5 * side,
                y=top,
                yref="paper",
                yanchor="middle",
                yshift=-7,
            )
        for drop in chart.drops:
            yield self._word(
                drop.label,
                x=drop.x,
                xref="x",
                xanchor="right",
                xshift=-5,
                y=self.scaled(drop.label_y),
                yref="y",
                yanchor="middle",
                yshift=self.lift(drop.label_y),
                bgcolor="@ground",
                borderpad=1,
            )
        yield from self._end_words()
        for series in chart.series:
            if isinstance(series.at, At):
                yield self._at(series.label, series.at, _as_text(series.role))
        for note in chart.notes:
            yield self._at(note.text, note.at, "@ink-2", style="italic")
        yield from self._foot()

    def _dated(self) -> Iterator[Part]:
        """Words of breaks at their rules, each a line higher than the one before where they would
        meet, and of years of shock at the top of their bands."""
        character = CHARACTER * self.measure.text / 14.5
        ends: list[tuple[float, float]] = []  # of the words placed so far, px; one a line
        for broken in sorted(self.chart.breaks, key=lambda one: one.x):
            text = broken.short if self.measure.narrow else broken.label
            at, width = self.px(broken.x), character * len(text) + 10
            left = at >= width
            first, last = (at - width, at) if left else (at, at + width)
            line = next((n for n, (_, end) in enumerate(ends) if end <= first), len(ends))
            ends[line : line + 1] = [(first, last)]
            yield self._word(
                text,
                "@rubric",
                style="italic",
                x=broken.x,
                xref="x",
                xanchor="right" if left else "left",
                xshift=-5 if left else 5,
                y=0,
                yref="paper",
                yanchor="bottom",
                yshift=4 + line * (self.measure.text + 4),
                align="right" if left else "left",
            )
        for shock in self.chart.shocks:
            yield self._word(
                shock.short if self.measure.narrow else shock.label,
                "@ink-2",
                style="italic",
                x=(shock.first + shock.last) / 2,
                xref="x",
                xanchor="center",
                y=1,
                yref="paper",
                yanchor="top",
                yshift=2,
                bgcolor="@ground",
                borderpad=1,
            )

    def _above(self) -> Part:
        return {
            "y": 1,
            "yref": "paper",
            "yanchor": "bottom",
            "yshift": self.margin["t"] - 20,
        }

    def _axis_word(self) -> Iterator[Part]:
        """ "age" or "year" at the end of the rule; on the phone the unit line says "by age"."""
        by_age = self.chart.x_kind == "age"
        if self.chart.x_kind == "amount":
            return
        if self.row or (by_age and self.measure.narrow):
            return
        yield self._word(
            self.say("age") if by_age else self.say("year"),
            "@ink-2",
            style="italic",
            x=1,
            xref="paper",
            xanchor="right",
            xshift=(self.margin["r"] if by_age else 44) - 4,
            y=0,
            yref="paper",
            yanchor="top",
            yshift=-9,
        )

    def _end_words(self) -> Iterator[Part]:
        """Labels at the ends of lines, moved apart, each with a fine leader."""
        ends = []
        for series in self.chart.series:
            points = [(x, y) for x, y in zip(series.x, series.y, strict=True) if y is not None]
            if series.at == "end" and points:
                ends.append((series, *points[-1]))
        wanted = [self.py(y) for _, _, y in ends]
        got = spread(wanted, self.measure.text + 2.5, 4, self.height + 8)
        for (series, x, y), want, at in zip(ends, wanted, got, strict=True):
            yield self._word(
                end_label(series, self.measure),
                _as_text(series.role),
                x=x,
                xref="x",
                xanchor="left",
                ax=20 + self.width - self.px(x),
                y=self.scaled(y),
                yref="y",
                yanchor="middle",
                ay=want - at,
                showarrow=True,
                arrowhead=0,
                arrowwidth=0.8,
                arrowcolor="@ink-2",
                standoff=6,
                align="left",
            )

    def _at(self, text: str, at: At, color: str, **font: str) -> Part:
        narrow = self.measure.narrow
        x = at.narrow_x if narrow and at.narrow_x is not None else at.x
        y = at.narrow_y if narrow and at.narrow_y is not None else at.y
        return self._word(
            text,
            color,
            **font,
            x=x,
            xref="x",
            xanchor=at.side,
            xshift=at.dx,
            y=self.scaled(y),
            yref="y",
            yanchor="middle",
            yshift=at.dy + self.lift(y),
            align=at.side,
        )

    def _foot(self) -> Iterator[Part]:
        """The figures under their bars and their sum; where there is no room, the sum alone."""
        chart, size = self.chart, self.measure.foot
        if chart.foot_row and not self.row:
            text = f"{self.say('sum')} {chart.foot_sum}"
            yield self._word(text, weight=700, x=1, xref="paper", xanchor="right", **self._above())
        if not self.row:
            return
        under: Part = {"y": 0, "yref": "paper", "yanchor": "top"}
        wanted = [self.px(x) for x, _ in chart.foot_row]
        got = spread(wanted, cell(chart, self.measure), -self.margin["l"], self.width)
        for (x, text), want, at in zip(chart.foot_row, wanted, got, strict=True):
            place: Part = {"x": x, "xref": "x", "xanchor": "center", "xshift": at - want}
            yield self._word(text, size=size, yshift=-34, **place, **under)
        edge: Part = {"x": 1, "xref": "paper", "xanchor": "right", "xshift": self.margin["r"] - 6}
        yield self._word(chart.foot_sum, size=size + 1.5, weight=700, yshift=-33, **edge, **under)
        yield self._word(self.say("sum"), "@ink-2", style="italic", yshift=-9, **edge, **under)

    def _word(self, text: str, color: str = "@ink", **where: Any) -> Part:
        font = {"size": self.measure.text, "color": color}
        font |= {name: where.pop(name) for name in ("size", "style", "weight") if name in where}
        return {"text": html.escape(text, quote=False), "showarrow": False, "font": font} | where


def _as_text(role: str) -> str:
    """The token of a series' colour dark enough for words."""
    return f"@{role}t" if role[:1] == "s" and role[1:].isdigit() else f"@{role}"


def _line(where: Part, *, color: str = "@ink", dash: str = "solid") -> Part:
    return {"type": "line", "line": {"color": color, "width": 1, "dash": dash}} | where
