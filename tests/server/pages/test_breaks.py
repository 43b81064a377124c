"""Breaks on pages: lines stop, sentences keep to one side, and a comparison across one says so."""

from dataclasses import replace

import pytest
from sqlalchemy.orm import Session

from server.pages import changes, comparison, contents, population_year, trend
from server.pages.page import Page
from server.results.changes import ChangesQuestion
from server.results.contents import ContentsQuestion
from server.results.questions import (
    ComparisonQuestion,
    PopulationYear,
    PopulationYearQuestion,
    TrendQuestion,
)
from server.sentences.pieces import plain
from server.store.heading import heading
from server.store.records import Break
from tests.factories import edition, gompertz_panel

YEARS = tuple(str(year) for year in range(2001, 2011))
BREAKS = (
    Break("", "2006", "population", note="census"),
    Break("south", "2004", "boundary", note="parish of Reed joined"),
    Break("", "2009", "coding", ratio=1.0213, ratio_error=0.0042),
    Break("", "2008", "shock", note="hard winter"),
)


@pytest.fixture(scope="module")
def isle(lasting: Session) -> Session:
    """Edition 1 has no breaks, edition 2 all, edition 3 all but that of coding."""
    panels = {
        f"{area}.{sex}.{year}": gompertz_panel(sex=sex, people=3e6, seed=at, level=3e-5 - 9e-7 * at)
        for area in ("north", "south")
        for sex in "fm"
        for at, year in enumerate(YEARS)
    }
    edition(lasting, panels)
    edition(lasting, {}, breaks=BREAKS)
    edition(lasting, {"north.f.2001": panels["north.f.2001"]}, note="the same again")
    return lasting


def drawn(session: Session, number: int, *areas: str, **more: str) -> trend.TrendPage:
    question = TrendQuestion("e0", areas or ("north",), ("f", "m"), YEARS[0], YEARS[-1], **more)
    return trend.build(session, heading(session, "isle", number), question)


def words(built: Page) -> str:
    said = " ".join(plain(sentence) for sentence in (built.answer, *built.lead))
    return said.replace("\N{NO-BREAK SPACE}", " ")


def test_a_line_stops_at_its_breaks_and_no_band_crosses_them(isle: Session) -> None:
    (whole,), (cut,) = (drawn(isle, number).charts for number in (1, 2))
    assert [rule.x for rule in cut.breaks] == [2005.5, 2008.5]
    assert whole.breaks == whole.shocks == ()
    for before, after in zip(whole.series, cut.series, strict=True):
        gaps = [at for at, x in enumerate(after.x) if x in (2005.5, 2008.5)]
        assert gaps == [5, 9]
        for column in (after.y, after.low, after.high):
            assert [column[at] for at in gaps] == [None, None]
        kept = [at for at in range(len(after.x)) if at not in gaps]
        for name in ("x", "y", "low", "high", "names", "provisional"):
            column = getattr(after, name)
            assert tuple(column[at] for at in kept) == getattr(before, name), name


def test_a_break_of_one_area_cuts_its_line_alone_and_names_it(isle: Session) -> None:
    (chart,) = drawn(isle, 2, "north", "south").charts
    cut = {series.name: 2003.5 in series.x for series in chart.series}
    assert cut == {
        "North, women": False,
        "North, men": False,
        "South, women": True,
        "South, men": True,
    }
    assert [rule.label for rule in chart.breaks] == [
        "2004: new boundaries, South",
        "2006: new population base",
        "2009: new coding of causes",
    ]
    (alone,) = drawn(isle, 2, "south").charts
    assert alone.breaks[0].label == "2004: new boundaries"
    assert [(shock.first, shock.last) for shock in chart.shocks] == [(2007.5, 2008.5)]


def test_sentences_keep_to_one_side_and_name_what_parts(isle: Session) -> None:
    plain_words, parted = words(drawn(isle, 1)), words(drawn(isle, 2))
    assert "between 2001 and 2010" in plain_words
    assert "break" not in plain_words
    assert "between 2009 and 2010" in parted
    assert "2001 and 2010" not in parted
    assert (
        "2 breaks part these years, and nothing is told across them: 2006, new population base"
        in (parted)
    )
    assert "from 2001 to 2005" in parted
    assert "from 2006 to 2007" in parted  # 2008 is a year of shock and no end of a course
    assert "2008, a year of shock, is drawn, but no change is measured from it or to it." in parted


