"""No sentence of a comparison claims a direction that its interval does not bear out, and what is
said, drawn and printed is one number, over random populations."""

import re
from collections.abc import Iterable
from functools import cache

import numpy as np
import pytest

from server.charts.chart import Chart
from server.exports.table import Gap, Table
from server.pages import comparison as page
from server.pages import comparison_causes, comparison_even
from server.pages import comparison_charts as charts
from server.pages import comparison_contributions as contributions
from server.pages import comparison_deaths as dying
from server.pages import comparison_rise as rising
from server.pages import comparison_tables as tables
from server.pages.printed import printed
from server.results.compared import Comparison
from server.results.estimating import USUAL
from server.sentences import comparison as say
from server.sentences.numbers import number
from server.sentences.pieces import plain
from tests.factories import GRIDS, comparison_of, gompertz_panel, parted

EACH = pytest.mark.parametrize("number_", range(18))
READ = (*USUAL, "threshold_H")  # no other figure is read
DIRECTIONS = re.compile(
    r"\b(more of life|less of life|higher|lower|farther apart|closer together"
    r"|became (less|more) even"
    r"|Length of life was (less|more) even|make lives|make length of life|Progress was faster"
    r"|compare better|comes from|largest (part|single part)|By cause|carry|make most)\b"
)


