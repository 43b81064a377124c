"""The page of causes as data: sentence, table and picture say the same."""

import re

import numpy as np
import pytest
from numpy.testing import assert_allclose

from server.exports.table import Gap, Table
from server.intake.causes.lists import SHORT
from server.pages import causes, contents, population_year
from server.pages.causes import CausesPage
from server.pages.printed import printed
from server.results.causes import CauseChoice
from server.results.contents import ContentsQuestion
from server.results.holdings import NotInEdition
from server.results.questions import CausesQuestion, PopulationYear, PopulationYearQuestion
from server.sentences.pieces import plain
from server.store.connect import Session
from server.store.heading import heading
from server.store.records import Break
from tests.factories import edition, gompertz_panel, parted

LEAVES = [one.code for one in SHORT if one.code not in {other.parent for other in SHORT}]
CODING = Break("", "2013", "coding", "dementia", "", 1.5, 0.1)


@pytest.fixture
def isle(session: Session) -> Session:
    """The north with three years by cause, a coding break of dementia in 2013, the last year
    provisional; the rock has hardly anybody."""
    panels, counts = {}, {}
    for seed, year in enumerate(("2012", "2013", "2014")):
        for sex in "fm":
            for area, people in (("north", 4e5), ("rock", 4e3)):
                name = f"{area}.{sex}.{year}"
                panels[name] = gompertz_panel(sex=sex, seed=seed, people=people)
                own = parted(panels[name], len(LEAVES), seed=seed).deaths
                counts[name] = {code: own[at] for at, code in enumerate(LEAVES)}
    edition(
        session,
        panels,
        parents={"north": "isle", "rock": "isle"},
        causes=SHORT,
        by_cause=counts,
        breaks=(CODING,),
        provisional=("2014",),
    )
    return session


def page(session: Session, of: str = "north.m.2013", **keys: object) -> CausesPage:
    question = CausesQuestion(PopulationYear.parse(of), **keys)  # type: ignore[arg-type]
    return causes.build(session, heading(session, "isle", 1), question.completed())


def said(built: CausesPage) -> str:
    return plain(built.answer).replace("\N{NO-BREAK SPACE}", " ")


def numbers(table: Table, key: str) -> np.ndarray:  # type: ignore[type-arg]
    at = table.column(key)
    cells = [row.cells[at] for row in table.rows]
    return np.array([np.nan if isinstance(one, Gap | str) else one for one in cells], float)


EACH = CauseChoice("causes", "spread", "spread", "applied")


@pytest.mark.parametrize("choice", [CauseChoice(), EACH], ids=["groups", "each"])
@pytest.mark.parametrize("of", ["north.m.2013", "isle.p.2012"])
def test_sentence_table_and_picture_agree_after_rounding(
    isle: Session, choice: CauseChoice, of: str
) -> None:
    built = page(isle, of, causes=choice)
    table, text = built.table("causes"), said(built)
    shown = printed(table)
    total = shown.rows[-1].cells[table.column("lost") - 2].text
    assert f"Of the {total} years lost per death" in text
    named = [row for row in table.rows if str(row.shown).lower() in text.lower()]
    assert len(named) >= 3
    for place in range(3):
        cells = shown.rows[table.rows.index(named[place])].cells
        lost = next(cell for cell in cells if cell.label.startswith("years lost"))
        assert f"{lost.text} ({lost.under})" in text
    drawn = built.chart("ranked").series[0]
    assert_allclose(drawn.x, numbers(table, "lost")[: len(drawn.x)], rtol=1e-12)
    assert list(drawn.x) == sorted(drawn.x, reverse=True)
    assert built.chart("ranked").finding.startswith(str(table.rows[0].shown))


@pytest.mark.parametrize("choice", [CauseChoice(), EACH], ids=["groups", "each"])
def test_what_adds_up_does_and_gains_do_not(isle: Session, choice: CauseChoice) -> None:
    built = page(isle, "north.p.2012", causes=choice)
    for key, column in (
        ("causes", "deaths"),
        ("causes", "share"),
        ("causes", "lost"),
        ("unevenness", "unevenness"),
        ("premature", "deaths"),
        ("premature", "chance"),
    ):
        own = numbers(built.table(key), column)
        assert_allclose(own[:-1].sum(), own[-1], rtol=1e-9, err_msg=f"{key} {column}")
    ages = built.table("ages")
    cells = np.array([row.cells[1:] for row in ages.rows], float)
    assert_allclose(cells[:, :-1].sum(axis=1), cells[:, -1], rtol=1e-9)
    assert ages.total is not None
    assert_allclose(cells.sum(axis=0), np.array(ages.total.cells[1:], float), rtol=1e-9)
    assert built.table("lives").rows[-1].cells[-1] == ""
    assert "do not add up" in built.table("lives").note


def test_a_small_population_has_shares_and_no_life_table(isle: Session) -> None:
    built = page(isle, "rock.f.2013")
    assert re.match(r"Of the \d+ deaths of women of Rock in 2013, \d+ % \(", said(built))
    assert "by-age" not in built.drawn
    assert not np.isfinite(numbers(built.table("lives"), "gain")).any()


