"""The comparison as data: contributions add up, sentence, table and picture say the same."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import pytest

from engine.ages import AgeGrid
from server.exports.table import Gap, Table
from server.pages.comparison import ComparisonPage, build
from server.pages.printed import printed
from server.results.estimating import USUAL
from server.results.questions import ComparisonQuestion, PopulationYear
from server.sentences.pieces import plain
from server.store.connect import Session
from server.store.heading import heading
from server.store.records import Cause
from tests.factories import GRIDS, edition, gompertz_panel, parted

FIVE = GRIDS["abridged"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])


@pytest.fixture
def isle(session: Session) -> Session:
    """Two areas by five years and by single years, the cape to 85+; all are parts of the isle."""
    panels = {}
    for seed, year in enumerate(("2004", "2014")):
        for sex in "fm":
            level = (2.2e-5 if sex == "f" else 3.4e-5) - 4e-6 * seed
            for area, grid in (("north", FIVE), ("single", GRIDS["single"])):
                panels[f"{area}.{sex}.{year}"] = gompertz_panel(
                    grid, sex=sex, seed=seed, level=level, people=2e6
                )
            panels[f"cape.{sex}.{year}"] = gompertz_panel(
                sex=sex, seed=seed, level=level, people=2e6
            ).regroup(SHORT)
    edition(session, panels, parents=dict.fromkeys(("north", "single", "cape"), "isle"))
    return session


def page(session: Session, this: str, that: str, of: str = "e0", **asked: str) -> ComparisonPage:
    sides = (PopulationYear.parse(this), PopulationYear.parse(that))
    return build(session, heading(session, "isle", 1), ComparisonQuestion(*sides, of, **asked))


def words(built: ComparisonPage) -> str:
    said = " ".join(plain(sentence) for sentence in (built.answer, *built.lead))
    return said.replace("\N{NO-BREAK SPACE}", " ")


def column(table: Table, key: str) -> list[float]:
    return [row.cells[table.column(key)] for row in table.rows]  # type: ignore[misc]


@pytest.mark.parametrize("area", ["north", "single"])
@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-kannisto"])
def test_contributions_add_up_to_the_difference(isle: Session, area: str, settings: str) -> None:
    built = page(isle, f"{area}.m.2014", f"{area}.m.2004", settings=settings)
    figures, parts = built.table("figures"), built.table("contributions")
    for key, scale in (("e0", 1), ("H", 1000)):
        row = figures.rows[USUAL.index(key)]
        difference = scale * row.cells[figures.column("difference")]  # type: ignore[operator]
        assert sum(column(parts, key)) == pytest.approx(difference, rel=1e-9)
        assert parts.total is not None
        assert parts.total.cells[parts.column(key)] == pytest.approx(difference, rel=1e-12)
    ages = built.table("ages")
    for key in ("e0", "e0_arriaga"):
        assert sum(column(ages, key)) == pytest.approx(
            figures.rows[0].cells[figures.column("difference")], rel=1e-9
        )


def test_between_the_sexes_the_rule_of_the_first_year_has_a_row_of_its_own(isle: Session) -> None:
    built = page(isle, "north.f.2014", "north.m.2014")
    parts = built.table("contributions")
    labels = [row.cells[0] for row in parts.rows]
    assert "rule of the first year" in str(labels[-1])
    assert parts.total is not None
    assert sum(column(parts, "e0")) == pytest.approx(parts.total.cells[parts.column("e0")])
    same = page(isle, "north.f.2014", "north.f.2004").table("contributions")
    assert len(same.rows) == len(parts.rows) - 1


def test_sentence_table_and_picture_agree_after_rounding(isle: Session) -> None:
    built = page(isle, "north.m.2014", "north.m.2004")
    cells = printed(built.table("figures")).rows[0].cells
    assert f"{cells[1].text} against {cells[2].text}" in words(built)
    assert f"{cells[3].text.lstrip('+')} years more of life in 2014 than in 2004" in words(built)
    bars, parts = built.chart("by-age"), built.table("contributions")
    assert list(bars.series[0].y) == column(parts, "e0")
    limits = [None if isinstance(cell, Gap) else cell for cell in column(parts, "e0_low")]
    assert list(bars.series[0].low) == limits
    assert bars.foot_sum == printed(parts).total.cells[1].text  # type: ignore[union-attr]
    unevenness = built.chart("unevenness")
    assert list(unevenness.series[0].y) == column(parts, "H")
    assert unevenness.foot_sum == printed(parts).total.cells[2].text  # type: ignore[union-attr]
    survivors = built.chart("survivors")
    assert survivors.between == (0, 1)
    assert survivors.series[0].y[-1] == column(built.table("survivors"), "this")[-1]


def test_exchanging_the_sides_turns_every_sign(isle: Session) -> None:
    there, back = (
        page(isle, *pair).table("contributions")
        for pair in (("north.m.2014", "north.f.2004"), ("north.f.2004", "north.m.2014"))
    )
    for key in ("e0", "H"):
        assert column(there, key) == pytest.approx([-one for one in column(back, key)], rel=1e-9)


def test_different_open_ages_are_read_by_one_rule(isle: Session) -> None:
    built = page(isle, "north.m.2014", "cape.m.2014")
    told = {caution.word: caution.text for caution in built.cautions}
    assert "regrouped for it: men of North in 2014" in told["Age groups"]
    assert "H" not in {key for key in ("e0", "H") if f"{key}-drawn" in built.drawn}
    assert "unevenness" not in built.drawn
    row = built.table("figures").rows[USUAL.index("H")]
    assert all(isinstance(cell, Gap) for cell in row.cells[1:])
    assert "last, open age group" in told["Not compared"]
    assert (
        "unevenness"
        in page(isle, "north.m.2014", "cape.m.2014", settings="almanac-1-kannisto").drawn
    )


def test_an_area_in_its_whole_counts_shared_deaths_once(isle: Session) -> None:
    built = page(isle, "north.m.2014", "isle.m.2014")
    told = {caution.word: caution.text for caution in built.cautions}
    assert "men of North in 2014" in told["Counted in both"]
    apart = page(isle, "north.m.2014", "isle.m.2004")
    assert "Counted in both" not in [caution.word for caution in apart.cautions]


def test_the_same_on_both_sides_is_no_comparison(isle: Session) -> None:
    built = page(isle, "north.m.2014", "north.m.2014")
    assert "nothing to compare" in words(built)
    assert built.drawn <= {"survivors"}


def test_the_indicator_asked_for_is_the_headline(isle: Session) -> None:
    built = page(isle, "north.m.2014", "north.f.2014", of="e80")
    assert words(built).startswith("Life expectancy at 80 stood")
    last = built.table("figures").rows[-1]
    assert (last.cells[0], last.shown) == ("e80", "Life expectancy at 80")


def test_eight_statements_at_most(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    edition(isle, {"north.f.2014": gompertz_panel(seed=5)})
    with count_statements() as statements:
        built = page(isle, "north.p.2014", "isle.f.2014")
    assert [notice.word for notice in built.frame.notices] == ["A newer edition stands"]
    assert len(statements) <= 8


@pytest.mark.parametrize(("care", "helped"), [("suicide", True), ("", False)])
def test_where_such_causes_are_named_readers_are_told_of_help(
    session: Session, care: str, helped: bool
) -> None:
    listed = (Cause("one", "One"), Cause("two", "Two", care=care))
    panels = {f"north.m.{year}": gompertz_panel(seed=int(year)) for year in ("2004", "2014")}
    counts = {
        name: dict(zip(("one", "two"), parted(panel, 2, seed=1).deaths, strict=True))
        for name, panel in panels.items()
    }
    edition(session, panels, causes=listed, by_cause=counts)
    assert ("help line" in words(page(session, "north.m.2014", "north.m.2004"))) == helped
