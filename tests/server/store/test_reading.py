"""What is read of an edition: schedules, contents, areas and their names."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import pytest
from sqlalchemy.orm import Session

from engine.ages import AgeGrid
from server.store import areas, schedules
from server.store.errors import Refused
from server.store.records import Area, Key, Selection
from tests.factories import cells, stored_collection, stored_edition

Counting = Callable[[], AbstractContextManager[list[str]]]
TREE = (
    Area("w", "Whole"),
    Area("b", "South", "w"),
    Area("a", "North", "w"),
    Area("a2", "", "a"),
    Area("a1", "Far north", "a"),
)


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


@pytest.mark.parametrize(
    ("asked", "expected"),
    [
        (Selection(), 24),
        (Selection(areas=("a",)), 8),
        (Selection(areas=("a", "b"), sexes=("f",)), 8),
        (Selection(periods=("2002",), measures=("deaths",)), 6),
        (Selection(areas=("nowhere",)), 0),
        (Selection(areas=()), 0),
        (Selection(cause="C50"), 0),
        (Selection(cause=None), 24),
    ],
)
def test_a_selection_is_loaded_in_one_statement(
    session: Session, count_statements: Counting, asked: Selection, expected: int
) -> None:
    stored_edition(session, cells("abc", years=(2001, 2002)))
    with count_statements() as statements:
        loaded = schedules.load(session, "saltmarsh", 1, asked)
    assert len(statements) == 1
    assert len(loaded) == expected
    assert list(loaded) == sorted(loaded)


def test_grids_differ_within_an_edition(session: Session) -> None:
    coarse, fine = AgeGrid((0, 5, 85)), AgeGrid(tuple(range(101)))
    stored_edition(session, cells("a", grid=coarse) | cells("b", grid=fine))
    loaded = schedules.load(session, "saltmarsh", 1)
    assert {key.area: cell.grid for key, cell in loaded.items()} == {"a": coarse, "b": fine}


def test_codes_are_sorted_by_code_point_on_either_database(session: Session) -> None:
    stored_edition(session, cells(["b", "B", "a-1", "a.1", "a_1", "A"]))
    expected = ("A", "B", "a-1", "a.1", "a_1", "b")
    assert schedules.contents(session, "saltmarsh", 1).areas == expected
    assert tuple(area.code for area in areas.listing(session, "saltmarsh", 1)) == expected


def test_contents_tell_what_there_is(session: Session, count_statements: Counting) -> None:
    handed = cells("ab", years=(2001,)) | cells("a", years=(2002,), status="provisional")
    births = cells("b", sexes="p", measures=("births",), status="provisional")
    stored_edition(session, handed | births)
    with count_statements() as statements:
        found = schedules.contents(session, "saltmarsh", 1)
    assert len(statements) == 1
    assert found.areas == ("a", "b")
    assert found.sexes == ("f", "m", "p")
    assert found.periods == ("2001", "2002")
    assert found.measures == ("births", "deaths", "person_years")
    assert found.status["a", "m", "2001"] == "final"
    assert found.status["a", "f", "2002"] == "provisional"
    assert found.status["b", "p", "2001"] == "provisional"
    assert len(found.status) == 7


def test_one_provisional_measure_makes_its_population_year_provisional(session: Session) -> None:
    final = cells(sexes="f", measures=("deaths",))
    provisional = cells(sexes="f", measures=("person_years",), status="provisional")
    stored_edition(session, final | provisional)
    assert schedules.contents(session, "saltmarsh", 1).status == {("a", "f", "2001"): "provisional"}


def test_areas_come_as_a_tree_in_one_statement(
    session: Session, count_statements: Counting
) -> None:
    stored_edition(session, cells(["a1", "b"]), areas=TREE)
    with count_statements() as statements:
        listed = areas.listing(session, "saltmarsh", 1)
    assert len(statements) == 1
    assert [(area.code, area.name) for area in listed] == [
        ("w", "Whole"),
        ("a", "North"),
        ("a1", "Far north"),
        ("a2", "a2"),
        ("b", "South"),
    ]


def test_a_new_name_is_not_new_content(session: Session) -> None:
    first = stored_edition(session, cells("a"), areas=[Area("a", "North")])
    second = stored_edition(session, cells("a"), areas=[Area("a", "The North")])
    third = stored_edition(session, cells("a"), areas=[Area("a", "")])
    assert first.digest == second.digest == third.digest
    for number in (1, 2, 3):
        assert areas.listing(session, "saltmarsh", number) == (Area("a", "The North"),)


@pytest.mark.parametrize(
    ("listed", "message"),
    [
        ([Area("a", "", "w")], "Area a is said to be part of w, which is not among the areas"),
        (
            [Area("w", ""), Area("a", "", "b"), Area("b", "", "a")],
            "Areas a, b lie inside themselves",
        ),
        ([Area("a", "", "a")], "Areas a lie inside themselves"),
    ],
)
def test_areas_that_form_no_tree_are_refused(listed: list[Area], message: str) -> None:
    with pytest.raises(Refused, match=message):
        areas.in_tree_order(listed)


def test_a_key_is_read_by_its_names(session: Session) -> None:
    stored_edition(session, cells("a", sexes="f", measures=("deaths",)))
    assert list(schedules.load(session, "saltmarsh", 1)) == [Key("a", "f", "2001", "deaths")]
