"""What a population-year page says beyond its first table: every indicator in its group, deaths to
avoid, the highest ages, borrowed rates, and years added up."""

import shutil
from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import run
from engine.indicators import INDICATORS, find
from engine.panel import Panel
from engine.settings import find as named
from server.exports.table import Gap, Row
from server.pages.population_year import PopulationYearPage, build
from server.results.estimating import USUAL
from server.results.holdings import NotInEdition
from server.results.questions import PopulationYear, PopulationYearQuestion
from server.sentences.pieces import Sentence, plain
from server.store.connect import make_engine, sessions
from server.store.heading import heading
from tests.factories import GRIDS, edition, gompertz_panel

FIVE = GRIDS["abridged"]
OLD = np.array(FIVE.starts) >= 90
YEARS = tuple(str(year) for year in range(2009, 2015))
Page = Callable[..., PopulationYearPage]


def panels() -> dict[str, Panel]:
    """North, south and rock are the isle. Births of the north only; people of 90 and over were
    counted one and a half times in the south in 2014; nobody died at 100 and over on the rock. The
    cape, by itself, ends at 80; the key is all there is of its quay."""
    found = {}
    for seed, year in enumerate(YEARS):
        north = gompertz_panel(people=2e6, seed=seed, level=2.4e-5 - 2e-7 * seed)
        found[f"north.f.{year}"] = replace(north, births=np.array([24_000.0, 90.0, 40.0]))
        south = gompertz_panel(people=1e6, seed=20 + seed)
        ghosts = np.where(OLD & (year == "2014"), 1.5, 1.0)
        found[f"south.f.{year}"] = replace(south, exposure=ghosts * south.exposure)
        rock = gompertz_panel(people=3e4, seed=40 + seed)
        nobody = np.array(FIVE.starts) == 100
        found[f"rock.f.{year}"] = replace(rock, deaths=np.where(nobody, 0, rock.deaths))
    found["cape.f.2014"] = gompertz_panel(people=1e6, seed=1).regroup(AgeGrid(FIVE.starts[:-4]))
    found["key.f.2014"] = gompertz_panel(people=2e6, seed=2)
    return found


COUNTS = panels()


@pytest.fixture(scope="module")
def page(sqlite_template: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Page]:
    """Builds each page once, since all figures of one take a second."""
    copied = shutil.copy(sqlite_template, tmp_path_factory.mktemp("pages") / "ebbline.db")
    engine = make_engine(f"sqlite:///{copied}")
    with sessions(engine)() as session:
        parents = dict.fromkeys(("north", "south", "rock"), "isle") | {"key": "quay"}
        edition(session, COUNTS, parents=parents)

        @cache
        def built(of: str, settings: str = "almanac-1") -> PopulationYearPage:
            question = PopulationYearQuestion(PopulationYear.parse(of), settings=settings)
            return build(session, heading(session, "isle", 1), question)

        yield built
    engine.dispose()


def words(*sentences: Sentence) -> str:
    return " ".join(plain(one) for one in sentences).replace("\N{NO-BREAK SPACE}", " ")


def told(built: PopulationYearPage) -> dict[str, str]:
    return {caution.word: caution.text for caution in built.cautions}


def rows(built: PopulationYearPage) -> dict[str, Row]:
    """Of the first table and those of the groups, by indicator."""
    keys = ("figures", *(key for key, _title in built.groups))
    return {str(row.cells[0]): row for key in keys for row in built.table(key).rows}


def cell(built: PopulationYearPage, key: str, column: str) -> object:
    return rows(built)[key].cells[built.table("figures").column(column)]


# ---- every indicator in its group ----------------------------------------------------------------


def test_every_indicator_stands_in_one_table(page: Page) -> None:
    built = page("north.f.2014")
    tables = [built.table(key) for key in ("figures", *(key for key, _title in built.groups))]
    keys = [str(row.cells[0]) for table in tables for row in table.rows]
    assert sorted(keys) == sorted(INDICATORS)
    assert keys[: len(USUAL)] == list(USUAL)
    heads = {tuple(column.key for column in table.columns) for table in tables}
    assert len(heads) == 1
    assert all(len(row.cells) == len(table.columns) for table in tables for row in table.rows)