def test_a_break_of_the_cause_parts_its_years_unless_its_ratio_is_applied(isle: Session) -> None:
    kept = page(isle, cause="dementia")
    assert None in kept.chart("course").series[0].y
    assert "a break parts its years" in kept.chart("course").finding
    assert "From 2013 on" in plain(kept.course)
    applied = page(isle, cause="dementia", causes=CauseChoice(ratios="applied"))
    assert None not in applied.chart("course").series[0].y
    assert "comparability ratio 1.500" in plain(applied.course)
    one, other = (numbers(built.table("course"), "rate") for built in (kept, applied))
    assert_allclose(other[:1], 1.5 * one[:1], rtol=1e-9)
    assert_allclose(other[1:], one[1:], rtol=1e-12)
    # its standard error of a fifteenth lies in the limits of the earlier year alone
    wide, narrow = (
        numbers(built.table("course"), "rate_high") - numbers(built.table("course"), "rate_low")
        for built in (applied, kept)
    )
    assert wide[0] > 1.55 * narrow[0]
    assert_allclose(wide[1:], narrow[1:], rtol=1e-12)
    # its group holds it; another group does not
    assert None in page(isle, cause="mind-nerves").chart("course").series[0].y
    assert None not in page(isle, cause="cancers").chart("course").series[0].y


def test_provisional_years_are_told_and_hollow(isle: Session) -> None:
    built = page(isle, "north.m.2014", cause="stroke")
    assert "Provisional" in [one.word for one in built.cautions]
    assert built.chart("course").series[0].provisional == (False, False, True)
    second = {str(row.cells[0]): row.second for row in built.table("causes").rows}
    assert second["pending"] == "a cause may still come"
    final = {str(row.cells[0]): row.second for row in page(isle).table("causes").rows}
    assert final["pending"] == final["ill-defined"] != ""


def test_help_is_offered_where_such_deaths_are_named(isle: Session) -> None:
    assert plain(page(isle).care)  # of the targets two name them


def test_avoidable_causes_are_those_of_the_address(isle: Session) -> None:
    none = page(isle)
    assert "none is built in" in plain(none.avoidable)
    some = page(isle, avoidable=("cancers", "stroke"))
    table = page(isle, causes=CauseChoice("causes")).table("premature")
    asked = [one.code for one in SHORT if one.parent == "cancers"] + ["stroke"]
    deaths = sum(
        float(row.cells[1])  # type: ignore[arg-type]
        for row in table.rows
        if row.cells[0] in asked and not isinstance(row.cells[1], Gap)
    )
    assert f"they have {deaths:.0f} deaths" in plain(some.avoidable)


def test_targets_name_their_codes_and_are_not_the_official_series(isle: Session) -> None:
    built = page(isle)
    assert "not the official series" in plain(built.official)
    assert [row.cells[0] for row in built.table("targets").rows] == [
        "3.4.1", "3.4.2", "3.6.1", "16.1.1",
    ]  # fmt: skip
    assert np.isfinite(numbers(built.table("targets"), "value")).all()


def test_causes_not_in_the_list_and_editions_without_causes(isle: Session) -> None:
    with pytest.raises(NotInEdition, match="has no plague and frogs"):
        page(isle, cause="plague", avoidable=("frogs", "stroke"))
    edition(isle, {"north.m.2013": gompertz_panel(sex="m")}, code="bare")
    question = CausesQuestion(PopulationYear.parse("north.m.2013"))
    with pytest.raises(NotInEdition, match="holds no deaths by cause"):
        causes.build(isle, heading(isle, "bare", 1), question)


def test_other_pages_lead_here_where_there_are_causes(isle: Session) -> None:
    of = PopulationYear.parse("north.m.2013")
    life = population_year.build(isle, heading(isle, "isle", 1), PopulationYearQuestion(of))
    links = [piece.href for sentence in life.further for piece in sentence]
    assert any("/causes?of=north.m.2013&causes=groups" in link for link in links)
    inside = contents.build(isle, heading(isle, "isle", 1), ContentsQuestion())
    assert "/causes?of=" in str(inside.questions)
    edition(isle, {"north.m.2013": gompertz_panel(sex="m")}, code="bare")
    bare = population_year.build(isle, heading(isle, "bare", 1), PopulationYearQuestion(of))
    assert "/causes?" not in str(bare.further)


@pytest.mark.parametrize(("share", "told"), [(0.6, True), (0.1, False)])
def test_external_causes_are_put_in_plain_words_where_they_are_named(
    session: Session, share: float, told: bool
) -> None:
    panels = {f"north.f.{year}": gompertz_panel(seed=year) for year in (2012, 2013)}
    others = dict.fromkeys(("stroke", "cancer-lung", "lungs-chronic"), (1 - share) / 3)
    counts = {
        name: {code: ({"falls": share} | others).get(code, 0) * panel.deaths for code in LEAVES}
        for name, panel in panels.items()
    }
    edition(session, panels, causes=SHORT, by_cause=counts)
    found = page(session, "north.f.2013", causes=CauseChoice(level="groups"))
    lead = " ".join(plain(one) for one in found.lead)
    assert ("External causes are injuries" in lead) == told


def test_causes_whose_deaths_are_spread_are_not_said_to_have_none(isle: Session) -> None:
    choice = CauseChoice(level="groups", ill_defined="spread", undetermined="spread")
    note = page(isle, causes=choice).table("causes").note.lower()
    assert "ill-defined" not in note
    assert "undetermined" not in note
