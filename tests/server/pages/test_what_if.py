"""What-if, gaps and exchange as data: sentence, table and picture say the same."""

from collections.abc import Iterator
from dataclasses import replace
from urllib.parse import parse_qsl

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.ages import AgeGrid
from engine.indicators import INDICATORS
from server.accounts.viewer import LOCAL
from server.actions.set_policy import set_policy
from server.exports.status import PROVISIONAL
from server.exports.table import Gap, GapKind, Table
from server.pages import exchange, gaps, what_if
from server.pages.exchange import ExchangePage
from server.pages.gaps import GapsPage
from server.pages.printed import printed
from server.pages.what_if import WhatIfPage
from server.results.causes import CauseChoice
from server.results.exchange import ExchangeQuestion
from server.results.gaps import GapsQuestion
from server.results.what_if_question import WhatIfQuestion
from server.sentences.numbers import number
from server.sentences.pieces import plain
from server.store.connect import Session, make_engine, sessions
from server.store.heading import heading
from server.store.migrating import migrate
from server.store.records import Terms
from tests.factories import GRIDS, NOON, edition, gompertz_panel
from tests.server.results.test_what_if import LIST, dealt

FIVE = GRIDS["abridged"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])
AREAS = {"north": 2e-5, "south": 2e-5, "east": 2e-5, "west": 2e-5, "bay": 2e-5}
YEARS = range(2010, 2015)


@pytest.fixture(scope="module")
def isle(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Session]:
    """Five areas that are alike, but that men of the bay die more at 40 to 59, by cause in 2014;
    and the rock, with hardly anybody."""
    url = f"sqlite:///{tmp_path_factory.mktemp('pages') / 'ebbline.db'}"
    migrate(url)
    engine = make_engine(url)
    starts = np.array(FIVE.starts)
    worse = np.where((starts >= 40) & (starts < 60), 1.8, 1.0)
    panels = {}
    for place, area in enumerate(AREAS):
        for year in YEARS:
            for sex in "fm":
                seed = 100 * place + 10 * (year - 2000) + "fm".index(sex)
                panel = gompertz_panel(sex=sex, people=1.5e6)
                times = worse if (area, sex) == ("bay", "m") else 1.0
                deaths = np.random.default_rng(seed).poisson(panel.deaths * times)
                panels[f"{area}.{sex}.{year}"] = replace(panel, deaths=deaths.astype(float))
    panels |= {f"rock.{sex}.2014": gompertz_panel(sex=sex, people=2e3, seed=1) for sex in "fm"}
    now = {name: panel for name, panel in panels.items() if name.endswith("2014")}
    by_cause = {name: dealt(panel, at) for at, (name, panel) in enumerate(now.items())}
    with sessions(engine)() as session:
        edition(
            session, panels, parents=dict.fromkeys([*AREAS, "rock"], "isle"), provisional=("2014",)
        )
        edition(
            session,
            now,
            parents=dict.fromkeys([*AREAS, "rock"], "isle"),
            causes=LIST,
            by_cause=by_cause,
        )
        yield session
    engine.dispose()


def asked(session: Session, view: str, query: str, number: int = 1):  # type: ignore[no-untyped-def]
    kinds = {
        "what-if": (WhatIfQuestion, what_if),
        "gaps": (GapsQuestion, gaps),
        "exchange": (ExchangeQuestion, exchange),
    }
    kind, page = kinds[view]
    known = heading(session, "isle", number)
    question = kind.parse(parse_qsl(query, keep_blank_values=True))  # type: ignore[attr-defined]
    causes = CauseChoice.spelled(question.causes, held=known.causes)
    return page.build(session, known, replace(question, causes=causes))  # type: ignore[attr-defined]


def said(page: WhatIfPage | GapsPage | ExchangePage) -> str:
    text = " ".join(plain(sentence) for sentence in (page.answer, *page.lead))
    return text.replace("\N{NO-BREAK SPACE}", " ")


def cells(table: Table, row: str) -> dict[str, object]:
    found = next(one for one in table.rows if one.cells[0] == row)
    return {column.key: cell for column, cell in zip(table.columns, found.cells, strict=True)}


def column(table: Table, key: str) -> list[object]:
    return [row.cells[table.column(key)] for row in table.rows]


def numbers(table: Table, key: str) -> np.ndarray:
    return np.array([0.0 if isinstance(one, Gap) else one for one in column(table, key)], float)


CHANGED = "at=bay.m.2014&by=-20&from=40&to=59"