def test_two_ratios_to_a_whole_do_not_compare(page: Page) -> None:
    built = page("north.f.2014")
    for key in ("smr", "isr"):
        assert isinstance(cell(built, key, "value"), float)
        assert isinstance(cell(built, key, "before"), float)
        for column in ("change", "change_low", "change_high"):
            gap = cell(built, key, column)
            assert isinstance(gap, Gap)
            assert "do not compare" in gap.reason
    assert isinstance(cell(built, "asr_esp2013", "change"), float)
    root = cell(page("isle.f.2014"), "smr", "value")
    assert isinstance(root, Gap)
    assert "part of no larger one" in root.reason


def test_deaths_of_infants_are_set_over_births_where_there_are_some(page: Page) -> None:
    built = page("north.f.2014")
    deaths = COUNTS["north.f.2014"].deaths[0]
    assert cell(built, "imr", "value") == pytest.approx(1000 * deaths / 24_000)
    assert cell(built, "nmr", "value") == pytest.approx(1000 * 40 / 24_000)
    assert cell(built, "pnmr", "value") == pytest.approx(1000 * (deaths - 40) / 24_000)
    assert cell(built, "sbr", "value") == pytest.approx(1000 * 90 / 24_090)
    assert "Live births of girls in North in 2014: 24,000." in words(*built.basis)
    for key in ("imr", "nmr", "pnmr", "sbr"):
        gap = cell(page("south.f.2014"), key, "value")
        assert isinstance(gap, Gap)
        assert "were not handed in" in gap.reason


# ---- what would add a month ----------------------------------------------------------------------


def test_so_many_deaths_fewer_at_one_age_make_a_month(page: Page) -> None:
    built = page("north.f.2014")
    avoid, panel = built.table("avoid"), COUNTS["north.f.2014"]
    assert [row.cells[0] for row in avoid.rows] == list(FIVE.labels)
    assert [row.cells[1] for row in avoid.rows] == [float(count) for count in panel.deaths]
    before = float(find("e0").value(run(panel, named("almanac-1"))))
    numbers = {}
    for at, row in enumerate(avoid.rows):
        fewer = row.cells[avoid.column("avoid")]
        if isinstance(fewer, Gap):
            continue
        assert isinstance(fewer, float)
        assert fewer <= panel.deaths[at]
        numbers[FIVE.labels[at]] = float(fewer)
        less = replace(panel, deaths=panel.deaths - fewer * (np.arange(len(FIVE)) == at))
        after = float(find("e0").value(run(less, named("almanac-1"))))
        assert after - before == pytest.approx(1 / 12, rel=1e-5)
    assert len(numbers) >= 5
    there = dict(zip(FIVE.labels, panel.deaths, strict=True))
    enough = [label for label in numbers if there[label] >= 20]
    fewest = min(enough, key=lambda label: numbers[label])
    said = f"{fewest} takes fewest for a month of life expectancy: {numbers[fewest]:.0f} fewer of"
    assert said in words(built.avoid)


def test_where_no_table_can_be_read_nothing_adds_a_month(page: Page) -> None:
    built = page("rock.f.2014")  # nobody died in its open group, and no rate is borrowed
    assert built.avoid == ()
    assert "avoid" not in [table.key for table in built.tables]


# ---- the highest ages ----------------------------------------------------------------------------


def test_deaths_and_people_of_the_very_old_fit_or_do_not(page: Page) -> None:
    fits, ghosts = page("south.f.2013"), page("south.f.2014")
    assert "at 90 and over fit together as they do in Isle" in words(fits.implied)
    assert "fewer people than were counted" in words(ghosts.implied)
    assert "set against Isle" in words(ghosts.implied)
    table = ghosts.table("implied")
    assert [row.cells[0] for row in table.rows] == ["e65", "H", "mode"]
    figure = table.rows[0].cells
    counted, implied = (figure[table.column(key)] for key in ("as_counted", "as_implied"))
    assert counted > implied  # type: ignore[operator]
    assert counted == cell(ghosts, "e65", "value")