@pytest.fixture(autouse=True)
def few_figures(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("server.results.compared.COMPARED", READ)


@cache
def comparison(number_: int) -> Comparison:
    """Small and large populations, alike or not, by cause or not."""
    rng = np.random.default_rng(number_)
    people = rng.choice([2e4, 1e5, 8e5, 5e6])
    apart = rng.choice([1.0, 1.0, 1.03, 1.25])
    slope = rng.choice([0.1, 0.103])
    this, that = (
        gompertz_panel(
            GRIDS["abridged"],
            people=float(people),
            seed=int(rng.integers(10_000)),
            level=level / np.exp(80 * (rise - 0.1)),
            slope=rise,
        )
        for rise, level in ((0.1, 2e-5 * apart), (slope, 2e-5))
    )
    causes = (parted(this, 4, seed=1), parted(that, 4, seed=2)) if number_ % 3 else None
    of = str(rng.choice(["e0", "e0", "H", "e65", "median", "asr_esp2013", "45q15"]))
    other = str(rng.choice(["north.f.2004", "south.f.2014"]))
    return comparison_of(this, that, of=of, causes=causes, sides=("north.f.2014", other))


def answer(found: Comparison) -> str:
    asked = charts.asked(found, found.question.of)
    return plain(say.answer(tables.pair(found), asked, "")).replace("\N{NO-BREAK SPACE}", " ")


def clear(found: Comparison, key: str) -> bool:
    one = found.difference[key]
    return bool(one.low > 0 or one.high < 0)


def drawn(found: Comparison) -> dict[str, Chart]:
    made = (
        charts.survivors, charts.life_expectancy, charts.asked_for, charts.unevenness,
        dying.ages_at_death, dying.ratios, rising.rise,
    )  # fmt: skip
    found_charts = [draw(found, "") for draw in made]
    found_charts += comparison_causes.charts(found, "")
    return {chart.key: chart for chart in found_charts if chart is not None}


@EACH
def test_a_direction_is_claimed_only_where_its_interval_leaves_out_nought(number_: int) -> None:
    found = comparison(number_)
    said, asked = answer(found), found.question.of
    if not clear(found, asked):
        assert "lear" in said or "cannot" in said
        assert not DIRECTIONS.search(said), said
    elif DIRECTIONS.search(said):
        up = float(found.difference[asked].value) > 0
        assert (" more of life" in said or " higher" in said) == up
    plates = {key: chart.finding for key, chart in drawn(found).items()}
    rests_on = {
        "survivors": "e0", "by-age": "e0", "unevenness": "H", "deaths": "edagger",
        "rise": "ageing_rate", "asked": asked,
    }  # fmt: skip
    for key, indicator in rests_on.items():
        if key in plates and not clear(found, indicator):
            assert not DIRECTIONS.search(plates[key]), plates[key]
    leads = " ".join(plain(one) for one in page._lead(found))
    if not clear(found, "H"):
        assert "even among" not in leads
        assert "became" not in leads
    if not clear(found, "e0"):
        assert "carry" not in leads


@EACH
def test_the_ratio_named_is_one_whose_band_leaves_out_one(number_: int) -> None:
    found = comparison(number_)
    chart = drawn(found).get("ratios")
    if chart is None or "most surely at" not in chart.finding:
        return
    ages = re.search(r"most surely at (.*?): (\d+)", chart.finding)
    assert ages is not None
    at = found.groups.labels.index(ages[1])
    low, high = float(found.ratios.low[at]), float(found.ratios.high[at])
    assert low > 1 or high < 1
    assert ("higher" in chart.finding) == (low > 1)
    assert number(abs(100 * (float(found.ratios.value[at]) - 1)), 0) == ages[2]
    least = np.fmax(found.ratios.low, 1 / found.ratios.high)  # how far apart at the least
    assert least[at] == np.nanmax(least)
    known = [
        one
        for one in zip(found.ratios.low, found.ratios.high, strict=True)
        if np.isfinite(one).any()
    ]
    told = re.search(r"at (\d+) of (\d+)", chart.finding)
    assert told is not None
    assert int(told[1]) <= sum(low > 1 or high < 1 for low, high in known)


@EACH
def test_causes_named_are_clear_and_work_the_way_of_a_clear_difference(number_: int) -> None:
    found = comparison(number_)
    of = found.explained.causes
    said = plain(comparison_causes.sentence(found))
    if of is None or not clear(found, of.key):
        assert said == ""
        return
    way = np.sign(of.difference)
    for at, cause in enumerate(of.list):
        if f" {cause.label.lower()} " in f" {said.lower()} ".replace(",", " ").replace(";", " "):
            assert of.cause_low[at] > 0 or of.cause_high[at] < 0, said
            assert np.sign(of.by_cause[at]) == way


@EACH
def test_early_and_late_deaths_claim_no_more_than_their_limits(number_: int) -> None:
    found = comparison(number_)
    of = found.explained.longer_even
    said = plain(comparison_even.sentence(found))
    if of is None:
        assert said == ""
        return
    for clause, at in zip(said.split(". "), (0, 1), strict=True):
        for words, halves, sign in (
            ("lives longer", of.longer, 1), ("lives shorter", of.longer, -1),
            ("less even", of.even, 1), ("more even", of.even, -1),
        ):  # fmt: skip
            if (
                words in clause
                and f"not clearly {words.split()[-1]}" not in clause
                and "or " + words not in clause
            ):
                end = halves.low[at] if sign > 0 else -halves.high[at]
                if "not clearly more or less even" in clause and words in (
                    "less even",
                    "more even",
                ):
                    continue
                assert end > 0, clause


def numbers(table: Table, key: str) -> Iterable[float]:
    at = table.column(key)
    return [row.cells[at] for row in table.rows if not isinstance(row.cells[at], Gap)]  # type: ignore[misc]


@EACH
def test_parts_add_up_and_are_drawn_as_they_are_printed(number_: int) -> None:
    found = comparison(number_)
    plates = drawn(found)
    if found.explained.contributions:
        parts = contributions.groups(found)
        for key in found.explained.contributions:
            whole = parts.total.cells[parts.column(key)]  # type: ignore[union-attr]
            assert sum(numbers(parts, key)) == pytest.approx(whole, rel=1e-9, abs=1e-9)
        if "by-age" in plates:
            shown = [row.cells[parts.column("e0")].text for row in printed(parts).rows]
            foot = {text for _x, text in plates["by-age"].foot_row}
            assert foot <= set(shown)
    of = found.explained.causes
    if of is None:
        return
    by_cause, by_cell = comparison_causes.tables(found)
    scale = contributions.printed(of.key).scale
    cells = scale * of.by_group
    assert cells.sum() + scale * of.remainder == pytest.approx(scale * of.difference, abs=1e-9)
    assert sum(numbers(by_cause, "adds")) == pytest.approx(scale * of.difference, abs=1e-9)
    edge = sum(numbers(by_cell, "all"))
    assert edge == pytest.approx(cells.sum(), abs=1e-9)
    chart = plates["causes"]
    rows = {row.shown: row.cells[by_cause.column("adds")] for row in by_cause.rows}
    for label, value in zip(chart.y_text, chart.series[0].x, strict=True):
        assert rows[label] == pytest.approx(value, rel=1e-12)


@EACH
def test_the_amounts_of_causes_in_the_sentence_are_those_of_the_table(number_: int) -> None:
    found = comparison(number_)
    said = plain(comparison_causes.sentence(found))
    if not said:
        return
    by_cause = printed(next(iter(comparison_causes.tables(found))))
    column = [head.key for head in next(iter(comparison_causes.tables(found))).columns].index(
        "adds"
    )
    text = {row.cells[0].text: row.cells[3].text for row in by_cause.rows}
    assert column == 3
    for amount, cause in re.findall(r"([−\d.,]+) (cause [a-z])", said):
        row = next(value for label, value in text.items() if label.lower() == cause)
        assert row.lstrip("+−") == amount.lstrip("−")


def test_the_tests_see_both_clear_and_unclear_ones() -> None:
    """Otherwise they would hold of nothing."""
    near = [gompertz_panel(people=8e5, seed=seed) for seed in (1, 2)]
    far = gompertz_panel(people=8e5, seed=3, level=2.5e-5)
    causes = parted(far, 4, seed=1), parted(near[1], 4, seed=2)
    assert "No clear" in answer(comparison_of(*near))
    clearly = comparison_of(far, near[1], causes=causes)
    assert DIRECTIONS.search(answer(clearly))
    assert "By cause" in plain(comparison_causes.sentence(clearly))
    assert comparison_even.sentence(clearly)
    assert "most surely at" in drawn(clearly)["ratios"].finding


@pytest.mark.parametrize("seed", [3, 4, 7])
def test_a_cause_that_is_large_but_not_clear_is_not_named(seed: int) -> None:
    this = gompertz_panel(people=4e5, seed=seed, level=2.2e-5)
    that = gompertz_panel(people=4e5, seed=50 + seed)
    causes = parted(this, 4, seed=seed), parted(that, 4, seed=seed + 7)
    found = comparison_of(this, that, causes=causes)
    of, said = found.explained.causes, plain(comparison_causes.sentence(found))
    assert of is not None
    large = np.sign(of.difference) * of.by_cause >= 0.1 * abs(of.difference)
    clear_ = (of.cause_low > 0) | (of.cause_high < 0)
    assert (large & ~clear_).any()
    named = [f"cause {one.label[-1]} (" in said for one in of.list]
    assert named == (large & clear_).tolist()
