"""The other side in another edition, in another collection, or in a printed table."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine import indicators
from engine.estimates import Reason
from engine.settings import find
from engine.standards.remaining_years import GBD_2010
from server.results.compared import Comparison
from server.results.comparison import comparison
from server.results.holdings import NotInEdition
from server.results.keys import BadValue
from server.results.questions import ComparisonQuestion, PopulationYear
from server.results.sides import completed, headings
from server.store.connect import Session
from server.store.errors import Missing
from server.store.heading import heading
from tests.factories import GRIDS, edition, gompertz_panel, withdrawn

FIVE = GRIDS["abridged"]
NORTH = gompertz_panel(people=2e6, seed=1)


@pytest.fixture
def isle(session: Session) -> Session:
    """Edition 2 of the isle puts deaths at 80 to 84 up by a tenth; the coast has single years."""
    edition(session, {"north.f.2013": NORTH, "north.f.2014": NORTH})
    at = np.array(FIVE.starts) == 80
    revised = replace(NORTH, deaths=np.where(at, np.ceil(1.1 * NORTH.deaths), NORTH.deaths))
    edition(session, {"north.f.2014": revised})
    single = gompertz_panel(GRIDS["single"], people=2e6, seed=2, level=2.4e-5)
    edition(session, {"bay.f.2012": single}, code="coast")
    return session


def asked(session: Session, address: str, number: int = 2) -> Comparison:
    items = [(part.partition("=")[0], part.partition("=")[2]) for part in address.split("&")]
    known = heading(session, "isle", number)
    return comparison(session, known, completed(session, known, ComparisonQuestion.parse(items)))


def test_a_revision_is_exact_and_its_parts_add_up(isle: Session) -> None:
    found = asked(isle, "this=north.f.2014&that=north.f.2014&that_edition=1")
    assert found.kind == "revision"
    difference = found.difference["e0"]
    assert difference.reason == Reason.NO_SAMPLING_INTERVAL
    assert np.isnan(difference.low)
    here, there = (float(side.estimates["e0"].value) for side in (found.this, found.that))
    assert_allclose(difference.value, here - there, rtol=1e-12)
    assert difference.value < 0
    part = found.explained.contributions["e0"]
    assert_allclose(part.by_group.sum() + part.remainder, difference.value, rtol=1e-9)
    touched = np.array(found.groups.starts) == 80
    assert_allclose(part.by_group[~touched], 0, atol=1e-9)
    assert np.isnan(part.low).all()
    assert np.isnan(found.ratios.low).all()
    assert_allclose(found.ratios.value[touched], 1.1, rtol=0.01)


def test_the_other_edition_may_be_the_later_one(isle: Session) -> None:
    there = asked(isle, "this=north.f.2014&that=north.f.2014&that_edition=1")
    back = asked(isle, "this=north.f.2014&that=north.f.2014&that_edition=2", number=1)
    assert_allclose(there.difference["e0"].value, -back.difference["e0"].value)


def test_two_collections_are_apart_and_brought_to_one_grid(isle: Session) -> None:
    found = asked(isle, "this=north.f.2014&that=bay.f.2012&that_collection=coast")
    assert (found.kind, found.grid) == ("elsewhere", FIVE)
    assert found.that.place.heading.collection.code == "coast"
    assert [side.of.area for side in found.regrouped] == ["bay"]
    apart = np.hypot(*(float(side.estimates["e0"].se) for side in (found.this, found.that)))
    assert_allclose(found.difference["e0"].se, apart, rtol=1e-12)


def test_a_printed_table_has_no_chance_of_its_own(isle: Session) -> None:
    found = asked(isle, "this=north.f.2014&standard=gbd2010")
    assert found.kind == "standard"
    assert_allclose(found.that.estimates["e0"].value, GBD_2010.years[0], atol=1e-9)
    assert found.that.estimates["e0"].reason == Reason.A_STANDARD
    assert np.isnan(found.that.estimates["mode"].low)
    assert_allclose(found.difference["e0"].se, found.this.estimates["e0"].se, rtol=1e-4)
    part = found.explained.contributions["e0"]
    assert_allclose(part.by_group.sum() + part.remainder, found.difference["e0"].value, rtol=1e-9)
    shown = dict(zip(found.groups.labels, ~found.rounded, strict=True))
    assert not shown["5–9"]
    assert shown["60–64"]


def canonical(session: Session, address: str) -> str:
    items = [(part.partition("=")[0], part.partition("=")[2]) for part in address.split("&")]
    known = heading(session, "isle", 2)
    return completed(session, known, ComparisonQuestion.parse(items)).canonical()


REST = "of=e0&figures=released&settings=almanac-1"


@pytest.mark.parametrize(
    ("address", "expected"),
    [
        # as an address without the new keys always was
        ("this=a.f.2014&that=b.f.2014", f"this=a.f.2014&that=b.f.2014&{REST}"),
        ("this=a.f.2014&that=b.f.2014&overlap=shared", f"this=a.f.2014&that=b.f.2014&{REST}"),
        (
            "overlap=rest&this=a.f.2014&that=b.f.2014",
            "this=a.f.2014&that=b.f.2014&of=e0&overlap=rest&figures=released&settings=almanac-1",
        ),
        ("this=a.f.2014&that=b.f.2013&overlap=rest", f"this=a.f.2014&that=b.f.2013&{REST}"),
        ("this=a.f.2014&that=a.f.2014&that_edition=2", f"this=a.f.2014&that=a.f.2014&{REST}"),
        (
            "this=a.f.2014&that=a.f.2014&that_edition=1",
            f"this=a.f.2014&that=a.f.2014&that_edition=1&{REST}",
        ),
        (
            "this=a.f.2014&that=a.f.2014&that_collection=isle&that_edition=1",
            f"this=a.f.2014&that=a.f.2014&that_edition=1&{REST}",
        ),
        (
            "this=a.f.2014&that=c.f.2012&that_collection=coast&overlap=rest",
            f"this=a.f.2014&that=c.f.2012&that_collection=coast&that_edition=1&{REST}",
        ),
        (
            "this=a.f.2014&that=b.f.2014&standard=gbd2010&that_edition=&overlap=rest",
            f"this=a.f.2014&standard=gbd2010&{REST}",
        ),
        ("this=a.f.2014&that=b.f.2014&standard=", f"this=a.f.2014&that=b.f.2014&{REST}"),
    ],
)
def test_addresses_have_one_spelling(isle: Session, address: str, expected: str) -> None:
    assert canonical(isle, address) == expected
    again = canonical(isle, expected)
    assert again == expected


@pytest.mark.parametrize(
    "address",
    [
        "this=a.f.2014&that=b.f.2014&that_edition=1",  # not the same area
        "this=a.f.2014&that=a.f.2014&that_edition=one",
        "this=a.f.2014&that=a.f.2014&that_edition=0",
        "this=a.f.2014&standard=nobody",
        "this=a.f.2014&that=b.f.2014&overlap=both",
        "this=a.f.2014&that=b.f.2014&that_collection=no code",
    ],
)
def test_what_cannot_be_asked_is_refused(isle: Session, address: str) -> None:
    with pytest.raises(BadValue):
        canonical(isle, address)


@pytest.mark.parametrize(
    ("address", "error"),
    [
        ("this=north.f.2014&that=north.f.2014&that_edition=9", Missing),
        ("this=north.f.2014&that=bay.f.2012&that_collection=nowhere", Missing),
        ("this=north.f.2014&that=bay.f.2011&that_collection=coast", NotInEdition),
        ("this=north.f.2011&standard=gbd2010", NotInEdition),
    ],
)
def test_what_is_not_held_is_told(isle: Session, address: str, error: type[Exception]) -> None:
    with pytest.raises(error):
        asked(isle, address)


def test_the_other_heading_follows_what_befalls_its_edition(isle: Session) -> None:
    """It is part of the page's tag."""
    address = "this=north.f.2014&that=bay.f.2012&that_collection=coast&that_edition=1"
    items = [(part.partition("=")[0], part.partition("=")[2]) for part in address.split("&")]
    known, question = heading(isle, "isle", 2), ComparisonQuestion.parse(items)
    before = headings(isle, known, question)
    withdrawn(isle, 1, "coast")
    after = headings(isle, known, question)
    assert len(before) == len(after) == 1
    assert before != after
    assert after[0].edition.withdrawn


def test_without_another_edition_no_heading_is_asked_for(isle: Session) -> None:
    plain = ComparisonQuestion(*[PopulationYear("north", "f", "2014")] * 2)
    assert headings(isle, heading(isle, "isle", 2), plain) == ()


def test_limits_of_sums_by_the_years_lived_agree_with_the_engine(isle: Session) -> None:
    found = asked(isle, "this=north.f.2014&that=bay.f.2012&that_collection=coast")
    e0 = indicators.difference(
        indicators.find("e0"), found.this.panel, found.that.panel, find("almanac-1")
    )
    assert (found.difference["e0"].low, found.difference["e0"].high) == (e0.low, e0.high)