def test_sentence_and_table_say_the_same(isle: Session) -> None:
    page = asked(isle, "what-if", CHANGED)
    row = cells(page.table("figures"), "e0")
    assert_allclose(row["then"] - row["now"], row["change"])  # type: ignore[operator]
    shown = next(
        one
        for one in printed(page.table("figures")).rows
        if one.cells[0].text.startswith("Life expectancy at b")
    )
    texts = {cell.label: cell for cell in shown.cells}
    change = texts["change"].text.removeprefix("+")
    assert f"would be {change} of a year longer (" in said(
        page
    ) or f"would be {change} years longer (" in said(page)
    assert f"{texts['would be'].text} years instead of" in said(page)
    deaths = page.table("deaths")
    fewer = -float(deaths.total.cells[deaths.column("change")])  # type: ignore[union-attr, arg-type]
    years = -float(deaths.total.cells[deaths.column("years")])  # type: ignore[union-attr, arg-type]
    assert f"stands for {number(fewer, 0)} deaths fewer and for {number(years, 0)} years" in said(
        page
    )
    assert_allclose(numbers(deaths, "change").sum(), -fewer)
    bars = page.chart("fewer").series[0].y
    assert_allclose([one or 0.0 for one in bars], -numbers(deaths, "change"), atol=1e-9)


def test_every_indicator_of_the_registry_has_its_row(isle: Session) -> None:
    page = asked(isle, "what-if", CHANGED)
    keys = [
        row.cells[0]
        for table in page.tables
        if table.key.startswith("figures")
        for row in table.rows
    ]
    assert sorted(keys) == sorted(INDICATORS)


def test_nothing_changed_is_an_invitation(isle: Session) -> None:
    page = asked(isle, "what-if", "at=bay.m.2014")
    assert "change some, and this page works out what it would be" in said(page)
    assert page.charts == ()
    assert not numbers(page.table("deaths"), "change").any()
    assert len(page.form.lines) == 2


def test_the_form_holds_the_address_and_a_line_more(isle: Session) -> None:
    page = asked(isle, "what-if", CHANGED + "&by=-5&from=60&to=&target=80")
    assert [(one.by, one.where.first, one.where.last) for one in page.form.lines] == [
        ("-20", "40", "59"),
        ("-5", "60", ""),
        ("", "0", ""),
    ]
    ends = [int(value) for value, _label in page.form.lasts if value]
    assert ends == [start - 1 for start in FIVE.starts[1:]]
    assert "To bring life expectancy at birth to 80.0 years" in said(page)


def test_by_cause_the_deaths_add_up_and_care_is_taken(isle: Session) -> None:
    page = asked(isle, "what-if", "at=bay.m.2014&by=-50&from=20&to=&cause=own-hand", 2)
    table = page.table("causes")
    assert column(table, "cause") == ["body", "own-hand"]
    assert_allclose(numbers(table, "change"), [0.0, table.total.cells[table.column("change")]])  # type: ignore[union-attr]
    assert "a help line" in said(page)
    assert "from suicide 50 % lower at ages 20 and over" in said(page)
    assert any(caution.word == "Causes" for caution in page.cautions)
    plain_page = asked(isle, "what-if", CHANGED)
    assert "help line" not in said(plain_page)


def test_without_a_life_table_it_says_why(isle: Session) -> None:
    page = asked(isle, "what-if", "at=rock.m.2014&by=-20")
    assert "would be cannot be given" in said(page)
    assert "no life expectancy can be given" in said(asked(isle, "exchange", "of=rock.m.2014"))
    assert "no gap to a benchmark can be given" in said(asked(isle, "gaps", "of=rock.m.2014"))


def test_the_bay_has_clear_gaps_where_its_men_die_more(isle: Session) -> None:
    page = asked(isle, "gaps", "of=bay.m.2014")
    table = page.table("gaps")
    clear = {row.cells[0] for row in table.rows if row.cells[table.column("clear")] == "clear"}
    assert clear == {"40–44", "45–49", "50–54", "55–59"}
    gains = numbers(table, "gain")
    assert (np.diff(gains[: np.count_nonzero(gains)]) <= 0).all()
    first = str(table.rows[0].cells[0])
    assert f"adds most for men of Bay in 2014 at ages {first}: {number(gains[0], 0)} days" in said(
        page
    )
    chart = page.chart("gaps")
    named = [series for series in chart.series if series.label == "clear"]
    assert {name for series in named for name in series.names} == clear
    assert (
        page.table("areas").rows[0].cells[page.table("areas").column("member")]
        == "in the benchmark"
    )


@pytest.mark.parametrize("of", ["north.f.2014", "east.m.2014", "bay.f.2014", "isle.f.2014"])
def test_elsewhere_no_gap_is_clear_and_none_is_named(isle: Session, of: str) -> None:
    page = asked(isle, "gaps", f"of={of}")
    assert "No gap between" in said(page)
    assert "clear" not in column(page.table("gaps"), "clear")
    assert (
        [series.label for series in page.charts[0].series if series.label == "clear"] == []
        if page.charts
        else True
    )


def test_the_benchmark_is_the_same_for_all_and_made_in_other_years(isle: Session) -> None:
    members = []
    for area in AREAS:
        table = asked(isle, "gaps", f"of={area}.m.2014").table("areas")
        rows = [
            row for row in table.rows if row.cells[table.column("member")] == "in the benchmark"
        ]
        members.append([row.cells[0] for row in rows])
    assert members == [members[0]] * len(AREAS)
    assert len(members[0]) == 2  # a third of five, rounded up
    page = asked(isle, "gaps", "of=bay.m.2014")
    assert "in 2010 to 2013, years other than this one" in said(page)


