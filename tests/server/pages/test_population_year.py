"""The page as data: sentence, table and picture say the same."""

import math
from collections.abc import Callable
from contextlib import AbstractContextManager

import pytest

from engine.ages import AgeGrid
from engine.indicators import find
from server.charts.chart import Chart
from server.exports.table import Gap, GapKind, Row
from server.pages.population_year import PopulationYearPage, build
from server.pages.printed import printed
from server.results.estimating import USUAL
from server.results.questions import PopulationYear, PopulationYearQuestion
from server.sentences.numbers import number
from server.sentences.pieces import plain
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import GRIDS, edition, gompertz_panel

FIVE = GRIDS["abridged"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])
GRIDS_ = {"north": FIVE, "single": GRIDS["single"], "odd": GRIDS["irregular"], "cape": SHORT}


@pytest.fixture
def isle(session: Session) -> Session:
    """The north by five years, one area by single years, one by odd ages, the cape to 85+, the rock
    with hardly anybody; all are parts of the isle."""
    panels = {}
    for seed, year in enumerate(("2013", "2014")):
        for sex in "fm":
            for area, grid in GRIDS_.items():
                level, people = 2.6e-5 - 1e-6 * seed, 2e6
                base = FIVE if grid is SHORT else grid
                panel = gompertz_panel(base, sex=sex, seed=seed, level=level, people=people)
                panels[f"{area}.{sex}.{year}"] = panel.regroup(grid) if grid is SHORT else panel
            panels[f"rock.{sex}.{year}"] = gompertz_panel(sex=sex, seed=seed, people=4_000)
    parents = dict.fromkeys((*GRIDS_, "rock"), "isle")
    edition(session, panels, parents=parents, provisional=("2014",))
    return session


def page(
    session: Session, of: str, settings: str = "almanac-1", number: int = 1
) -> PopulationYearPage:
    question = PopulationYearQuestion(PopulationYear.parse(of), settings=settings)
    return build(session, heading(session, "isle", number), question)


def row(built: PopulationYearPage, key: str) -> Row:
    return built.table("figures").rows[USUAL.index(key)]


def words(built: PopulationYearPage) -> str:
    said = " ".join(plain(sentence) for sentence in (built.answer, *built.lead))
    return said.replace("\N{NO-BREAK SPACE}", " ")


@pytest.mark.parametrize("area", ["north", "single", "odd"])
def test_sentence_table_and_picture_agree_after_rounding(isle: Session, area: str) -> None:
    built = page(isle, f"{area}.f.2014")
    cells = printed(built.table("figures")).rows[0].cells
    assert f"could expect {cells[1].text} years of life ({cells[1].under})" in words(built)
    shown = {key: number(row(built, key).cells[1], find(key).unit.decimals) for key in USUAL}  # type: ignore[arg-type]
    assert f"Half would live past age {shown['median']}." in words(built)
    assert f"costs {shown['edagger']} years" in words(built)
    assert f"(H) of {shown['H']}" in words(built)
    deaths = built.chart("deaths")
    assert [mark.label for mark in deaths.marks] == [
        f"mean {shown['e0']}",
        f"median {shown['median']}",
        f"most common {shown['mode']}",
    ]
    assert shown["mode"] in deaths.finding
    assert f"{shown['ageing_rate']}\N{NO-BREAK SPACE}%" in built.chart("rise").finding


def column(built: PopulationYearPage, key: str, table: str = "life") -> list[float]:
    found = built.table(table)
    return [line.cells[found.column(key)] for line in found.rows]  # type: ignore[misc]


@pytest.mark.parametrize("area", ["north", "single", "odd"])
def test_pictures_are_drawn_from_the_tables(isle: Session, area: str) -> None:
    built = page(isle, f"{area}.m.2014")
    survivors, deaths, rates = (built.chart(key) for key in ("survivors", "deaths", "rates"))
    assert list(survivors.series[0].y) == column(built, "lx")
    widths = deaths.series[0].widths
    drawn = [height * width for height, width in zip(deaths.series[0].y, widths, strict=True)]  # type: ignore[operator]
    assert drawn == pytest.approx(column(built, "dx")[:-1])
    assert list(rates.series[0].y) == pytest.approx(column(built, "mx")[:-1])
    assert list(built.chart("gain").series[0].y) == column(built, "days_per_year", "gain")[:-1]
    k = built.chart("rise").series[0]
    assert list(k.y) == column(built, "rise", "rise")
    assert list(k.low) == column(built, "rise_low", "rise")


