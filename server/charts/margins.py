"""The room around a figure's plot, and the words that decide how much of it there must be."""

from server.charts.chart import Chart, Series
from server.charts.scales import decimals
from server.charts.template import CHARACTER, Measure

LONGEST_NARROW = 26  # characters of a row's name on the phone
LONGEST_END = 16  # of its last parts, where the first ones are cut
ENDS = 28  # px between the last point and the edge, beside the label itself


def margins(chart: Chart, measure: Measure) -> dict[str, int]:
    """Left and right are the same for all charts by age, so that an age stands on one vertical; the
    right one of a trend fits its longest label."""
    left, right, bottom = measure.left, measure.right, measure.bottom
    ends = [end_label(series, measure) for series in chart.series if series.at == "end"]
    if ends:
        character = CHARACTER * measure.text / 14.5
        right = round(ENDS + character * max(map(len, ends)))
        if measure.narrow:
            left = max(30, round(12 + character * _longest_tick(chart)))
    if chart.x_kind == "amount":
        left = round(14 + CHARACTER * measure.text / 14.5 * _longest_name(chart, measure))
        right = 24
    if has_row(chart, measure, measure.width - left - right):
        bottom += 12
    return {"l": left, "r": right, "t": measure.top, "b": bottom, "pad": 0}


def _longest_tick(chart: Chart) -> int:
    """Characters of the longest number beside the scale."""
    so = decimals(chart.y_ticks)
    return max((len(f"{at:,.{so}f}") for at in chart.y_ticks), default=0)


def short_name(text: str, chart: Chart, measure: Measure) -> str:
    """The name of a row, cut where it would take more than half the phone; its last parts, such as
    sex and year, are kept, since rows of one area have no other name."""
    if chart.x_kind != "amount" or not measure.narrow or len(text) <= LONGEST_NARROW:
        return text
    parts = text.split(", ")
    ends = ("".join(f", {part}" for part in parts[-kept:]) for kept in (2, 1) if kept < len(parts))
    end = next((one for one in ends if len(one) <= LONGEST_END), "")
    return text[: LONGEST_NARROW - 1 - len(end)].rstrip(" ,") + "…" + end


def _longest_name(chart: Chart, measure: Measure) -> int:
    return max((len(short_name(text, chart, measure)) for text in chart.y_text), default=0)


def end_label(series: Series, measure: Measure) -> str:
    """What stands at the end of a line at this width."""
    return (series.short or series.label) if measure.narrow else series.label


def has_row(chart: Chart, measure: Measure, width: float) -> bool:
    """Whether the figures under the bars have room beside one another."""
    cells = chart.foot_row
    needed = len(cells) * cell(chart, measure)
    return bool(cells) and measure.foot > 0 and width + measure.left >= needed


def cell(chart: Chart, measure: Measure) -> float:
    """Width that a figure under a bar needs, with the white beside it, px."""
    longest = max((len(text) for _, text in chart.foot_row), default=0)
    return measure.foot * (0.48 + CHARACTER / 14.5 * longest)