@pytest.mark.parametrize("of", ["isle.f.2014", "rock.f.2014", "cape.f.2014", "key.f.2014"])
def test_without_a_whole_or_enough_deaths_nothing_is_said_of_the_very_old(
    page: Page, of: str
) -> None:
    """Nor of an area that is all of its whole, which nothing is set against."""
    built = page(of)
    assert built.implied == ()
    assert "implied" not in [table.key for table in built.tables]


# ---- what is borrowed, and what ends early -------------------------------------------------------


@pytest.mark.parametrize("settings", ["almanac-1-borrow", "almanac-2"])
def test_a_borrowed_rate_gives_a_figure_and_is_said(page: Page, settings: str) -> None:
    alone, borrowed = page("rock.f.2014"), page("rock.f.2014", settings)
    assert "Nobody died in the last, open age group" in words(alone.answer)
    assert "Borrowed rate" not in told(alone)
    assert "could expect" in words(borrowed.answer)
    assert (
        "at 100 and over: the death rate there is that of Isle" in told(borrowed)["Borrowed rate"]
    )
    assert "Borrowed rate" in [one.word for one in borrowed.cautions if one.beside]
    assert "Borrowed rate" not in told(page("north.f.2014", settings))


def test_ages_that_end_early_are_said(page: Page) -> None:
    assert "Early end" not in told(page("cape.f.2014"))
    early = page("cape.f.2014", "almanac-2")
    assert "The ages end at 80 and over" in told(early)["Early end"]
    assert "Early end" not in told(page("north.f.2014", "almanac-2"))


# ---- years added up ------------------------------------------------------------------------------


def test_years_added_up_are_named_wherever_the_figure_is(page: Page) -> None:
    built = page("north.f.2014", "almanac-1-3-years")
    assert "Women of North in 2012–2014 could expect" in words(built.answer)
    assert built.frame.title == "Women of North, 2012–2014"
    table = built.table("figures")
    heads = {head.key: head.label for head in table.columns}
    assert (heads["value"], heads["before"]) == ("2012–2014", "2009–2011")
    assert "2012–2014" in table.title
    assert "Change: 2012–2014 less 2009–2011" in table.note
    assert "2012–2014" in built.table("life").title
    deaths = np.stack([COUNTS[f"north.f.{year}"].deaths for year in YEARS[-3:]]).sum(axis=0)
    life = built.table("life")
    assert [row.cells[life.column("deaths")] for row in life.rows] == pytest.approx(deaths.tolist())


def test_the_years_before_share_none_with_those_asked_for(page: Page) -> None:
    """So the change has the chance of both."""
    built = page("north.f.2014", "almanac-1-3-years")
    sides = [
        (cell(built, "e0", f"{key}_high") - cell(built, "e0", f"{key}_low")) / 2  # type: ignore[operator]
        for key in ("value", "before", "change")
    ]
    assert sides[2] == pytest.approx(np.hypot(*sides[:2]), rel=0.01)
    assert "in 2009–2011" in words(*built.lead)


def test_links_lead_only_to_years_that_can_be_added_up(page: Page) -> None:
    built = page("north.f.2014", "almanac-1-3-years")
    links = {piece.text: piece.href for sentence in built.further for piece in sentence}
    assert "that=north.f.2011" in links["against 2009–2011"]
    assert not any("2009" in href for text, href in links.items() if text.startswith("against"))
    assert "against Isle, of which it is part" in links
    short = page("north.f.2012", "almanac-1-3-years")
    assert "change" not in [head.key for head in short.table("figures").columns]


def test_the_form_offers_only_years_that_can_be_added_up(page: Page) -> None:
    pooled = page("north.f.2014", "almanac-1-3-years").choice.offer.periods
    single = page("north.f.2014").choice.offer.periods
    assert pooled[0] == ("2014", "2012–2014")
    assert [value for value, _label in pooled] == [value for value, _label in single][:-2]


def test_without_the_years_before_it_a_year_is_refused(page: Page) -> None:
    with pytest.raises(NotInEdition, match=r"add up 3 years.*up to north\.f\.2010"):
        page("north.f.2010", "almanac-1-3-years")
