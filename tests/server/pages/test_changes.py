"""What the page of changes says, and where it leads."""

import pytest
from sqlalchemy.orm import Session

from server.pages.account import AccountPage
from server.pages.account import build as build_account
from server.pages.changes import ChangesPage, build
from server.pages.contents import build as build_contents
from server.pages.page import Page
from server.pages.population_year import build as build_population_year
from server.results.account import AccountQuestion
from server.results.changes import ChangesQuestion
from server.results.contents import ContentsQuestion
from server.results.keys import PopulationYear
from server.results.questions import PopulationYearQuestion
from server.sentences.pieces import Sentence, plain
from server.store.heading import heading
from server.store.records import Cause
from tests.factories import edition, gompertz_panel, withdrawn

NORTH = PopulationYear("north", "f", "2014")


@pytest.fixture
def isle(session: Session) -> Session:
    first = {
        f"{area}.f.{year}": gompertz_panel(seed=3)
        for area in ("north", "cape")
        for year in ("2013", "2014")
    }
    edition(session, first, provisional=("2014",))
    final = {name: one for name, one in first.items() if name.endswith("2014")}
    edition(session, final | {"north.f.2013": gompertz_panel(level=3e-5)})
    edition(session, {"north.f.2014": gompertz_panel(level=2.1e-5, people=510_000)})
    return session


def page(session: Session, number: int = 2, **said: object) -> ChangesPage:
    question = ChangesQuestion(**{"since": number - 1} | said)  # type: ignore[arg-type]
    return build(session, heading(session, "isle", number), question)


def account(session: Session, **said: object) -> AccountPage:
    asked: dict[str, object] = {"since": 2, "settings_then": "almanac-1"}
    question = AccountQuestion(NORTH, **asked | said)  # type: ignore[arg-type]
    return build_account(session, heading(session, "isle", 3), question)


def test_the_sentence_names_counts_and_the_largest_move(isle: Session) -> None:
    built = page(isle)
    said = plain(built.answer)
    assert said.startswith(
        "Since edition 1, edition 2 changed the deaths of 2013 in one area and the person-years of"
        " 2013 in one area; life expectancy at birth moved at most by "
    )
    assert said.endswith("years, for women of North in 2013.")
    moved = built.table("headlines").rows[0].cells
    assert f"{abs(float(moved[-1])):.2f}" in said  # type: ignore[arg-type]
    assert "2014 became final with no number moving." in [plain(one) for one in built.lead]


def test_a_status_alone_is_the_whole_answer(session: Session) -> None:
    panel = {"north.f.2014": gompertz_panel(seed=1)}
    edition(session, panel, provisional=("2014",))
    edition(session, panel)
    built = page(session)
    assert plain(built.answer) == (
        "Edition 2 holds the same numbers as edition 1; no life expectancy at birth moved."
    )
    assert [table.key for table in built.tables] == ["statuses"]
    (row,) = built.table("statuses").rows
    assert row.cells[-3:] == ("provisional", "final", "the same")
    assert not built.charts


def test_rows_lead_to_why_and_the_picture_is_in_their_order(isle: Session) -> None:
    built = page(isle, 3)
    (chart,) = built.charts
    rows = built.table("headlines").rows
    assert chart.y_text == tuple(f"{row.shown}, {row.cells[1]}, {row.cells[2]}" for row in rows)
    assert list(chart.series[0].x) == [row.cells[-1] for row in rows]
    assert rows[0].href == (
        "/c/isle/3/account?of=e0&at=north.f.2014&since=2&figures=released&settings=almanac-1"
        "&settings_then=almanac-1"
    )


def test_a_long_list_is_folded_under_its_picture(session: Session) -> None:
    assert page(_revised(session, 20)).all_moved == ""


def test_and_says_how_long_it_is(session: Session) -> None:
    built = page(_revised(session, 21))
    assert built.all_moved == "All 21 areas, sexes and years where it moved"
    assert len(built.table("headlines").rows) == 21
    assert len(built.charts[0].series[0].x) == 20


