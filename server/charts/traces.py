"""What a figure draws: one or more traces a series."""

import html
from collections.abc import Iterator
from dataclasses import replace
from itertools import groupby
from typing import Any

from server.charts.chart import Chart, Sequence, Series
from server.charts.template import DASH, WIDTH

Trace = dict[str, Any]


def traces(chart: Chart) -> list[Trace]:
    """Hatched bands and spaces first, then the series in their order."""
    drawn = [trace for series in chart.series for trace in _DRAW[series.draw](series, chart)]
    return [*_shocks(chart), *_between(chart), *drawn]


def _lines(series: Series, chart: Chart) -> Iterator[Trace]:
    if series.low:
        yield from _bands(series)
    line = {"color": f"@{series.role}", "width": WIDTH[series.weight], "dash": DASH[series.sex]}
    yield {
        "type": "scatter",
        "mode": "lines",
        "x": _short(series.x),
        "y": _short(series.y),
        "connectgaps": False,
        "line": line,
    } | _hover(series, chart)
    hollow = [index for index, mark in enumerate(series.provisional) if mark]
    if hollow:
        yield {
            "type": "scatter",
            "mode": "markers",
            "x": _short([series.x[index] for index in hollow]),
            "y": _short([series.y[index] for index in hollow]),
            "hoverinfo": "skip",
            "cliponaxis": False,
            "marker": {
                "size": 8,
                "color": "@ground",
                "line": {"color": f"@{series.role}", "width": 1.6},
            },
        }


def _bands(series: Series) -> Iterator[Trace]:
    """One band a run of points that have limits: no band crosses a gap."""
    points = list(zip(series.x, series.low, series.high, strict=True))
    for whole, run in groupby(points, key=lambda point: None not in point):
        if not whole:
            continue
        x, low, high = zip(*run, strict=True)
        edge = {"color": f"@{series.role}/.35", "width": 0.5}
        side = {"type": "scatter", "mode": "lines", "x": _short(x), "line": edge}
        side["hoverinfo"] = "skip"
        yield side | {"y": _short(low)}
        yield side | {"y": _short(high), "fill": "tonexty", "fillcolor": f"@{series.role}/.15"}


def _needles(series: Series, chart: Chart) -> Iterator[Trace]:
    yield {
        "type": "bar",
        "x": _short(series.x),
        "y": _short(series.y),
        "width": [0.44 * width for width in series.widths or (1.0,) * len(series.x)],
        "marker": {"color": f"@{series.role}", "line": {"width": 0}},
    } | _hover(series, chart)


def _bars(series: Series, chart: Chart) -> Iterator[Trace]:
    total = sum(value for value in series.y if value is not None)
    against = [value is not None and value * total < 0 for value in series.y]
    yield {
        "type": "bar",
        "x": _short(series.x),
        "y": _short(series.y),
        "width": [0.8 * width for width in series.widths or (1.0,) * len(series.x)],
        "error_y": _whiskers(series, "@ink", 1),
        "marker": {
            "color": [f"@{series.role}" if one else f"@{series.role}/.42" for one in against],
            "line": {"width": 1, "color": f"@{series.role}"},
            "pattern": {
                "shape": ["/" if one else "" for one in against],
                "size": 5,
                "solidity": 0.3,
                "fillmode": "replace",
                "fgcolor": f"@{series.role}",
            },
        },
    } | _hover(series, chart)


def _dots(series: Series, chart: Chart) -> Iterator[Trace]:
    yield {
        "type": "scatter",
        "mode": "markers",
        "x": _short(series.x),
        "y": _short(series.y),
        "marker": {"size": 7, "color": f"@{series.role}", "symbol": "circle"},
        "error_y": _whiskers(series, f"@{series.role}", 1.4),
    } | _hover(series, chart)


_HATCH = {
    "shape": "/",
    "size": 5,
    "solidity": 0.18,
    "fillmode": "replace",
    "bgcolor": "rgba(0,0,0,0)",
}