def test_by_cause_each_gap_names_its_cause(isle: Session) -> None:
    page = asked(isle, "gaps", "of=bay.m.2014", 2)
    table = page.table("gaps")
    assert len(table.rows) == 2 * len(FIVE)
    clear = {row.cells[:2] for row in table.rows if row.cells[table.column("clear")] == "clear"}
    assert ("45–49", "Of the body") in clear
    assert "help line" in said(page)


def test_a_larger_size_than_any_area_has_leaves_no_benchmark(isle: Session) -> None:
    page = asked(isle, "gaps", "of=rock.m.2014&least=500000")
    assert [table.key for table in page.tables] == ["areas"]
    assert not page.closed


def test_a_month_stands_beside_the_deaths_there_were(isle: Session) -> None:
    page = asked(isle, "exchange", "of=bay.m.2014", 2)
    table = page.table("ages")
    causes = [one.key for one in table.columns if one.span]
    assert causes == ["cause_body", "cause_own_hand"]
    assert_allclose(sum(numbers(table, key) for key in causes), numbers(table, "there"))
    assert (numbers(table, "fewer") <= numbers(table, "there")).all()
    by_cause = page.table("causes")
    taken = numbers(by_cause, "share") / 100 * numbers(by_cause, "there")
    assert_allclose(numbers(by_cause, "fewer"), taken)
    assert "To make life expectancy of men of Bay in 2014 a month longer takes" in said(page)


def test_provisional_years_are_marked_on_each_page(isle: Session) -> None:
    for view, query in (
        ("what-if", CHANGED),
        ("gaps", "of=bay.m.2014"),
        ("exchange", "of=bay.m.2014"),
    ):
        page = asked(isle, view, query)
        assert any(one.word == "Provisional" and one.beside for one in page.cautions), view
        assert any(PROVISIONAL in row.marks for table in page.tables for row in table.rows), view


def test_gaps_without_a_number_are_undefined_and_say_why(isle: Session) -> None:
    page = asked(isle, "what-if", "at=bay.m.2014&by=-100&from=100")
    row = cells(page.table("figures"), "e0")
    assert isinstance(row["change"], Gap)
    assert row["change"].kind is GapKind.UNDEFINED
    assert row["change"].reason


@pytest.fixture(scope="module")
def guarded(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Session]:
    """Areas of which one is small, and a policy that withholds counts below three."""
    url = f"sqlite:///{tmp_path_factory.mktemp('guarded') / 'ebbline.db'}"
    migrate(url)
    engine = make_engine(url)
    sizes = {"north": 6e5, "south": 6e5, "bay": 8e3}
    panels = {
        f"{area}.{sex}.{year}": gompertz_panel(sex=sex, people=people, seed=100 * place + year)
        for place, (area, people) in enumerate(sizes.items())
        for sex in "fm"
        for year in (2013, 2014)
    }
    panels |= {name: one.regroup(SHORT) for name, one in panels.items() if name[:3] == "bay"}
    by_cause = {name: dealt(panel, at) for at, (name, panel) in enumerate(panels.items())}
    with sessions(engine)() as session:
        parents = dict.fromkeys(sizes, "isle")
        edition(session, panels, parents=parents, causes=LIST, by_cause=by_cause)
        terms = Terms(threshold=3)
        set_policy(session, collection="isle", terms=terms, note="Few.", by=LOCAL, now=NOON)
        yield session
    engine.dispose()


@pytest.mark.parametrize(
    ("view", "query"),
    [
        ("what-if", "at=bay.m.2014&by=-20&from=40&to=59&target=77"),
        ("what-if", "at=bay.m.2014&toward=north.m.2014"),
        ("gaps", "of=bay.m.2014&least=20000"),
        ("exchange", "of=bay.m.2014"),
        ("exchange", "of=isle.m.2014"),
    ],
)
def test_under_a_policy_withheld_counts_are_nowhere(
    guarded: Session, view: str, query: str
) -> None:
    page = asked(guarded, view, query)
    full = asked(guarded, view, query + "&figures=full")
    marked = {
        (table.key, at, key.key)
        for table in page.tables
        for at, row in enumerate(table.rows)
        for key, cell in zip(table.columns, row.cells, strict=True)
        if isinstance(cell, Gap) and cell.kind is GapKind.WITHHELD
    }
    assert marked, "something is withheld here"
    assert any(caution.word == "Withheld" for caution in page.cautions)
    assert not any(caution.word == "Withheld" for caution in full.cautions)
    for table in page.tables:
        for row in table.rows:
            for head, cell in zip(table.columns, row.cells, strict=True):
                decimals = head.decimals if row.decimals is None else row.decimals
                if isinstance(cell, float) and decimals is not None:
                    assert cell == round(cell, decimals), (table.key, head.key)


def test_gaps_of_every_age_and_cause_are_folded_those_of_ages_are_not(isle: Session) -> None:
    assert not asked(isle, "gaps", "of=bay.m.2014").by_cause
    assert asked(isle, "gaps", "of=bay.m.2014", 2).by_cause
