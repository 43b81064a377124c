"""Figures: valid for the library that draws them, and saying what the record says."""

import re
from typing import Any

import plotly.graph_objects as go
import pytest

from server.charts.chart import At, Chart, Note
from server.charts.figure import figure
from server.charts.margins import margins
from server.charts.template import NARROW, PRINT, WIDE
from tests.house.tree import ROOT
from tests.server.charts.records import (
    ALL,
    BARS,
    BETWEEN,
    CELLS,
    MARKED,
    RATIO,
    TREND,
    WHISKERED,
    a_chart,
)

CSS = ROOT / "static/css"
TOKENS = set(re.findall(r"--([a-z0-9-]+):", (CSS / "tokens.css").read_text(encoding="utf-8")))
each_chart = pytest.mark.parametrize("chart", ALL, ids=lambda chart: chart.key)


def say(text: str) -> str:
    return f"⟦{text}⟧"


def painted(value: Any) -> Any:
    """Tokens replaced by a colour, as the page's script does."""
    if isinstance(value, dict):
        return {key: painted(one) for key, one in value.items()}
    if isinstance(value, list):
        return [painted(one) for one in value]
    return "#123456" if isinstance(value, str) and value.startswith("@") else value


def strings(value: Any) -> list[str]:
    if isinstance(value, dict | list):
        inner = value.values() if isinstance(value, dict) else value
        return [text for one in inner for text in strings(one)]
    return [value] if isinstance(value, str) else []


def words(part: dict[str, Any]) -> list[str]:
    return [note["text"] for note in part["annotations"]]


@each_chart
def test_a_figure_is_valid_at_every_width(chart: Chart) -> None:
    made = painted(figure(chart, say))
    for change in ({}, made["narrow"], made["print"]):
        whole = go.Figure({"data": made["data"], "layout": made["layout"] | change})
        assert len(whole.data) == len(made["data"]) > 0


@each_chart
def test_every_colour_is_a_token_of_the_style_sheet(chart: Chart) -> None:
    used = {text[1:].partition("/")[0] for text in strings(figure(chart, say)) if text[:1] == "@"}
    assert used
    assert used <= TOKENS


@each_chart
def test_a_figure_has_no_height_and_no_words_of_its_plate(chart: Chart) -> None:
    made = figure(chart, say)
    assert "height" not in made["layout"]
    assert "title" not in made["layout"]
    assert not {chart.finding, chart.unit, chart.source} & set(strings(made))


def test_the_style_sheets_say_the_heights_figures_are_laid_out_for() -> None:
    plates, paper = ((CSS / name).read_text("utf-8") for name in ("plates.css", "print.css"))
    wide, _, phone = plates.partition("@media (max-width: 45rem)")
    for text, measure in ((wide, WIDE), (phone, NARROW), (paper, PRINT)):
        found = dict(re.findall(r"\.plot-(\w+) \{ --plot-h: (\d+)px; \}", text))
        assert found == {size: str(height) for size, height in measure.heights.items()}


def test_numbers_arrive_and_gaps_stay_gaps() -> None:
    line = next(trace for trace in figure(a_chart(), say)["data"] if "hovertemplate" in trace)
    assert line["y"] == [80.0, None, 60.0, 50.0, 40.0]
    assert line["connectgaps"] is False
    assert line["hovertemplate"].startswith("women &amp; men, ")


def test_a_band_stops_at_a_gap_and_begins_again() -> None:
    bands = [trace for trace in figure(a_chart(), say)["data"] if trace.get("fill") == "tonexty"]
    assert [trace["x"] for trace in bands] == [[0.0], [2.0, 3.0, 4.0]]


def test_a_provisional_point_is_hollow() -> None:
    (hollow,) = [one for one in figure(a_chart(), say)["data"] if one["mode"] == "markers"]
    assert (hollow["x"], hollow["marker"]["color"]) == ([4.0], "@ground")


def test_sexes_differ_by_dash_and_weights_by_width() -> None:
    lines = [one["line"] for one in figure(a_chart(), say)["data"] if "hovertemplate" in one]
    assert [line["dash"] for line in lines] == ["solid", "7px,4px"]
    assert lines[0]["width"] > lines[1]["width"]


def test_a_bar_against_the_rest_is_hatched() -> None:
    (bars,) = figure(BARS, say)["data"]
    assert bars["marker"]["pattern"]["shape"] == ["", "/", ""]
    assert bars["error_y"]["array"] == [0.5, 0.25, None]
    assert bars["error_y"]["arrayminus"] == [0.5, 0.25, None]
    assert bars["customdata"] == ["0", "1–4", "5–9"]


def test_the_space_between_two_curves_is_hatched_behind_them() -> None:
    first, second, *_ = figure(BETWEEN, say)["data"]
    assert (first["y"], second["y"]) == ([80.0, None, 60.0, 50.0, 40.0], [70.0, 30.0])
    assert second["fillpattern"]["shape"] == "/"


def test_all_charts_by_age_have_one_age_line() -> None:
    by_age = [chart for chart in ALL if chart.x_kind == "age"]
    for measure in (WIDE, NARROW, PRINT):
        sides = {(margins(chart, measure)["l"], margins(chart, measure)["r"]) for chart in by_age}
        assert len(sides) == 1


