"""Last year's table: every figure matched, explained, or said not to be known."""

import json as plain_json

import pytest
from sqlalchemy.orm import Session

from engine import indicators
from engine import settings as named
from engine.settings import SETTINGS
from server.exports import csv, json, xlsx
from server.pages import population_year, trend
from server.pages.page import Page
from server.pages.reproduce import FINEST, Asked, ReproducedPage, build, form, told_apart
from server.pages.twins import twin
from server.results.keys import BadValue, PopulationYear
from server.results.loading import load
from server.results.questions import PopulationYearQuestion, TrendQuestion
from server.results.series import TooLarge
from server.sentences.pieces import plain
from server.store import editions
from server.store.heading import heading
from tests.factories import edition, gompertz_panel

TREND = TrendQuestion("e0", ("cape", "north"), ("f",), "2012", "2014")
HEAD = "area,sex,year,indicator,value\n"


@pytest.fixture
def isle(session: Session) -> Session:
    """Edition 2 has other deaths in the north in 2014."""
    panels = {
        f"{area}.{sex}.{year}": gompertz_panel(sex=sex, level=level + 1e-7 * year)
        for area, level in (("north", 2.4e-5), ("cape", 2.9e-5))
        for sex in "fm"
        for year in (2012, 2013, 2014)
    }
    edition(session, panels)
    edition(session, {"north.f.2014": gompertz_panel(level=3.4e-4 / 2)})
    return session


def figure(
    session: Session, number: int, code: str, key: str = "e0", by: str = "almanac-1"
) -> float:
    at = PopulationYear.parse(code)
    panel = load(session, "isle", number, [at])[at].panel
    one = indicators.find("e0")
    return one.unit.scale * float(indicators.estimate(one, panel, named.find(by)).value)


def looked_up(session: Session, text: str, **asked: str) -> ReproducedPage:
    return build(session, "t.csv", (HEAD + text).encode(), Asked(**asked))


def verdicts(page: ReproducedPage) -> list[str]:
    table = page.table("figures")
    return [str(row.cells[table.column("verdict")]) for row in table.rows]


def saved(session: Session, number: int) -> Page:
    return trend.build(session, heading(session, "isle", number), TREND)


@pytest.mark.parametrize("write", [xlsx.write, json.write])
def test_a_saved_page_is_matched_in_full(isle: Session, write) -> None:  # type: ignore[no-untyped-def]
    page = build(isle, "t", write(twin(saved(isle, 2))), Asked())
    assert set(verdicts(page)) == {"matched"}
    assert len(verdicts(page)) == 12  # years by area, and every estimate
    assert plain(page.answer) == "All 12 figures of t are matched."
    assert "are what its address gives today." in plain(page.lead[0])
    assert not page.others


def test_a_csv_takes_the_address_beside_it(isle: Session) -> None:
    shown = saved(isle, 1)
    content = csv.write(shown.table("estimates"))
    page = build(isle, "t.csv", content, Asked(address=shown.frame.address))
    assert sorted(set(verdicts(page))) == ["matched", "revised since"]
    (row,) = (row for row in page.table("figures").rows if "revised since" in row.cells)
    assert row.cells[1:4] == ("north", "women", "2014")
    why = str(row.cells[-1])
    assert why.startswith("as edition 1 has it; edition 2 differs: population +")
    assert "; deaths +" in why
    assert "engine" not in why  # the file holds every digit
    assert row.href.startswith("/c/isle/2/account?of=e0&at=north.f.2014&since=1")


def test_a_saved_life_table_is_compared_cell_by_cell(isle: Session) -> None:
    question = PopulationYearQuestion(PopulationYear("cape", "f", "2013"))
    shown = population_year.build(isle, heading(isle, "isle", 2), question)
    told = plain_json.loads(json.write(twin(shown)))
    told["figures"]["life"]["rows"][3]["lx"] += 1.0
    page = build(isle, "t.json", plain_json.dumps(told).encode(), Asked())
    assert "e0" in {row.cells[4] for row in page.table("figures").rows}
    assert set(verdicts(page)) == {"matched"}
    (row,) = page.table("others").rows
    assert row.cells[:3] == ("life", 4, "lx")


