"""The trend as data: lines, bands and table are the same numbers; the statements do not grow."""

from collections.abc import Callable
from contextlib import AbstractContextManager
from dataclasses import replace

import numpy as np
import pytest

from server.exports.table import Gap, Table
from server.pages.trend import TrendPage, build
from server.results.holdings import NotInEdition
from server.results.questions import TrendQuestion
from server.results.series import TooLarge
from server.sentences.numbers import number
from server.sentences.pieces import plain
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import edition, gompertz_panel

YEARS = tuple(str(year) for year in range(2005, 2015))


@pytest.fixture
def isle(session: Session) -> Session:
    """Ten years in which the north gains and the rock is too small to tell; 2014 is provisional."""
    panels = {}
    for seed, year in enumerate(YEARS):
        for sex in "fm":
            level = (2.2e-5 if sex == "f" else 3.4e-5) - 8e-7 * seed
            panels[f"north.{sex}.{year}"] = gompertz_panel(
                sex=sex, seed=seed, level=level, people=2e6
            )
            panels[f"rock.{sex}.{year}"] = gompertz_panel(sex=sex, seed=seed, people=9e3)
    edition(
        session, panels, parents=dict.fromkeys(("north", "rock"), "isle"), provisional=("2014",)
    )
    return session


def page(
    session: Session, of: str = "e0", *, number: int = 1, **asked: tuple[str, ...]
) -> TrendPage:
    question = TrendQuestion(of, **asked).completed(  # type: ignore[arg-type]
        areas=["isle", "north", "rock"], sexes=("f", "m", "p"), periods=YEARS
    )
    return build(session, heading(session, "isle", number), question)


def words(built: TrendPage) -> str:
    said = " ".join(plain(sentence) for sentence in (built.answer, *built.lead))
    return said.replace("\N{NO-BREAK SPACE}", " ")


def rows(table: Table, **where: str) -> list[tuple[object, ...]]:
    at = {table.column(key): text for key, text in where.items()}
    return [row.cells for row in table.rows if all(row.cells[i] == text for i, text in at.items())]


def test_lines_bands_and_tables_are_the_same_numbers(isle: Session) -> None:
    built = page(isle, areas=("north", "rock"))
    (chart,) = built.charts
    long, wide = built.table("estimates"), built.table("years")
    assert [series.sex for series in chart.series] == ["f", "m", "f", "m"]
    found = rows(long, area="north", sex="m")
    line = chart.series[1]
    for key, drawn in (("value", line.y), ("value_low", line.low), ("value_high", line.high)):
        assert [row[long.column(key)] for row in found] == list(drawn)
    printed = [row.cells[wide.column("north.m")] for row in reversed(wide.rows)]
    assert printed == list(line.y)
    assert line.provisional == (False,) * 9 + (True,)
    assert [row.provisional for row in wide.rows] == [True] + [False] * 9
    low, high = chart.y_range
    assert all(low <= value <= high for value in (*line.low, *line.high))  # type: ignore[operator]


def test_the_whole_comes_first_and_colours_follow_the_palette(isle: Session) -> None:
    both = page(isle, areas=("north", "isle"))
    assert words(both).startswith("Women of Isle gained")
    assert "women of North +" in words(both)
    assert [series.role for series in both.charts[0].series] == ["s1", "s1", "s2", "s2"]


def test_from_the_lines_one_can_go_on(isle: Session) -> None:
    built = page(isle, "H", areas=("north",), sexes=("m",))
    changes, lives = (sentence[1] for sentence in built.further)
    assert changes.href.startswith("/c/isle/1/comparison?this=north.m.2014&that=north.m.2005&of=H")
    assert lives.href.startswith("/c/isle/1/population-year?of=north.m.2014")
    assert "more alike" in words(built)
    assert page(isle, "e67", areas=("north",)).further == ()


def test_small_populations_are_flagged(isle: Session) -> None:
    told = {caution.word: caution.text for caution in page(isle, areas=("rock", "north")).cautions}
    assert "women of Rock" in told["Small numbers"]
    assert "North" not in told["Small numbers"]
    assert "2014 is provisional" in told["Provisional"]


def test_what_cannot_be_read_is_a_gap_with_its_reason(isle: Session) -> None:
    built = page(isle, "e67", areas=("north",))
    assert not built.drawn
    assert "fewer than two" in words(built)
    assert all(isinstance(row.cells[1], Gap) for row in built.table("years").rows)
    assert "Not drawn" in [caution.word for caution in built.cautions]


