"""A comparison of any indicator: what its difference is made of, and what is said in its place
where it is not made of ages."""

import shutil
from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from engine.indicators import INDICATORS, find
from engine.panel import Panel
from server.exports.table import Gap, Row, Table
from server.pages.comparison import ComparisonPage, build
from server.pages.printed import printed
from server.results.estimating import COMPARED, USUAL
from server.results.questions import ComparisonQuestion, PopulationYear
from server.sentences import names
from server.sentences.numbers import number
from server.sentences.pieces import Sentence, plain
from server.store.connect import make_engine, sessions
from server.store.heading import heading
from tests.factories import GRIDS, edition, gompertz_panel

FIVE = GRIDS["abridged"]
YEARS = ("2010", "2011", "2012", "2013")
Page = Callable[..., ComparisonPage]


def panels() -> dict[str, Panel]:
    """The north gains through four years, births of its women are held; the rock is too small to
    tell. On the skerry nobody died at 100 and over."""
    found = {}
    for seed, year in enumerate(YEARS):
        births = np.array([24_000.0 + 500 * seed, 90.0 - seed, 40.0])
        level = 2.6e-5 - 1.5e-6 * seed
        north = gompertz_panel(people=2e6, seed=seed, level=level, infant=0.008 - 0.001 * seed)
        found[f"north.f.{year}"] = replace(north, births=births)
        found[f"rock.f.{year}"] = gompertz_panel(people=6e4, seed=30 + seed)
        skerry = gompertz_panel(people=3e5, seed=50 + seed, level=level)
        nobody = np.array(FIVE.starts) == 100
        found[f"skerry.f.{year}"] = replace(skerry, deaths=np.where(nobody, 0, skerry.deaths))
    found["north.m.2013"] = gompertz_panel(people=2e6, sex="m", seed=9, level=3.4e-5)
    return found


COUNTS = panels()


@pytest.fixture(scope="module")
def page(sqlite_template: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Page]:
    """Builds each page once, since all figures of one take a second."""
    copied = shutil.copy(sqlite_template, tmp_path_factory.mktemp("pages") / "ebbline.db")
    engine = make_engine(f"sqlite:///{copied}")
    with sessions(engine)() as session:
        edition(session, COUNTS, parents=dict.fromkeys(("north", "rock"), "isle"))

        @cache
        def built(
            this: str, that: str, of: str = "e0", settings: str = "almanac-1"
        ) -> ComparisonPage:
            sides = (PopulationYear.parse(this), PopulationYear.parse(that))
            question = ComparisonQuestion(*sides, of, settings=settings)
            return build(session, heading(session, "isle", 1), question)

        yield built
    engine.dispose()


def words(*sentences: Sentence) -> str:
    return " ".join(plain(one) for one in sentences).replace("\N{NO-BREAK SPACE}", " ")


def column(table: Table, key: str) -> list[float]:
    return [row.cells[table.column(key)] for row in table.rows]  # type: ignore[misc]


def total(table: Table, key: str) -> float:
    assert table.total is not None
    found = table.total.cells[table.column(key)]
    assert isinstance(found, float)
    return found


def keys(table: Table) -> list[str]:
    return [head.key for head in table.columns]


def rows(built: ComparisonPage) -> dict[str, Row]:
    tables = [built.table(key) for key in ("figures", *(key for key, _title in built.groups))]
    return {str(row.cells[0]): row for table in tables for row in table.rows}


def difference(built: ComparisonPage, key: str) -> float:
    found = rows(built)[key].cells[built.table("figures").column("difference")]
    assert isinstance(found, float)
    return found


# ---- the indicator asked for ---------------------------------------------------------------------