def test_the_life_table_is_of_100000_born(isle: Session) -> None:
    built = page(isle, "north.f.2014")
    assert column(built, "lx")[0] == 100_000
    assert sum(column(built, "dx")) == pytest.approx(100_000)
    assert column(built, "ex")[0] == row(built, "e0").cells[1]


def test_only_what_a_low_open_age_allows_is_said_and_drawn(isle: Session) -> None:
    built = page(isle, "cape.f.2014")
    for key in ("mode", "edagger", "H"):
        gap = row(built, key).cells[1]
        assert isinstance(gap, Gap)
        assert gap.kind is GapKind.UNDEFINED
        assert "last, open age group" in gap.reason
    assert "cannot be read off a table that ends at 85" in words(built)
    assert [mark.label.split()[0] for mark in built.chart("deaths").marks] == ["mean", "median"]
    assert built.chart("survivors").series[0].x[-1] == 85
    law = page(isle, "cape.f.2014", "almanac-1-kannisto")
    assert "cannot be read" not in words(law)
    assert "Model" in [caution.word for caution in law.cautions]
    own, beyond = law.chart("deaths").series
    assert (own.x[-1], beyond.x[0], beyond.label) == (82.5, 85.5, "fitted law")
    assert isinstance(law.table("life").rows[-1].cells[1], Gap)


def test_of_too_few_people_no_life_table_is_read(isle: Session) -> None:
    built = page(isle, "rock.f.2014")
    assert "no life expectancy can be given" in words(built)
    assert built.drawn <= {"rates"}
    life = built.table("life")
    for key in ("qx", "lx", "dx", "ex"):
        assert all(isinstance(line.cells[life.column(key)], Gap) for line in life.rows)
    assert isinstance(life.rows[-5].cells[life.column("person_years")], float)


def test_cautions_stand_where_the_figure_is(isle: Session) -> None:
    told = {caution.word: caution.text for caution in page(isle, "north.f.2014").cautions}
    assert told["Provisional"].startswith("2014 is provisional")
    assert "no forecast" in told["Reading"]
    assert "chance in the number of deaths only" in told["Chance"]
    assert "Provisional" not in [one.word for one in page(isle, "north.f.2013").cautions]
    few = {one.word: one.text for one in page(isle, "rock.f.2014").cautions}
    assert "below 20,000" in few["Few people"].lower()
    assert "nil" in few["No deaths"]
    beside = [one.word for one in page(isle, "rock.f.2014").cautions if one.beside]
    assert beside == ["Provisional", "Moved before", "Few people"]


def test_the_year_before_stands_beside_where_there_is_one(isle: Session) -> None:
    heads = [head.label for head in page(isle, "north.f.2014").table("figures").columns]
    assert [heads[index] for index in (1, 4, 7)] == ["2014, provisional", "2013", "change"]
    assert "than in 2013" in words(page(isle, "north.f.2014"))
    assert len(page(isle, "north.f.2013").table("figures").columns) == 4


def test_further_leads_to_comparisons_the_edition_holds(isle: Session) -> None:
    built = page(isle, "north.f.2014")
    links = {piece.text: piece.href for sentence in built.further for piece in sentence}
    assert "this=north.f.2014&that=north.f.2013" in links["against 2013"]
    assert "that=north.m.2014" in links["against men"]
    assert "that=isle.f.2014" in links["against Isle, of which it is part"]
    assert "area=north&sex=f&from=2013&to=2014" in links["Life expectancy from 2013 to 2014"]


def test_every_chart_by_age_shares_one_axis_and_has_its_table(isle: Session) -> None:
    for of in ("north.f.2014", "single.m.2013", "cape.p.2014"):
        built = page(isle, of)
        assert {chart.x_range for chart in built.charts} == {(0.0, 100.0)}
        for chart in built.charts:
            built.table(chart.table)
            assert_drawable(chart)


def assert_drawable(chart: Chart) -> None:
    """Finite numbers, inside the picture, gaps as None."""
    low, high = chart.y_range
    assert math.isfinite(low)
    assert low < high
    for series in chart.series:
        assert len(series.x) == len(series.y)
        for value in (*series.y, *series.low, *series.high):
            assert value is None or low <= value <= high
    assert all(low <= tick <= high for tick in chart.y_ticks)


def test_eight_statements_at_most(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    edition(isle, {"north.f.2014": gompertz_panel(seed=5)})
    with count_statements() as statements:
        assert page(isle, "north.p.2014").frame.notices
    assert len(statements) <= 8
