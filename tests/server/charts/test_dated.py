"""Breaks and years of shock on a figure: rules and hatches that read in grey, words apart."""

from typing import Any

import plotly.graph_objects as go

from server.charts.chart import Break, Chart, Series, Shock
from server.charts.figure import figure
from tests.server.charts.records import a_chart

YEARS = tuple(float(year) for year in range(2000, 2021))


def dated(*breaks: Break, shocks: tuple[Shock, ...] = ()) -> Chart:
    line = Series("north", YEARS, tuple(80.0 for _ in YEARS), at="end")
    return a_chart(
        key="dated",
        x_kind="year",
        x_range=(2000.0, 2020.0),
        y_range=(78.0, 84.0),
        y_ticks=(80.0, 82.0),
        series=(line,),
        breaks=breaks,
        shocks=shocks,
    )


def said(drawn: dict[str, Any], measure: str, texts: set[str]) -> list[dict[str, Any]]:
    layout = drawn["layout"] if measure == "wide" else drawn[measure]
    return [one for one in layout["annotations"] if one["text"] in texts]


def test_words_of_breaks_that_would_meet_stand_on_lines_of_their_own() -> None:
    near = dated(
        Break(2011.5, "2012: new population base", "2012 base"),
        Break(2012.5, "2013: new boundaries", "2013 boundaries"),
        Break(2000.5, "2001: new definition", "2001 definition"),
    )
    words = said(figure(near, str), "wide", {one.label for one in near.breaks})
    lifts = {one["text"][:4]: one["yshift"] for one in words}
    assert lifts["2012"] != lifts["2013"]
    first = next(one for one in words if one["text"].startswith("2001"))
    assert first["xanchor"] == "left"  # no room before the first year
    assert {one["xanchor"] for one in words if one is not first} == {"right"}
    rules = [one for one in figure(near, str)["layout"]["shapes"] if one["type"] == "line"]
    assert sorted(one["x0"] for one in rules if one["xref"] == "x") == [2000.5, 2011.5, 2012.5]
    assert all(one["line"]["dash"] != "solid" for one in rules if one["xref"] == "x")


def test_far_breaks_share_a_line() -> None:
    far = dated(Break(2008.5, "2009: base", "2009"), Break(2018.5, "2019: base", "2019"))
    lifts = {one["yshift"] for one in said(figure(far, str), "wide", {"2009: base", "2019: base"})}
    assert len(lifts) == 1


def test_a_year_of_shock_is_a_hatched_band_inside_the_scale_with_its_word() -> None:
    chart = dated(shocks=(Shock(2019.5, 2020.5, "year of shock", "shock"),))
    drawn = figure(chart, str)
    band = drawn["data"][0]
    assert band["fillpattern"]["shape"] == "/"
    assert (min(band["x"]), max(band["x"])) == (2019.5, 2020.0)
    assert (min(band["y"]), max(band["y"])) == (78.0, 84.0)
    assert [one["text"] for one in said(drawn, "wide", {"year of shock", "shock"})] == [
        "year of shock"
    ]
    assert [one["text"] for one in said(drawn, "narrow", {"year of shock", "shock"})] == ["shock"]
    assert figure(dated(), str)["data"][0].get("fillpattern") is None
    go.Figure({"data": [{**band, "fillpattern": {**band["fillpattern"], "fgcolor": "#123456"}}]})
