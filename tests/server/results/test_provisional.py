"""How far provisional figures moved before: against each edition's own figures."""

from collections.abc import Callable
from contextlib import AbstractContextManager
from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy.orm import Session

from engine import indicators
from engine import settings as named
from engine.ages import Array
from engine.panel import Panel
from server.pages.contents import build as build_contents
from server.pages.trend import build as build_trend
from server.results import provisional
from server.results.contents import ContentsQuestion
from server.results.provisional import Track, track
from server.results.questions import TrendQuestion
from server.store.heading import heading
from server.store.records import Area, Key, Vector
from tests.factories import (
    edition,
    gompertz_panel,
    stored_collection,
    stored_edition,
    withdrawn,
)

E0 = indicators.find("e0")


def counted(level: float, sex: str = "f") -> Panel:
    return gompertz_panel(sex=sex, level=level).over(lambda array: np.round(array, 3))


def e0(panel: Panel) -> float:
    return float(indicators.estimate(E0, panel, named.find("almanac-1")).value)


A, B, C = (counted(level) for level in (2.4e-5, 2.5e-5, 2.7e-5))
EARLIER = {f"north.f.{year}": counted(2.5e-5) for year in ("2012", "2013")}


@pytest.fixture(autouse=True)
def forgotten() -> None:
    provisional._KNOWN.clear()


def history(session: Session, number: int, settings: str = "almanac-1") -> Track:
    return track(session, heading(session, "isle", number), settings, "released")


def test_from_the_first_that_had_it_to_the_one_that_is_read(session: Session) -> None:
    edition(session, EARLIER | {"north.f.2014": A}, provisional=("2014",))
    edition(session, {"north.f.2014": B}, provisional=("2014",))
    edition(session, {"north.f.2014": C})
    assert not history(session, 1)
    for number, last in ((2, B), (3, C)):
        (past,) = history(session, number).pasts
        assert (past.of.code, past.first) == ("north.f.2014", 1)
        assert past.moved == pytest.approx(e0(last) - e0(A), abs=1e-12)
        assert past.deaths == pytest.approx(last.deaths.sum() / A.deaths.sum() - 1, abs=1e-12)


def test_the_first_of_deaths_and_people_counts(session: Session) -> None:
    """The deaths came first as provisional, the people in a file of their own a year later."""
    stored_collection(session, "isle")
    north = [Area("north", "North")]

    def cell(measure: str, values: Array, status: str) -> dict[Key, Vector]:
        return {Key("north", "f", "2014", measure): Vector(status, A.grid, values)}

    first = cell("deaths", A.deaths, "provisional") | cell("person_years", A.exposure, "final")
    stored_edition(session, first, collection="isle", areas=north)
    second = cell("person_years", A.exposure * 1.01, "provisional")
    stored_edition(session, second, collection="isle", areas=north)
    edition(session, {"north.f.2014": C})
    (past,) = history(session, 3).pasts
    assert past.first == 1
    assert past.moved == pytest.approx(e0(C) - e0(A), abs=1e-9)


def test_only_editions_it_was_built_on_count(session: Session) -> None:
    """Edition 2 was withdrawn before edition 3 was made, so that nothing of it is in its past."""
    edition(session, EARLIER | {"north.f.2014": A})
    edition(session, {"north.f.2014": B}, provisional=("2014",))
    withdrawn(session, 2, "isle")
    edition(session, {"north.f.2014": C}, provisional=("2014",))
    assert not history(session, 3)
    edition(session, {"north.f.2014": A})
    (past,) = history(session, 4).pasts
    assert past.first == 3
    assert past.moved == pytest.approx(e0(A) - e0(C), abs=1e-12)


def test_median_and_largest_are_of_sizes(session: Session) -> None:
    areas = {"north": (A, B), "cape": (B, A), "rock": (A, C)}
    first = {f"{area}.f.2014": pair[0] for area, pair in areas.items()}
    edition(session, first, provisional=("2014",))
    edition(session, {f"{area}.f.2014": pair[1] for area, pair in areas.items()})
    found = history(session, 2)
    sizes = sorted(abs(e0(new) - e0(old)) for old, new in areas.values())
    assert found.median == pytest.approx(sizes[1], abs=1e-12)
    assert found.most is not None
    assert (found.most.of.area, abs(found.most.moved)) == (
        "rock",
        pytest.approx(sizes[2], abs=1e-12),
    )
    assert found.median_deaths == pytest.approx(
        sorted(abs(new.deaths.sum() / old.deaths.sum() - 1) for old, new in areas.values())[1]
    )


def test_a_year_made_final_as_it_was_moved_by_nothing(session: Session) -> None:
    edition(session, EARLIER | {"north.f.2014": A}, provisional=("2014",))
    edition(session, {"north.f.2014": A})
    (past,) = history(session, 2).pasts
    assert (past.moved, past.deaths) == (0.0, 0.0)


def test_what_was_final_or_never_came_again_has_no_past(session: Session) -> None:
    edition(session, EARLIER | {"north.f.2014": A}, provisional=("2014",))
    edition(session, {"north.f.2013": B})
    assert not history(session, 2)


def test_persons_stand_aside_where_women_and_men_do(session: Session) -> None:
    edition(session, {"north.f.2014": A, "north.m.2014": counted(3e-5, "m")}, provisional=("2014",))
    edition(session, {"north.f.2014": B})
    assert {one.of.sex for one in history(session, 2).pasts} == {"f"}


def test_years_are_taken_one_by_one_under_settings_that_add_them_up(session: Session) -> None:
    edition(session, EARLIER | {"north.f.2014": A}, provisional=("2014",))
    edition(session, {"north.f.2014": B})
    (past,) = history(session, 2, "almanac-1-3-years").pasts
    assert past.moved == pytest.approx(e0(B) - e0(A), abs=1e-12)


def test_pages_say_it_and_later_editions_change_nothing(
    session: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    edition(session, EARLIER | {"north.f.2014": A}, provisional=("2014",))
    edition(session, {"north.f.2014": C, "north.f.2015": B}, provisional=("2015",))
    question = TrendQuestion("e0", ("north",), ("f",), "2012", "2015")

    def said(number: int) -> list[str]:
        built = build_trend(session, heading(session, "isle", number), question)
        return [one.text for one in built.cautions if one.word == "Moved before"]

    assert said(1) == [
        "No provisional year of this collection had been revised when this edition was made, so"
        " how far such figures move is not known."
    ]
    with count_statements() as statements:
        (text,) = said(2)
    assert len(statements) <= 8
    assert text.startswith("Of one provisional figure handed in again, in one year, life")
    assert f"at most by {abs(e0(C) - e0(A)):.2f}, for women of North in 2014" in text
    contents = build_contents(session, heading(session, "isle", 2), ContentsQuestion())
    (row,) = contents.table("provisional").rows
    assert row.cells[:3] == ("2014", "1", 1.0)
    edition(session, {"north.f.2015": A, "north.f.2014": A})
    provisional._KNOWN.clear()
    assert said(2) == [text]


def test_it_is_remembered(
    session: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    edition(session, EARLIER | {"north.f.2014": A}, provisional=("2014",))
    edition(session, {"north.f.2014": replace(B)})
    shown = heading(session, "isle", 2)
    with count_statements() as first:
        found = track(session, shown, "almanac-1", "released")
    with count_statements() as again:
        assert track(session, shown, "almanac-1", "released") is found
    assert (len(first), len(again)) == (1, 0)