def test_the_rule_is_graduated_by_ten_ages_and_five_years() -> None:
    def black(chart: Chart) -> list[tuple[float, float]]:
        shapes = figure(chart, say)["layout"]["shapes"]
        return [(one["x0"], one["x1"]) for one in shapes if one.get("fillcolor") == "@ink"]

    assert black(a_chart()) == [(0, 10), (20, 30), (40, 50), (60, 70), (80, 90)]
    assert black(TREND) == [(2000, 2005), (2010, 2015), (2020, 2023)]


def test_labels_at_the_ends_are_moved_apart() -> None:
    made = figure(TREND, say)
    ends = [note for note in made["layout"]["annotations"] if note["showarrow"]]
    assert [note["text"] for note in ends] == ["Saltmarsh, women 82.0", "Highmoor, women 81.9"]
    drawn = [note["ay"] for note in ends]
    assert drawn[0] < 0 < drawn[1]
    assert ends[1]["x"] == 2022.0  # where its line ends
    assert ends[1]["ax"] > ends[0]["ax"] == 20  # yet the labels stand in one column
    assert {"S 82.0", "Highmoor, women 81.9", "break"} <= set(words(made["narrow"]))


def test_the_right_margin_of_a_trend_fits_its_longest_label() -> None:
    shorter = a_chart(series=(TREND.series[0],), x_kind="year")
    longer = a_chart(
        series=(*TREND.series, *[TREND.series[0]] * 0), x_kind="year", x_range=(1999.0, 2023.0)
    )
    assert margins(longer, WIDE)["r"] == margins(shorter, WIDE)["r"] > WIDE.right
    assert margins(longer, NARROW)["r"] > margins(shorter, NARROW)["r"]


def test_the_figures_stand_under_their_bars_where_there_is_room() -> None:
    made = figure(BARS, say)
    assert {"+1.50", "−0.25", "+1.25", "⟦sum⟧"} <= set(words(made["layout"]))
    assert "⟦sum⟧ +1.25" in words(made["narrow"])
    cells = [note for note in made["layout"]["annotations"] if note["text"] in ("+1.50", "−0.25")]
    centres = [756 * note["x"] / 100 + note["xshift"] for note in cells]
    assert centres[1] - centres[0] > 30  # apart, though their bars are not
    many = a_chart(series=BARS.series, foot_sum="+9", foot_row=tuple((x, "+1") for x in range(60)))
    assert "⟦sum⟧ +9" in words(figure(many, say)["layout"])
    assert "+1" not in words(figure(many, say)["layout"])


def test_words_of_the_figure_are_of_the_catalogue_and_escaped() -> None:
    assert "⟦age⟧" in words(figure(a_chart(), say)["layout"])
    assert "⟦age⟧" not in words(figure(a_chart(), say)["narrow"])
    assert "⟦year⟧" in words(figure(TREND, say)["narrow"])
    assert {"a &lt;note&gt;", "mean 82.0", "90,504 reach 65"} <= set(
        words(figure(MARKED, say)["layout"])
    )


def test_words_stand_clear_of_the_rule_at_every_height() -> None:
    low = a_chart(notes=(Note("low", At(50.0, 1.0)), Note("high", At(50.0, 50.0))), size="low")
    for part in (figure(low, say)["layout"], figure(low, say)["print"]):
        shift = {note["text"]: note.get("yshift") for note in part["annotations"]}
        assert shift["low"] > 5
        assert shift["high"] == 0


def test_a_ratio_scale_places_words_by_logarithm() -> None:
    made = figure(RATIO, say)["layout"]
    assert made["yaxis"]["range"] == [-2, 3]
    (label,) = [note for note in made["annotations"] if note["text"] == "women &amp; men"]
    assert label["y"] == pytest.approx(1.7404, abs=1e-4)


@pytest.mark.parametrize(
    ("ticks", "expected"),
    [((0.0, 50.0, 100.0), ",.0f"), ((0.0, 0.25, 0.5), ",.2f"), ((0.1, 0.2), ",.1f")],
)
def test_ticks_share_one_number_of_decimals(ticks: tuple[float, ...], expected: str) -> None:
    assert figure(a_chart(y_ticks=ticks), say)["layout"]["yaxis"]["tickformat"] == expected


def test_amounts_have_whiskers_along_their_rows() -> None:
    dots = figure(WHISKERED, str)["data"][1]
    assert dots["error_x"]["array"] == [pytest.approx(0.12), None]
    assert dots["error_x"]["arrayminus"] == [pytest.approx(0.08), None]
    assert figure(ALL[6], str)["data"][1]["error_x"] == {"visible": False}


def test_squares_are_as_large_as_they_are_told_and_open_below_nought() -> None:
    (cells,) = figure(CELLS, str)["data"]
    assert cells["marker"]["size"] == [20.0, 5.0]
    assert cells["marker"]["color"] == ["@s1", "@ground"]
    assert cells["marker"]["symbol"] == "square"


@pytest.mark.parametrize(
    ("years", "wide", "narrow"),
    [
        ((2021.0, 2022.0), [2021, 2022], [2021, 2022]),
        ((2001.0, 2019.0), [2005, 2010, 2015], [2005, 2010, 2015]),
        ((1999.0, 2023.0), [2000, 2005, 2010, 2015, 2020], [2000, 2010, 2020]),
    ],
)
def test_however_few_years_two_are_named(
    years: tuple[float, float], wide: list[int], narrow: list[int]
) -> None:
    made = figure(a_chart(x_kind="year", x_range=years), say)
    assert made["layout"]["xaxis"]["tickvals"] == wide
    assert made["narrow"]["xaxis"]["tickvals"] == narrow
