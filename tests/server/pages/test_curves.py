"""The page of curves as data: sentence, table and picture say the same."""

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import chi2, norm

from engine.ages import AgeGrid
from server.charts.chart import Series
from server.exports.table import Gap, GapKind, Table
from server.pages import curves, population_year
from server.pages.curves import CurvesPage
from server.pages.printed import printed
from server.results.questions import (
    CurvesQuestion,
    PopulationYear,
    PopulationYearQuestion,
    address,
)
from server.sentences.numbers import number
from server.sentences.pieces import plain
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import GRIDS, edition, gompertz_panel

FIVE, SINGLE = GRIDS["abridged"], GRIDS["single"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])


@pytest.fixture
def isle(session: Session) -> Session:
    """The north by five years, one area by single years, the cape to 85+, the rock with hardly
    anybody; all are parts of the isle."""
    panels = {}
    for seed, sex in enumerate("fm"):
        north = gompertz_panel(sex=sex, seed=seed, level=2.2e-5, people=2e6)
        panels[f"north.{sex}.2014"] = north
        panels[f"single.{sex}.2014"] = gompertz_panel(SINGLE, sex=sex, seed=seed, people=2e6)
        panels[f"cape.{sex}.2014"] = gompertz_panel(sex=sex, seed=seed, people=3e5).regroup(SHORT)
        panels[f"rock.{sex}.2014"] = gompertz_panel(sex=sex, seed=seed, people=4e3)
    parents = dict.fromkeys(("north", "single", "cape", "rock"), "isle")
    edition(session, panels, parents=parents, provisional=("2014",))
    return session


def page(session: Session, of: str, number: int = 1) -> CurvesPage:
    question = CurvesQuestion(PopulationYear.parse(of))
    return curves.build(session, heading(session, "isle", number), question)


def words(built: CurvesPage) -> str:
    said = " ".join(plain(sentence) for sentence in (built.answer, *built.lead))
    return said.replace("\N{NO-BREAK SPACE}", " ")


def column(table: Table, key: str) -> list[object]:
    at = table.column(key)
    return [row.cells[at] for row in table.rows]


def numbers(table: Table, key: str) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """A column of numbers, nan where there is a gap."""
    cells = column(table, key)
    return np.array([math.nan if isinstance(cell, Gap) else float(cell) for cell in cells])  # type: ignore[arg-type]


def series(built: CurvesPage, label: str) -> Series:
    return next(one for one in built.chart("rates").series if one.label == label)


@pytest.mark.parametrize("of", ["north.f.2014", "single.m.2014", "cape.p.2014", "isle.p.2014"])
def test_the_answer_names_the_law_with_the_least_criterion(isle: Session, of: str) -> None:
    built = page(isle, of)
    table = built.table("laws")
    adult = [row for row in table.rows if row.cells[table.column("from")] == 40]
    best = min(adult, key=lambda row: row.cells[table.column("aic")])  # type: ignore[arg-type, return-value]
    assert f"the law of {best.cells[0]} " in words(built)
    cells = printed(table).rows[table.rows.index(best)].cells
    texts = {cell.label: cell for cell in cells}
    mode, rise = texts["most deaths"], texts["rise"]
    assert f"gather about age {mode.text} ({mode.under})" in words(built)
    assert f"rise at {rise.text} % ({rise.under}) per year of age" in words(built)
    assert f"deviance {texts['deviance'].text} with {texts['groups'].text} age groups" in words(
        built
    )


def test_squares_of_the_distances_add_up_to_the_deviance(isle: Session) -> None:
    built = page(isle, "north.f.2014")
    far = numbers(built.table("residuals"), "residual")
    laws = built.table("laws")
    best = np.nanmin(numbers(laws, "aic")[numbers(laws, "from") == 40])
    deviance = numbers(laws, "deviance")[list(numbers(laws, "aic")).index(best)]
    assert np.sum(far**2) == pytest.approx(deviance)
    table = built.table("residuals")
    assert np.sign(numbers(table, "more")) == pytest.approx(np.sign(far))
    more = numbers(table, "deaths") - numbers(table, "expected")
    assert numbers(table, "more") == pytest.approx(more, abs=1e-9)