def _reaches(series: Series, chart: Chart) -> Iterator[Trace]:
    """From 0 to each amount, one row each, with a dot at its end."""
    ends = list(zip(series.x, series.y, strict=True))
    yield {
        "type": "scatter",
        "mode": "lines",
        "x": [one for x, _ in ends for one in (0.0, _six(x), None)],
        "y": [one for _, y in ends for one in (y, y, None)],
        "line": {"color": f"@{series.role}", "width": WIDTH["this"]},
        "hoverinfo": "skip",
    }
    yield {
        "type": "scatter",
        "mode": "markers",
        "x": _short(series.x),
        "y": _short(series.y),
        "cliponaxis": False,
        "marker": {"size": 8, "color": f"@{series.role}", "symbol": "circle"},
        "error_x": _whiskers(replace(series, y=series.x), "@ink", 1),
    } | _hover(series, chart)


def _squares(series: Series, chart: Chart) -> Iterator[Trace]:
    """Amounts by their size; those below 0 are open, which grey print shows."""
    yield {
        "type": "scatter",
        "mode": "markers",
        "x": _short(series.x),
        "y": _short(series.y),
        "cliponaxis": False,
        "marker": {
            "symbol": "square",
            "size": [_six(side) for side in series.widths],
            "color": ["@ground" if below else f"@{series.role}" for below in series.provisional],
            "line": {"color": f"@{series.role}", "width": 1.2},
        },
    } | _hover(series, chart)


_DRAW = {
    "line": _lines,
    "needles": _needles,
    "bars": _bars,
    "dots": _dots,
    "reaches": _reaches,
    "squares": _squares,
}


def _between(chart: Chart) -> Iterator[Trace]:
    """The space between two curves, hatched: it reads in grey print."""
    if chart.between is None:
        return
    first, second = (chart.series[index] for index in chart.between)
    edge = {"type": "scatter", "mode": "lines", "line": {"width": 0}, "hoverinfo": "skip"}
    yield edge | {"x": _short(first.x), "y": _short(first.y)}
    yield edge | {
        "x": _short(second.x),
        "y": _short(second.y),
        "fill": "tonexty",
        "fillpattern": _HATCH | {"fgcolor": f"@{first.role}"},
    }


def _shocks(chart: Chart) -> Iterator[Trace]:
    """A band over each run of years of shock, hatched: it reads in grey print."""
    low, high = chart.y_range
    for shock in chart.shocks:
        first, last = max(shock.first, chart.x_range[0]), min(shock.last, chart.x_range[1])
        yield {
            "type": "scatter",
            "mode": "lines",
            "x": [first, first, last, last, first],
            "y": [low, high, high, low, low],
            "line": {"width": 0},
            "hoverinfo": "skip",
            "fill": "toself",
            "fillpattern": _HATCH | {"fgcolor": "@ink-2/.7"},
        }


def _whiskers(series: Series, color: str, thickness: float) -> Trace:
    if not series.low:
        return {"visible": False}
    triples = list(zip(series.y, series.low, series.high, strict=True))
    return {
        "type": "data",
        "symmetric": False,
        "array": [None if None in three else _six(three[2] - three[0]) for three in triples],  # type: ignore[operator]
        "arrayminus": [None if None in three else _six(three[0] - three[1]) for three in triples],  # type: ignore[operator]
        "color": color,
        "thickness": thickness,
        "width": 0,
    }


def _hover(series: Series, chart: Chart) -> Trace:
    """The label of a point: the series, then the chart's own template of age or year and value."""
    named = {"customdata": [html.escape(name) for name in series.names]} if series.names else {}
    who = html.escape(series.name or series.label).replace("%{", "%&#123;")  # no part to fill in
    return {"hovertemplate": f"{who}, {chart.hover}<extra></extra>"} | named


def _short(values: Sequence | list[float | None]) -> list[float | None]:
    return [None if value is None else _six(value) for value in values]


def _six(value: float) -> float:
    """Six digits: finer than any screen, a third of the bytes."""
    return float(f"{value:.6g}")