@pytest.mark.parametrize("of", ["asr_esp2013", "lower_quartile", "theil", "45q15"])
def test_any_indicator_has_its_picture_and_its_columns(page: Page, of: str) -> None:
    built = page("north.f.2013", "north.f.2010", of)
    parts, chart = built.table("contributions"), built.chart("asked")
    assert list(chart.series[0].y) == column(parts, of)[: len(FIVE)]
    # the open group of the standard holds people of several ages, whose mix is no age's rate
    beyond = [str(row.cells[0]) for row in parts.rows[len(FIVE) :]]
    assert ["older or younger people" in row for row in beyond] == [True] * (of == "asr_esp2013")
    assert chart.table == "contributions"
    assert sum(column(parts, of)) == pytest.approx(total(parts, of), rel=1e-9)
    assert total(parts, of) == pytest.approx(difference(built, of), rel=1e-9)
    ends = (column(parts, of + end) for end in ("", "_low", "_high"))
    for value, low, high in zip(*ends, strict=True):
        assert isinstance(low, Gap) or low <= value <= high
    assert sum(column(built.table("ages"), of)) == pytest.approx(total(parts, of), rel=1e-9)
    assert {"asked", "by-age", "unevenness"} <= built.drawn
    assert words(built.answer).startswith(names.brief(INDICATORS[of].label))
    assert of in [str(row.cells[0]) for row in built.table("figures").rows]


def test_what_is_shown_at_a_bar_has_as_many_decimals_as_its_table(page: Page) -> None:
    built = page("north.f.2013", "north.f.2010", "theil")
    parts = built.table("contributions")
    decimals = parts.columns[parts.column("theil")].decimals
    assert decimals == find("theil").unit.decimals + 1
    assert f"y:.{decimals}f" in built.chart("asked").hover


@pytest.mark.parametrize("of", ["e0", "H"])
def test_the_two_that_always_stand_there_have_no_second_picture(page: Page, of: str) -> None:
    built = page("north.f.2013", "north.f.2010", of)
    assert "asked" not in built.drawn
    assert keys(built.table("contributions")) == [
        "age", "e0", "e0_low", "e0_high", "H", "H_low", "H_high"
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("of", "why"),
    [("mode", "read off the shape of death rates around one age"), ("imr", "")],
)
def test_where_ages_have_no_part_it_is_said_why(page: Page, of: str, why: str) -> None:
    built = page("north.f.2013", "north.f.2010", of)
    said = words(*built.not_parted)
    assert "is not shared out over ages." in said
    assert (why or find(of).why_not_smooth) in said
    assert "asked" not in built.drawn
    assert "by-age" in built.drawn
    for table in ("contributions", "ages"):
        assert not any(key.startswith(of) for key in keys(built.table(table)))


def test_rates_over_births_are_compared_where_both_sides_have_births(page: Page) -> None:
    built = page("north.f.2013", "north.f.2010", "imr")
    here, there = (COUNTS[f"north.f.{year}"] for year in ("2013", "2010"))
    by_hand = 1000 * (here.deaths[0] / here.births[0] - there.deaths[0] / there.births[0])
    assert difference(built, "imr") == pytest.approx(by_hand, rel=1e-9)
    still = 1000 * (87 / (25_500 + 87) - 90 / 24_090)
    assert difference(built, "sbr") == pytest.approx(still, rel=1e-9)
    without = rows(page("north.f.2013", "north.m.2013"))["imr"].cells[-3:]
    assert all(isinstance(cell, Gap) and "not handed in" in cell.reason for cell in without)


def test_without_life_expectancy_the_indicator_asked_for_has_its_picture(page: Page) -> None:
    built = page("skerry.f.2013", "skerry.f.2010", "asr_esp2013")
    assert "asked" in built.drawn
    assert "by-age" not in built.drawn
    assert all(isinstance(cell, Gap) for cell in column(built.table("contributions"), "e0"))


def test_every_indicator_stands_in_one_table_but_ratios_to_a_whole(page: Page) -> None:
    built = page("north.f.2013", "north.f.2010")
    tables = [built.table(key) for key in ("figures", *(key for key, _title in built.groups))]
    found = [str(row.cells[0]) for table in tables for row in table.rows]
    assert sorted(found) == sorted(COMPARED)
    assert found[: len(USUAL)] == list(USUAL)
    assert not {"smr", "isr"} & set(found)
    offered = {key for _label, options in built.choice.indicators for key, _text in options}
    assert offered == set(COMPARED)