def _revised(session: Session, years: int) -> Session:
    """Every year of one area is another."""
    for level in (2e-5, 3e-5):
        panel = gompertz_panel(level=level)
        edition(session, {f"north.f.{1990 + year}": panel for year in range(years)})
    return session


def test_a_withdrawn_edition_says_so(isle: Session) -> None:
    withdrawn(isle, 3, "isle")
    assert [notice.word for notice in page(isle, 3).frame.notices] == ["Withdrawn"]


def test_the_account_says_its_parts_and_that_they_add_up(isle: Session) -> None:
    built = account(isle)
    parts = built.table("parts")
    amounts = [float(row.cells[-1]) for row in parts.rows]  # type: ignore[arg-type]
    assert parts.total is not None
    assert sum(amounts) == pytest.approx(parts.total.cells[-1], abs=1e-12)
    assert [abs(one) for one in amounts] == sorted(map(abs, amounts), reverse=True)
    assert {row.cells[0] for row in parts.rows} == {"deaths", "population"}
    said = plain(built.answer)
    assert said.startswith("Life expectancy at birth of women of North in 2014 is ")
    assert "lower than it was: deaths " in said
    left = [plain(one) for one in built.lead]
    assert "The same on both sides, and so left out: make-up of the area and settings." in left


def test_an_account_of_nothing_and_one_of_a_printed_number(isle: Session) -> None:
    same = account(isle, since=1, of="e0", settings_then="almanac-1", printed="70.0")
    assert "engine" in {row.cells[0] for row in same.table("parts").rows}
    question = AccountQuestion(
        PopulationYear("cape", "f", "2013"), 1, "e0", "released", "almanac-1", "almanac-1"
    )
    built = build_account(isle, heading(isle, "isle", 3), question)
    assert plain(built.answer).endswith("reads the same: nothing it rests on is another.")


def links(built: Page, sentences: tuple[Sentence, ...]) -> list[str]:
    pieces = [piece for sentence in sentences for piece in sentence]
    pieces += [piece for notice in built.frame.notices for piece in notice.text]
    return [piece.href for piece in pieces if piece.href]


def test_contents_population_years_and_notices_lead_there(isle: Session) -> None:
    contents = build_contents(isle, heading(isle, "isle", 2), ContentsQuestion())
    found = links(contents, contents.questions)
    assert "/c/isle/2/changes?since=1&figures=released&settings=almanac-1" in found
    assert "/c/isle/3/changes?since=2&figures=released&settings=almanac-1" in found  # its notice
    question = PopulationYearQuestion(NORTH)
    lived = build_population_year(isle, heading(isle, "isle", 2), question)
    found = links(lived, lived.further)
    assert any(one.startswith("/c/isle/2/account?of=e0&at=north.f.2014&since=1") for one in found)
    assert "/c/isle/3/changes?since=2&figures=released&settings=almanac-1" in found
    first = build_contents(isle, heading(isle, "isle", 1), ContentsQuestion())
    assert not [one for one in links(first, first.questions) if one.startswith("/c/isle/1/changes")]


def test_deaths_by_cause_that_are_others_are_counted_by_cause(session: Session) -> None:
    women = gompertz_panel(seed=4)
    handed = {f"north.f.{year}": women for year in (2012, 2013)}
    list_ = (Cause("heart", "Hearts"), Cause("lungs", "Lungs"))
    edition(session, handed, causes=list_, by_cause={"north.f.2012": {"heart": women.deaths}})
    moved = {name: {"heart": women.deaths - 0.5 * women.deaths} for name in handed}
    edition(session, handed, causes=list_, by_cause=moved)
    built = page(session, 2)
    assert "holds the same numbers as edition 1" in plain(built.answer)
    said = [plain(sentence) for sentence in built.lead]
    assert said == ["Deaths by cause are others in 2 areas, sexes and years."]
    found = next(table for table in built.tables if table.key == "causes")
    assert [column.label for column in found.columns] == ["cause", "new", "changed"]
    assert [(row.shown, *row.cells) for row in found.rows] == [("Hearts", "heart", 1.0, 1.0)]
    assert built.parts == ("causes",)