def test_a_printed_table_is_told_line_by_line(isle: Session) -> None:
    then, now = (figure(isle, number, "north.f.2014") for number in (1, 2))
    other = figure(isle, 2, "cape.f.2014", by="almanac-1-constant-rate")
    cut = int(10_000 * figure(isle, 2, "cape.m.2012")) / 10_000
    assert round(figure(isle, 2, "cape.m.2012"), 4) != cut
    lines = [
        f"north,f,2014,e0,{now:.1f}",
        f"North,women,2014,Life expectancy at birth,{then:.2f}",
        f"cape,f,2014,e0,{other:.3f}",
        f"cape,m,2012,e0,{cut:.4f}",
        "cape,m,2013,e0,12.3",
        "cape,m,2013,e0,withheld",
        "atlantis,m,2013,e0,80.0",
        "cape,m,2013,shoe size,42",
        "cape,m,13,e0,80.0",
    ]
    page = looked_up(isle, "\n".join(lines), collection="isle")
    assert verdicts(page) == [
        "matched",
        "matched elsewhere",
        "matched elsewhere",
        "cut off, not rounded",
        "not found",
        "no number",
    ]
    whys = [str(row.cells[-1]) for row in page.table("figures").rows]
    assert whys[1] == "it equals that of edition 1 under almanac-1"
    assert whys[2] == "it equals that of edition 2 under almanac-1-constant-rate"
    assert "engine or rounding" in whys[4]
    unknown = page.table("unknown")
    assert [row.cells[-1] for row in unknown.rows] == [
        "its area “atlantis” is not known",
        "its indicator “shoe size” is not known",
        "its year “13” is not known",
    ]
    assert [row.cells[0] for row in unknown.rows] == [8, 9, 10]
    assert plain(page.answer) == (
        "Of 9 figures of t.csv one is matched, 4 are explained, one is not found and 3 rows are not"
        " known."
    )


def test_the_edition_may_be_said_beside_the_file(isle: Session) -> None:
    then = figure(isle, 1, "north.f.2014")
    page = looked_up(isle, f"north,f,2014,e0,{then:.2f}", collection="isle", edition="1")
    assert verdicts(page) == ["revised since"]
    again = looked_up(isle, "north,f,2014,,75.0", collection="isle", of="e65")
    assert again.table("figures").rows[0].cells[4] == "e65"


def test_nothing_is_kept(isle: Session) -> None:
    before = editions.listing(isle, "isle")
    looked_up(isle, "north,f,2014,e0,75.0", collection="isle")
    assert editions.listing(isle, "isle") == before
    assert not isle.dirty
    assert not isle.new


def test_what_is_not_said_is_asked(isle: Session) -> None:
    edition(isle, {"a.f.2014": gompertz_panel()}, code="other")
    with pytest.raises(BadValue, match="does not say of which collection"):
        looked_up(isle, "north,f,2014,e0,75.0")
    with pytest.raises(BadValue, match="has no edition 9"):
        looked_up(isle, "north,f,2014,e0,75.0", collection="isle", edition="9")
    assert [code for code, _name in form(isle).collections] == ["", "isle", "other"]


def plain_table(rows: int, value: str) -> str:
    return "".join(f"north,f,{2012 + at % 3},e0,{value}\n" for at in range(rows))


def test_a_table_that_takes_too_long_is_refused_and_a_terminal_is_offered(
    isle: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Two looks for each figure; and for one that is not found, one at each edition and setting."""
    beside = {"collection": "isle", "edition": "1"}
    content = (HEAD + plain_table(10, "1.25")).encode()
    looks = 2 * 10 + 10 * 2 * len(SETTINGS)
    page = build(isle, "t.csv", content, Asked(**beside), most=looks)
    assert verdicts(page) == ["not found"] * 10
    with pytest.raises(TooLarge, match=f"of which 10 are not .* takes up to {looks} looks"):
        build(isle, "t.csv", content, Asked(**beside), most=looks - 1)
    with pytest.raises(TooLarge, match=r"which takes 20 looks.* ebbline reproduce FILE"):
        build(isle, "t.csv", content, Asked(**beside), most=19)
    assert verdicts(build(isle, "t.csv", content, Asked(**beside), most=None)) == ["not found"] * 10
    monkeypatch.setattr("server.results.printed_tables.MOST_ROWS", 9)
    with pytest.raises(TooLarge, match="has 10 rows; a table of at most 9"):
        build(isle, "t.csv", content, Asked(**beside))


@pytest.mark.parametrize(
    ("printed", "today"),
    [
        ("81.934567890123", "81.934599999999"),
        ("0.00212345678901234", "0.00212345678901277"),
        ("1234567.12345678", "1234567.12345679"),
    ],
)
def test_numbers_of_many_digits_are_shown_as_far_as_they_differ(printed: str, today: str) -> None:
    shown = told_apart(printed, today)
    assert shown[0] != shown[1]
    for text, whole in zip(shown, (printed, today), strict=True):
        assert len(text) <= len(whole) + 1
        assert float(text.rstrip("…")) == pytest.approx(float(whole), rel=1e-5)
    assert told_apart("12.5", "13") == ("12.5", "13")
    assert told_apart("withheld, 12 of 100", "81.934567890123") == (
        ("withheld, 12 of 100", "81.934567890123")
    )


def test_a_printed_number_of_many_digits_says_that_there_are_more(isle: Session) -> None:
    content = (HEAD + "north,f,2012,e0,12.345678901234\nnorth,f,2013,e0,12.34\n").encode()
    page = build(isle, "t.csv", content, Asked(collection="isle", edition="1"))
    table = page.table("figures")
    shown = [row.cells[table.column("printed")] for row in table.rows]
    assert shown == [f"{12.345678901234:.{FINEST + 1}f}…", "12.34"]