@pytest.mark.parametrize("of", ["north.f.2014", "single.m.2014", "isle.p.2014"])
def test_the_verdict_is_that_of_chi_square(isle: Session, of: str) -> None:
    built = page(isle, of)
    far = numbers(built.table("residuals"), "residual")
    laws = built.table("laws")
    best = list(numbers(laws, "aic")).index(
        np.nanmin(numbers(laws, "aic")[numbers(laws, "from") == 40])
    )
    free = numbers(laws, "free")[best]
    misses = chi2.sf(np.sum(far**2), free) < 0.05
    assert ("but misses more than chance would" in words(built)) == misses
    assert ("farther from it than chance brings them" in words(built)) == misses
    assert f"seldom goes above {chi2.isf(0.05, free):.1f}." in words(built)
    each = norm.ppf((1 + 0.95 ** (1 / len(far))) / 2)
    clear = np.abs(far).max() > each
    finding = built.chart("residuals").finding
    assert ("No age group lies farther" in finding) == (not clear)
    ages = column(built.table("residuals"), "age")[int(np.abs(far).argmax())]
    assert (f"age {ages}," in finding) == clear


def test_one_group_far_from_the_law_is_named(isle: Session) -> None:
    panel = gompertz_panel(people=2e6)
    more = np.where(np.array(FIVE.starts) == 60, 1.3, 1.0)
    edition(isle, {"spike.f.2014": replace(panel, deaths=more * panel.deaths)}, code="isle")
    built = page(isle, "spike.f.2014", number=2)
    assert built.chart("residuals").finding.startswith("Farthest from the law: age 60–64, with ")
    assert "deaths more" in built.chart("residuals").finding
    assert "but misses more than chance would" in words(built)


def test_other_laws_are_told_by_how_much_more_their_criterion_is(isle: Session) -> None:
    edition(isle, {"islet.f.2014": gompertz_panel(people=1e5, seed=3, accidents=0.0)})
    built = page(isle, "islet.f.2014", number=2)
    table = built.table("laws")
    adult = {
        str(row.cells[0]): float(row.cells[table.column("aic")])  # type: ignore[arg-type]
        for row in table.rows
        if row.cells[table.column("from")] == 40
    }
    least = min(adult.values())
    near = {name: value - least for name, value in adult.items() if 0 < value - least < 2}
    assert near
    said = plain(built.laws)
    for name, more in near.items():
        assert f"{name} ({number(more, 1)} more)" in said


@pytest.mark.parametrize("of", ["north.f.2014", "isle.p.2014"])
def test_the_law_leaves_the_band_where_the_finding_says(isle: Session, of: str) -> None:
    built = page(isle, of)
    smooth, law = series(built, "smooth curve"), built.chart("rates").series[-1]
    at = np.array(law.x)
    low, high = (
        np.interp(at, smooth.x, np.array(side, float)) for side in (smooth.low, smooth.high)
    )
    drawn = np.array(law.y, float)
    outside = at[(drawn < low) | (drawn > high)]
    finding = built.chart("rates").finding
    assert ("keeps within the band" in finding) == (not outside.size)
    assert not outside.size or f" ages {outside[0]:.0f}" in finding
    law_column = numbers(built.table("curves"), "law")
    known = np.isfinite(law_column)
    middles = np.interp(FIVE.mids[: len(known)][known], at, np.log(drawn))
    assert np.log(law_column[known]) == pytest.approx(middles, abs=0.06)


def test_pictures_show_what_the_tables_hold(isle: Session) -> None:
    built = page(isle, "north.f.2014")
    table = built.table("curves")
    assert column(table, "age") == list(FIVE.labels[:-1])
    dots = series(built, "as counted")
    counted = numbers(table, "counted")
    assert dots.draw == "dots"
    assert dots.y == pytest.approx(counted[np.isfinite(counted)])
    smooth = series(built, "smooth curve")
    at = np.flatnonzero(np.isfinite(numbers(table, "smooth")))
    for drawn, key in (
        (smooth.y, "smooth"),
        (smooth.low, "smooth_low"),
        (smooth.high, "smooth_high"),
    ):
        between = np.exp(np.interp(FIVE.mids[at], smooth.x, np.log(np.array(drawn, float))))
        assert numbers(table, key)[at] == pytest.approx(between, rel=5e-3)
    law = built.chart("rates").series[-1]
    assert law.label.startswith("law of ")
    assert (law.x[0], law.x[-1]) == (40.0, 100.0)
    bars = built.chart("residuals").series[:2]
    far = sorted(float(y) for one in bars for y in one.y if y is not None)
    assert far == pytest.approx(sorted(numbers(built.table("residuals"), "residual")))
    assert all(y >= 0 for y in bars[0].y if y is not None)
    assert all(y < 0 for y in bars[1].y if y is not None)