def test_the_table_marks_the_years_and_lists_the_breaks(isle: Session) -> None:
    built = drawn(isle, 2, "south")
    second = {row.cells[0]: row.second for row in built.table("years").rows}
    assert second["2006"] == "from here on: new population base"
    assert second["2008"] == "year of shock"
    assert second["2005"] == ""
    listed = [row.cells for row in built.table("breaks").rows]
    assert [row[:3] for row in listed] == [
        ("2004", "South", "new boundaries"),
        ("2006", "every area", "new population base"),
        ("2008", "every area", "year of shock"),
        ("2009", "every area", "new coding of causes"),
    ]
    assert listed[3][-1] == "1.0213 (standard error 0.0042)"
    assert "not applied to any figure" in built.table("breaks").note
    with pytest.raises(KeyError):
        drawn(isle, 1).table("breaks")


def cautions(built: Page) -> dict[str, str]:
    return {caution.word: caution.text for caution in built.cautions if caution.beside}


def test_a_comparison_across_a_break_says_so_beside_the_answer(isle: Session) -> None:
    def compared(number: int, first: str, last: str, area: str = "north", **more: str) -> Page:
        this, that = PopulationYear("north", "f", last), PopulationYear(area, "f", first)
        question = ComparisonQuestion(this, that, **more)
        return comparison.build(isle, heading(isle, "isle", number), question)

    said = cautions(compared(2, "2002", "2007"))["A break between"]
    assert said.startswith("Between 2002 and 2007 lies 2006, new population base (census).")
    assert "A break between" not in cautions(compared(2, "2006", "2008"))
    both = cautions(compared(2, "2003", "2007", "south", settings="almanac-1-3-years"))
    assert "2004, new boundaries (parish of Reed joined); 2006" in both["A break between"]
    assert "lie on both sides of 2006" in both["A break within"]


def test_years_added_up_across_a_break_are_called_a_mixture(isle: Session) -> None:
    def told(year: str, settings: str) -> dict[str, str]:
        question = PopulationYearQuestion(PopulationYear("north", "f", year), settings=settings)
        return cautions(population_year.build(isle, heading(isle, "isle", 2), question))

    assert "A break within" in told("2007", "almanac-1-3-years")
    assert "A break within" not in told("2005", "almanac-1-3-years")
    assert "A break within" not in told("2007", "almanac-1")
    assert "A break before" not in told("2007", "almanac-1")
    assert "2006, new population base (census)" in told("2006", "almanac-1")["A break before"]
    said = drawn(isle, 2, settings="almanac-1-3-years").cautions
    assert any("lie on both sides of a break" in caution.text for caution in said)


def test_the_contents_of_an_edition_list_its_breaks(isle: Session) -> None:
    pages = [contents.build(isle, heading(isle, "isle", n), ContentsQuestion()) for n in (1, 2, 3)]
    assert [page.broken for page in pages] == [False, True, True]
    assert len(pages[1].table("breaks").rows) == 4
    assert pages[2].table("breaks").rows == pages[1].table("breaks").rows


@pytest.mark.parametrize(("times", "rebase"), [(1.0, True), (1.1, False)])
def test_a_new_population_alone_is_named_a_rebase(
    session: Session, times: float, rebase: bool
) -> None:
    first = gompertz_panel(people=2e5, seed=1)
    edition(session, {"north.f.2014": first})
    recounted = replace(first, exposure=0.97 * first.exposure, deaths=times * first.deaths)
    edition(session, {"north.f.2014": recounted})
    built = changes.build(session, heading(session, "isle", 2), ChangesQuestion(since=1))
    said = [plain(sentence) for sentence in built.lead]
    told = "A rebase: the population of 2014 is new, and no death changed."
    assert (told in said) is rebase
