"""A Chart record becomes a figure: data and layout for the wide page, what changes on the phone
and in print. Plain dictionaries; the plate's words (finding, unit, source) are not in it."""

from collections.abc import Callable
from decimal import Decimal
from math import ceil, floor, log10
from typing import Any

from server.charts.chart import Chart
from server.charts.layout import placed
from server.charts.margins import margins, short_name
from server.charts.scales import decimals
from server.charts.template import LAYOUT, NARROW, PRINT, WIDE, Measure
from server.charts.traces import traces

STEP = {"age": (10, 20), "year": (5, 10)}  # of labelled ticks, wide and narrow
FINER = (5, 1)  # where there are too few years for two of those


def figure(chart: Chart, say: Callable[[str], str], *, separators: str = ".,") -> dict[str, Any]:
    """{"data", "layout", "narrow", "print", "print_height"}.

    `narrow` and `print` replace whole keys of the layout. `say` is the text catalogue; `separators`
    are the decimal sign and the one between thousands.
    """
    layout = LAYOUT | {
        "separators": separators,
        "xaxis": _x_axis(chart, narrow=False),
        "yaxis": _y_axis(chart, WIDE),
    }
    font = LAYOUT["font"]
    wide, phone, paper = (
        {"margin": margins(chart, measure)} | placed(chart, measure, say)
        for measure in (WIDE, NARROW, PRINT)
    )
    phone |= {"font": font | {"size": NARROW.text}, "xaxis": _x_axis(chart, narrow=True)}
    if chart.x_kind == "amount":
        phone["yaxis"] = _y_axis(chart, NARROW)
    return {
        "data": traces(chart),
        "layout": layout | wide,
        "narrow": phone,
        "print": paper | {"font": font | {"size": PRINT.text}},
        "print_height": PRINT.heights[chart.size],
    }


def _x_axis(chart: Chart, *, narrow: bool) -> dict[str, Any]:
    low, high = chart.x_range
    if chart.x_kind == "amount":
        sign = "+" if low < 0 else ""  # of changes
        ticks = {"tickvals": [*chart.x_ticks], "tickformat": f"{sign},.{decimals(chart.x_ticks)}f"}
        return {**LAYOUT["xaxis"], "range": [low, high], **ticks}
    steps = (STEP[chart.x_kind][narrow], *FINER)
    at = next((some for step in steps if len(some := _multiples(step, low, high)) > 1), [])
    return {**LAYOUT["xaxis"], "range": [low, high], "tickvals": at}


def _multiples(step: int, low: float, high: float) -> list[int]:
    return [step * index for index in range(ceil(low / step), floor(high / step) + 1)]


def _y_axis(chart: Chart, measure: Measure) -> dict[str, Any]:
    low, high = (log10(end) if chart.y_log else end for end in chart.y_range)
    kind = "log" if chart.y_log else "linear"
    axis = {**LAYOUT["yaxis"], "type": kind, "range": [low, high], "tickvals": [*chart.y_ticks]}
    if chart.y_text:
        return axis | {"ticktext": [short_name(text, chart, measure) for text in chart.y_text]}
    needed = max((_decimals(tick) for tick in chart.y_ticks), default=0)
    return axis | {"tickformat": ",~g" if chart.y_log else f",.{needed}f"}


def _decimals(tick: float) -> int:
    exponent = Decimal(str(tick)).normalize().as_tuple().exponent
    return max(0, -int(exponent))