def test_curves_begin_where_they_were_fitted_and_say_why(isle: Session) -> None:
    table = page(isle, "north.f.2014").table("curves")
    first = {
        key: next(row.cells[0] for row in table.rows if not isinstance(row.cells[at], Gap))
        for key in ("smooth", "graduated", "law")
        for at in (table.column(key),)
    }
    assert first == {"smooth": "10–14", "graduated": "10–14", "law": "40–44"}
    gaps = [cell for row in table.rows for cell in row.cells if isinstance(cell, Gap)]
    assert all(gap.reason for gap in gaps if gap.kind is GapKind.UNDEFINED)


def test_single_years_stand_only_where_groups_were_wider(isle: Session) -> None:
    grouped, single = page(isle, "north.f.2014"), page(isle, "single.f.2014")
    table = grouped.table("single")
    assert column(table, "age") == list(range(100))
    assert grouped.single
    assert single.single == ()
    assert "single" not in [one.key for one in single.tables]
    rate = numbers(table, "rate")
    worked = 1000 * numbers(table, "deaths") / numbers(table, "person_years")
    assert rate == pytest.approx(worked, rel=1e-9)
    assert "Rizzi" in " ".join(plain(step) for step in grouped.computed)
    assert "Rizzi" not in " ".join(plain(step) for step in single.computed)


def test_single_years_as_counted_are_a_line(isle: Session) -> None:
    line = series(page(isle, "single.f.2014"), "as counted")
    assert (line.draw, line.weight) == ("line", "many")


def test_level_and_shape_in_sentence_and_table(isle: Session) -> None:
    built = page(isle, "cape.f.2014")
    table = built.table("relation")
    level, shape = (number(table.rows[at].cells[1], 3) for at in (0, 1))  # type: ignore[arg-type]
    said = plain(built.related[0])
    assert "Against Isle" in said
    assert level.lstrip("+") in said
    assert shape in said
    for of in ("isle.f.2014", "north.f.2014"):  # no whole, and a whole of coarser ages
        without = page(isle, of)
        assert without.related == ()
        assert "relation" not in [one.key for one in without.tables]


def test_hardly_anybody_has_a_page_that_says_why(isle: Session) -> None:
    built = page(isle, "rock.f.2014")
    assert words(built).startswith("No law could be fitted to the death rates of women of Rock")
    assert "too few" in words(built)
    assert [one.key for one in built.tables] == ["curves"]
    assert built.drawn == {"rates"}
    assert built.laws == ()


def test_life_table_and_curves_lead_to_one_another(isle: Session) -> None:
    of = PopulationYear.parse("north.f.2014")
    there, back = (
        address("isle", 1, kind(of)) for kind in (CurvesQuestion, PopulationYearQuestion)
    )
    life = population_year.build(isle, heading(isle, "isle", 1), PopulationYearQuestion(of))
    assert there in [piece.href for said in life.further for piece in said]
    built = page(isle, of.code)
    hrefs = [piece.href for said in built.further for piece in said if piece.href]
    assert hrefs[0] == back
    others = [href.split("of=")[1].split("&")[0] for href in hrefs if "/curves?" in href]
    assert others == ["north.m.2014", "north.p.2014", "isle.f.2014"]
    assert "comparison?this=north.f.2014&that=isle.f.2014" in hrefs[-1]
    assert built.choice.action == "/c/isle/1/curves"


def test_the_page_warns_of_what_moves_it(isle: Session) -> None:
    told = [caution.word for caution in page(isle, "rock.m.2014").cautions]
    assert told[:2] == ["Provisional", "Few people"]
    assert told[-2:] == ["Law", "Chance"]


def test_a_newer_edition_is_said_by_the_rise_of_the_law(isle: Session) -> None:
    steeper = gompertz_panel(people=2e6, seed=1, slope=0.11, level=1e-5)
    edition(isle, {"north.f.2014": steeper}, parents={"north": "isle"})
    notice = " ".join(plain(one.text) for one in page(isle, "north.f.2014").frame.notices)
    assert "more here. Rise of death rates with age by the law of " in notice