@pytest.mark.parametrize("of", ["e0", "H", "median"])
def test_the_statements_do_not_grow_with_the_series(
    isle: Session, of: str, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    counts = []
    for areas, first in ((("north",), "2013"), (("isle", "north", "rock"), "2005")):
        with count_statements() as statements:
            page(isle, of, areas=areas, first=(first), sexes=("f", "m", "p"))  # type: ignore[arg-type]
        counts.append(len(statements))
    assert counts[0] == counts[1] <= 8


def test_a_newer_edition_is_named_with_what_it_moves(isle: Session) -> None:
    edition(isle, {"north.f.2014": gompertz_panel(seed=50, level=1.2e-5, people=2e6)})
    built = page(isle, areas=("north",), sexes=("f",))
    (notice,) = built.frame.notices
    assert "Edition 2" in plain(notice.text)
    assert "Life expectancy at birth of women of North in 2014" in plain(notice.text)
    assert page(isle, number=2, areas=("north",)).frame.notices == ()
    for unread in (page(isle, "e67"), page(isle, first="2014")):  # type: ignore[arg-type]
        assert [notice.word for notice in unread.frame.notices] == ["A newer edition stands"]


def test_areas_that_are_not_there_and_questions_too_large_are_refused(isle: Session) -> None:
    with pytest.raises(NotInEdition, match="areas are"):
        page(isle, areas=("atlantis",))
    with pytest.raises(TooLarge, match="at most"):
        build(
            isle,
            heading(isle, "isle", 1),
            TrendQuestion("mode", ("isle", "north", "rock") * 60, ("f", "m", "p"), "2005", "2014"),
        )


def told(built: TrendPage) -> dict[str, str]:
    return {caution.word: caution.text for caution in built.cautions}


def test_of_ratios_to_the_whole_only_the_last_is_told(isle: Session) -> None:
    built = page(isle, "smr", areas=("rock", "north"), sexes=("f",))
    estimates = built.table("estimates")
    cells = rows(estimates, area="north", sex="f", year="2014")[0]
    value, low, high = (
        number(cells[estimates.column(key)], 2)  # type: ignore[arg-type]
        for key in ("value", "value_low", "value_high")
    )
    assert f"among women of North in 2014: {value} ({low} to {high})." in words(built)
    for claim in ("rose", "fell", "No clear change", "two halves", "Over the same", "out of five"):
        assert claim not in words(built), claim
    assert "do not compare with one another" in told(built)["Not comparable"]
    assert "Small numbers" not in told(built)  # it would set one beside a change
    changes, lives = built.further
    for link in (piece for piece in changes if piece.href):
        assert "&of=e0&" in link.href
    assert "population-year?of=north.f.2014" in lives[1].href
    assert "Not comparable" not in told(page(isle, "asr_esp2013", areas=("north",)))


def test_the_whole_itself_has_no_ratio_and_says_why(isle: Session) -> None:
    built = page(isle, "smr", areas=("isle",), sexes=("f",))
    assert not built.drawn
    assert "fewer than two" in words(built)
    assert "part of no larger one" in told(built)["Not drawn"]
    assert built.further == ()


def test_how_small_a_change_could_have_been_seen_stands_beside_an_unclear_one(
    isle: Session,
) -> None:
    unclear = words(page(isle, areas=("rock",), sexes=("f",), first="2010"))  # type: ignore[arg-type]
    assert "No clear change" in unclear
    assert "would have been seen four times out of five" in unclear
    clear = words(page(isle, areas=("north",), sexes=("f",)))
    assert "gained" in clear
    assert "four times out of five" not in clear


def test_a_standardised_rate_has_its_unit_and_leads_on_to_its_own_comparison(
    isle: Session,
) -> None:
    built = page(isle, "asr_esp2013", areas=("north",), sexes=("f",))
    assert "among women of North fell by" in words(built)
    assert "per 100,000 person-years between 2005 and 2014" in words(built)
    assert "&of=asr_esp2013&" in built.further[0][1].href


def test_years_added_up_are_named_by_their_first_and_last(isle: Session) -> None:
    pooled = {"areas": ("north",), "sexes": ("f",), "settings": "almanac-1-3-years"}
    built = page(isle, **pooled)  # type: ignore[arg-type]
    assert "between 2005–2007 and 2012–2014" in words(built)
    assert [row.cells[0] for row in built.table("years").rows] == list(reversed(YEARS[2:]))
    assert "the year named and the 2 before it" in told(built)["Years added up"]
    assert "this=north.f.2014&that=north.f.2007" in built.further[0][1].href
    assert "settings=almanac-1-3-years" in built.further[0][1].href
    assert "Years added up" not in told(page(isle, areas=("north",)))


@pytest.mark.parametrize(("deaths", "flagged"), [(10.0, True), (19.0, True), (20.0, False)])
def test_rates_that_rest_on_few_deaths_are_flagged(
    session: Session, deaths: float, flagged: bool
) -> None:
    some = gompertz_panel(people=2e4)
    counted = np.zeros_like(some.deaths)
    counted[17:19] = deaths / 2
    few = replace(some, deaths=counted)
    edition(session, {"islet.f.2013": some, "islet.f.2014": few})
    question = TrendQuestion("asr_esp2013").completed(
        areas=["islet"], sexes=("f",), periods=("2013", "2014")
    )
    built = build(session, heading(session, "isle", 1), question)
    assert ("Few deaths" in told(built)) is flagged
    assert not flagged or "For women of Islet the rate of some years" in told(built)["Few deaths"]
    other = build(session, heading(session, "isle", 1), replace(question, of="cdr"))
    assert "Few deaths" not in told(other)
