"""An edition's contents as data; the list of collections."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import pytest

from server.exports.table import Gap, GapKind
from server.pages import collections as collections_page
from server.pages import editions as editions_page
from server.pages.contents import ContentsPage, build
from server.results.contents import ContentsQuestion
from server.results.questions import PopulationYear
from server.sentences.pieces import plain
from server.store.connect import Session
from server.store.heading import heading
from server.store.records import Cause
from tests.factories import edition, gompertz_panel, stored_collection, withdrawn

YEARS = ("2001", "2002", "2013", "2014")


@pytest.fixture
def isle(session: Session) -> Session:
    """A whole of two parts; the rock is too small to tell, and has no 2014."""
    panels = {}
    for seed, year in enumerate(YEARS):
        for sex in "fm":
            panels[f"north.{sex}.{year}"] = gompertz_panel(sex=sex, seed=seed, people=2e6)
            if year != "2014":
                panels[f"rock.{sex}.{year}"] = gompertz_panel(sex=sex, seed=seed, people=3e3)
    edition(session, panels, provisional=("2014",))
    return session


def page(session: Session, number: int = 1, code: str = "isle") -> ContentsPage:
    return build(session, heading(session, code, number), ContentsQuestion())


def test_the_answer_counts_years_and_areas(isle: Session) -> None:
    built = page(isle)
    assert plain(built.answer) == "The isle, edition 1: 4 years, 2001 to 2014, 2 areas."
    assert plain(built.lead[0]).startswith("In 2014 life expectancy at birth in North was ")


def test_every_area_has_a_figure_or_a_gap(isle: Session) -> None:
    table = page(isle).table("areas")
    assert [column.key for column in table.columns] == [
        *("area", "f", "f_low", "f_high", "m", "m_low", "m_high")
    ]
    north, rock = table.rows
    assert all(isinstance(cell, float) for cell in north.cells[1:])
    assert north.provisional
    assert north.href.startswith("/c/isle/1/population-year?of=north.f.2014&")
    assert rock.href == ""  # it has no 2014 to lead to
    assert [cell.kind for cell in rock.cells[1:] if isinstance(cell, Gap)] == [
        GapKind.NOT_AVAILABLE
    ] * 6


def test_a_comparison_is_proposed_ten_years_apart(isle: Session) -> None:
    choice = page(isle).choice
    assert choice is not None
    assert (choice.this, choice.that) == (
        PopulationYear("north", "f", "2014"),
        PopulationYear("north", "f", "2002"),
    )
    assert [period for period, _label in choice.periods] == ["2014", "2013", "2002", "2001"]
    questions = page(isle).questions
    hrefs = [piece.href for sentence in questions for piece in sentence if piece.href]
    assert [href.split("?")[0].rsplit("/")[-1] for href in hrefs] == [
        *("population-year", "comparison", "trend", "curves"),
        *("what-if", "gaps", "exchange"),
    ]


def test_the_list_of_editions_is_no_part_of_the_figures(isle: Session) -> None:
    edition(isle, {"north.f.2014": gompertz_panel(seed=9)}, note="corrected")
    built = page(isle)
    assert [table.key for table in built.tables] == ["areas"]
    rows = built.editions.tables[0].rows
    assert [(row.cells[0], *row.cells[3:]) for row in rows] == [
        (2, "corrected", "4 changed", "stands"),
        (1, "", "42 new", "superseded"),
    ]
    assert [notice.word for notice in built.frame.notices] == ["A newer edition stands"]
    withdrawn(isle, 2, "isle")
    built = page(isle, 2)
    assert [notice.word for notice in built.frame.notices] == ["Withdrawn"]
    assert built.standing.button == "Reinstate edition 2"
    assert page(isle).frame.notices == ()


def test_one_sex_alone_is_enough(session: Session) -> None:
    edition(session, {"north.m.2014": gompertz_panel(sex="m", seed=1)})
    built = page(session)
    assert [column.label for column in built.table("areas").columns][1] == "men"
    assert built.choice is not None
    assert built.choice.this.sex == "m"


def test_the_statements_do_not_grow_with_the_areas(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    edition(isle, {"part.f.2014": gompertz_panel(seed=1)})
    with count_statements() as statements:
        page(isle, 2)
    few = len(statements)
    edition(isle, {f"part{at}.f.2014": gompertz_panel(seed=at) for at in range(20)})
    with count_statements() as statements:
        page(isle, 3)
    assert len(statements) == few <= 8


def test_collections_say_what_their_newest_standing_edition_says(isle: Session) -> None:
    stored_collection(isle)
    edition(isle, {"north.f.2015": gompertz_panel(seed=9)}, note="2015 added")
    built = collections_page.build(isle)
    assert plain(built.answer) == "There are 2 collections; one of them can be read."
    first, second = built.entries
    assert plain(first.said[0]).startswith("In 2015 life expectancy at birth in North was ")
    assert "2015 added" in dict(first.facts)["Edition"]
    assert first.href == "/c/isle"
    assert (second.href, plain(second.said[0])[:25]) == ("", "It has no edition yet. Up")
    assert [row.cells[0] for row in built.table("collections").rows] == ["isle", "saltmarsh"]


def test_no_collection_leads_to_the_beginning(session: Session) -> None:
    built = collections_page.build(session)
    assert [piece.href for piece in built.answer if piece.href] == ["/"]


@pytest.mark.parametrize(
    ("made", "gone", "said"),
    [
        (1, (), "The isle has one edition, and it stands."),
        (2, (), "The isle has 2 editions; edition 2 stands."),
        (2, (2,), "The isle has 2 editions; edition 1 stands."),
        (2, (2, 1), "The isle has 2 editions, and all of them were withdrawn."),
    ],
)
def test_which_edition_stands(
    session: Session, made: int, gone: tuple[int, ...], said: str
) -> None:
    for at in range(made):
        edition(session, {"north.f.2014": gompertz_panel(seed=at)})
    for number in gone:
        withdrawn(session, number, "isle")
    assert plain(editions_page.build(session, "isle").answer) == said


def test_the_list_of_causes_is_folded_and_leads_to_their_page(isle: Session) -> None:
    plain_page = page(isle)
    assert plain_page.causes == ""
    assert not any("Of what do people die" in plain(one) for one in plain_page.questions)
    panel = gompertz_panel(seed=1)
    causes = (
        Cause("body", "Of the body", ranges=("A00-R99",)),
        Cause("heart", "Heart", "body", ("I00-I99", "R96")),
        Cause("falls", "Falls", ranges=("W00-W19",), kind="external"),
    )
    by_cause = {"north.f.2014": {"heart": panel.deaths}}
    edition(isle, {"north.f.2014": panel}, causes=causes, by_cause=by_cause)
    built = page(isle, 2)
    assert built.causes == "The 3 causes of its list"
    rows = [(row.shown, *row.cells) for row in built.table("causes").rows]
    assert rows[1] == ("Heart", "heart", "Of the body", "I00-I99, R96", "natural")
    assert rows[2][4].startswith("external")
    link = next(one for one in built.questions if "Of what do people die" in plain(one))
    href = next(piece.href for piece in link if piece.href)
    assert href.startswith("/c/isle/2/causes?of=north.f.2014&causes=groups&")