# ---- kinds of change, ratios ---------------------------------------------------------------------


def test_kinds_of_change_add_up_to_the_difference(page: Page) -> None:
    built = page("north.f.2013", "north.f.2010")
    table = built.table("kinds")
    assert [row.cells[0] for row in table.rows] == [
        "shift",
        "squeeze",
        "background",
        "infant",
        "unexplained",
    ]
    assert sum(column(table, "years")) == pytest.approx(total(table, "years"), rel=1e-9)
    assert total(table, "years") == pytest.approx(difference(built, "e0"), rel=1e-9)
    largest = max(table.rows, key=lambda row: abs(row.cells[1]))  # type: ignore[arg-type]
    assert str(largest.cells[0]) == "shift"
    value = number(largest.cells[1], 1, signed=True)  # type: ignore[arg-type]
    assert f"(shift): {value} years" in words(built.kinds)


def test_how_ratios_come_about_adds_up_as_printed(page: Page) -> None:
    built = page("north.f.2013", "north.f.2010")
    uneven, crude = words(*built.ratios), words(built.crude)
    assert "deaths cost more or fewer years" in uneven
    both = [COUNTS[f"north.f.{year}"] for year in ("2013", "2010")]
    rates = [one.deaths / one.exposure for one in both]
    shares = [one.exposure / one.exposure.sum() for one in both]
    lower = 1e5 * float(((rates[0] - rates[1]) * (shares[0] + shares[1]) / 2).sum())
    assert f"{number(lower, 1, signed=True)} to their death rates" in crude


def test_of_one_people_with_itself_nothing_is_told(page: Page) -> None:
    built = page("north.f.2013", "north.f.2013", "mode")
    assert (built.kinds, built.ratios, built.not_parted) == ((), (), ())
    assert {table.key for table in built.tables} & {"kinds", "contributions", "ages"} == set()
    assert "four times out of five" not in words(*built.lead)


# ---- through the years, and how small a change could have been seen ------------------------------


@pytest.mark.parametrize(
    ("this", "that", "of", "due"),
    [
        ("north.f.2013", "north.f.2010", "e0", True),
        ("north.f.2013", "north.f.2010", "H", True),
        ("north.f.2013", "north.f.2010", "lower_quartile", False),
        ("north.f.2011", "north.f.2010", "e0", False),
        ("north.f.2013", "rock.f.2010", "e0", False),
    ],
)
def test_the_path_through_the_years_has_a_column_where_it_is_due(
    page: Page, this: str, that: str, of: str, due: bool
) -> None:
    ages = page(this, that, of).table("ages")
    paths = [key for key in keys(ages) if key.endswith("_path")]
    assert paths == ([f"{of}_path"] if due else [])
    for path in paths:
        assert total(ages, path) == pytest.approx(total(ages, of), rel=1e-9)
        assert sum(column(ages, path)) == pytest.approx(total(ages, path), rel=1e-9)
        assert keys(ages).index(path) > keys(ages).index(of)


def test_how_small_a_change_could_have_been_seen_is_said_only_beside_an_unclear_one(
    page: Page,
) -> None:
    unclear = page("rock.f.2013", "rock.f.2012")
    assert "No clear change" in words(unclear.answer)
    assert "would have been seen four times out of five" in words(*unclear.lead)
    clear = page("north.f.2013", "north.f.2010")
    assert "four times out of five" not in words(*clear.lead)


def test_spans_are_named_and_what_they_share_counts_once(page: Page) -> None:
    built = page("north.f.2013", "north.f.2012", settings="almanac-1-3-years")
    assert "2011–2013" in words(built.answer)
    assert "2010–2012" in words(built.answer)
    assert "2011–2013 against women of North in 2010–2012" in built.frame.title
    heads = [cell.label for cell in built.table("figures").columns]
    assert any("2011–2013" in head for head in heads)
    told = {caution.word: caution.text for caution in built.cautions}
    assert "women of North in 2011–2012" in told["Counted in both"]
    assert printed(built.table("figures")).rows
