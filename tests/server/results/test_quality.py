"""What is there, what the checks find, and the indices, against the same worked out otherwise."""

import math
from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.panel import Panel
from engine.quality import age_sex_accuracy, myers, whipple
from server.results.quality import Quality, QualityQuestion, quality
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import cells, edition, stored_collection, stored_edition
from tests.published import denmark

SINGLE = AgeGrid(tuple(range(96)))
YEARS = range(1994, 2005)


def danes(sex: str, year: int, grid: AgeGrid = SINGLE, times: float = 1.0) -> Panel:
    panel = denmark.one({"f": "female", "m": "male"}[sex], year).regroup(grid)
    return replace(panel, deaths=np.round(panel.deaths * times))


def judged(session: Session, panels: Mapping[str, Panel], **of: object) -> Quality:
    edition(session, panels, **of)  # type: ignore[arg-type]
    return quality(session, heading(session, "isle", 1))


def clean(years: range = YEARS) -> dict[str, Panel]:
    return {f"dk.{sex}.{year}": danes(sex, year) for sex in "fm" for year in years}


def test_clean_counts_are_complete_and_without_a_finding(session: Session) -> None:
    found = judged(session, clean(), provisional=("2004",))
    assert found.periods == tuple(map(str, YEARS))
    assert (found.complete, len(found.places), found.findings) == (11, 11, ())
    assert found.provisional == ("2004",)
    assert {one.held for one in found.places.values()} == {"complete"}


def test_indices_are_those_of_women_and_men_of_the_newest_year(session: Session) -> None:
    (found,) = judged(session, clean()).indices
    women, men = danes("f", 2004).exposure, danes("m", 2004).exposure
    assert (found.area, found.period, found.open_age) == ("dk", "2004", 95)
    assert found.whipple == pytest.approx(float(whipple(SINGLE, women + men)))
    assert found.myers == pytest.approx(float(myers(SINGLE, women + men)))
    assert found.accuracy == pytest.approx(float(age_sex_accuracy(SINGLE, women, men).index))
    assert found.registered == pytest.approx(100, abs=3)
    every = [danes(sex, year).deaths for sex in "fm" for year in YEARS]
    assert found.open_share == pytest.approx(
        100 * sum(one[-1] for one in every) / sum(one.sum() for one in every)
    )


def test_deaths_registered_in_part_show(session: Session) -> None:
    panels = {f"dk.{sex}.{year}": danes(sex, year, times=0.6) for sex in "fm" for year in YEARS}
    found = judged(session, panels)
    assert found.indices[0].registered == pytest.approx(60, abs=2)
    assert [one.key for one in found.findings] == ["registered_share"]


def test_a_year_that_stands_out_is_marked_in_its_area_alone(session: Session) -> None:
    years = range(1994, 2000)
    panels = clean(years)
    for name, one in clean(years).items():  # elsewhere live as many again, and a tenth more
        more = replace(one, deaths=np.round(1.1 * one.deaths), exposure=1.1 * one.exposure)
        panels[f"fo.{name[3:]}"] = more
    panels["fo.f.1997"] = danes("f", 1997, times=1.6)
    found = judged(session, panels)
    doubted = {place for place, one in found.places.items() if "years" in one.doubts}
    assert doubted == {("fo", "1997")}
    jump = next(one for one in found.findings if one.key == "jump_of_deaths")
    assert (jump.times, jump.areas, jump.years) == (1, ("fo",), ("1997",))


def test_what_is_found_in_all_years_together_marks_each_of_them(session: Session) -> None:
    """The person-years at 98 of the Danish file: told of all years, seen in each."""
    grid = AgeGrid(tuple(range(100)))
    found = judged(
        session,
        {f"dk.{sex}.{year}": danes(sex, year, grid) for sex in "fm" for year in denmark.YEARS}
        | {"fo.f.1999": danes("f", 1999)},
    )
    (pooled,) = [one for one in found.findings if one.key == "old_age_rates_fall"]
    assert (pooled.areas, pooled.years) == (("dk",), ("1974–2012",))
    marked = {place for place, one in found.places.items() if "ages" in one.doubts}
    assert marked == {("dk", str(year)) for year in denmark.YEARS}


def test_what_is_lacking_is_told_apart(session: Session) -> None:
    stored_collection(session, "isle")
    held = cells("ab", years=(2001, 2002, 2003))
    gone = {
        ("a", "f", "2001", "deaths"): "part",
        ("a", "f", "2002", "deaths"): "people",
        ("a", "m", "2002", "deaths"): "people",
        ("b", "f", "2003", "person_years"): "deaths",
        ("b", "m", "2003", "person_years"): "deaths",
    }
    kept = {
        key: cell
        for key, cell in held.items()
        if (key.area, key.sex, key.period, key.measure) not in gone
        and (key.area, key.period) != ("b", "2001")
    }
    stored_edition(session, kept, collection="isle")
    found = quality(session, heading(session, "isle", 1))
    assert {place: one.held for place, one in found.places.items()} == {
        ("a", "2001"): "part",
        ("a", "2002"): "people",
        ("a", "2003"): "complete",
        ("b", "2001"): "none",
        ("b", "2002"): "complete",
        ("b", "2003"): "deaths",
    }
    assert found.complete == 2


def test_what_cannot_be_told_is_not_a_number(session: Session) -> None:
    small = AgeGrid((0, 1, 5, 10, 85))
    panels = {f"dk.{sex}.2004": danes(sex, 2004, small) for sex in "fm"}
    (found,) = judged(session, panels).indices
    assert all(
        math.isnan(one) for one in (found.whipple, found.myers, found.accuracy, found.registered)
    )
    assert found.open_age == 85


def test_a_question_has_no_choices_of_its_own() -> None:
    asked = QualityQuestion.parse([])
    assert asked.canonical() == "figures=released&settings=almanac-1"
