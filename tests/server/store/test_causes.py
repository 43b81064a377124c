"""Cause lists: content of an edition, in the order they were handed in, under their labels."""

from collections.abc import Callable
from contextlib import AbstractContextManager
from dataclasses import replace

import pytest
from sqlalchemy.orm import Session

from server.store import areas, breaks, causes, digests, editions, schedules
from server.store.causes import in_tree_order, leaves, lineages
from server.store.connect import transaction
from server.store.content_lists import lists
from server.store.errors import Refused
from server.store.heading import heading
from server.store.records import Area, Break, Cause, Change, Edition, Key
from tests.factories import BASIS, NOON, cells, stored_collection, stored_edition

Counting = Callable[[], AbstractContextManager[list[str]]]
LIST = (
    Cause("z-body", "Of the body", ranges=("A00-R99", "U07"), kind="natural"),
    Cause("heart", "Heart", "z-body", ("I00-I99",)),
    Cause("breast", "Breast", "z-body", sex="f"),
    Cause("harm", "Harm", kind="external", care="suicide"),
)


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


def listed(session: Session, *causes: Cause, ended: frozenset[str] = frozenset()) -> Edition:
    standing = editions.newest_standing(session, "saltmarsh")
    base = standing.number if standing else 0
    change = Change("saltmarsh", base, cells(), (), BASIS, causes=causes, ended_causes=ended)
    prepared = editions.prepare(session, change)
    with transaction(session):
        return editions.write(session, prepared, by="a tester", note="", at=NOON)


def test_a_list_is_read_as_it_was_handed_in_in_one_statement(
    session: Session, count_statements: Counting
) -> None:
    listed(session, *LIST)
    with count_statements() as statements:
        assert causes.listing(session, "saltmarsh", 1) == LIST
    assert len(statements) == 1


def test_an_edition_keeps_its_list(session: Session) -> None:
    listed(session, *LIST)
    listed(session, replace(LIST[1], parent=""), ended=frozenset({"harm"}))
    assert causes.listing(session, "saltmarsh", 1)[1].parent == "z-body"
    found = causes.listing(session, "saltmarsh", 2)
    assert {cause.code: cause.parent for cause in found} == {
        "heart": "",
        "z-body": "",
        "breast": "z-body",
    }


def test_labels_and_order_are_presentation(session: Session) -> None:
    first = listed(session, *LIST)
    named = [replace(cause, label=f"{cause.label}!") for cause in LIST[::-1]]
    again = listed(session, *named)
    assert again.digest == first.digest
    found = causes.listing(session, "saltmarsh", 1)
    assert [cause.label for cause in found] == ["Harm!", "Of the body!", "Breast!", "Heart!"]
    listed(session, *(replace(cause, label="") for cause in named))
    assert causes.listing(session, "saltmarsh", 3) == found


def test_an_edition_without_causes_has_the_hash_it_had(session: Session) -> None:
    """A list is a digest more among those that are hashed, and none is none."""
    plain = stored_edition(session, cells())
    parts = [digests.of_schedule(key, cell) for key, cell in cells().items()]
    places = [digests.of_area(Area("a", ""))]
    assert plain.digest == digests.of_edition([*parts, *places, digests.of_basis(BASIS)])
    with_list = listed(session, *LIST)
    of_causes = map(digests.of_cause, LIST)
    assert with_list.digest == digests.of_edition(
        [*parts, *places, digests.of_basis(BASIS), *of_causes]
    )


def test_every_field_but_the_label_counts() -> None:
    cause = LIST[1]
    others = (
        replace(cause, code="h"),
        replace(cause, parent=""),
        replace(cause, ranges=("I00", "I99")),
        replace(cause, kind="external"),
        replace(cause, care="violence"),
        replace(cause, sex="m"),
    )
    found = {digests.of_cause(one) for one in (cause, *others)}
    assert len(found) == 7
    assert digests.of_cause(replace(cause, label="Hearts")) in found


def test_the_heading_says_whether_there_is_a_list_in_its_one_statement(
    session: Session, count_statements: Counting
) -> None:
    stored_edition(session, cells())
    listed(session, *LIST)
    with count_statements() as statements:
        assert not heading(session, "saltmarsh", 1).causes
        assert heading(session, "saltmarsh", 2).causes
    assert len(statements) == 2


def test_what_an_edition_holds_is_told_by_deaths_of_all_causes(session: Session) -> None:
    plain = stored_edition(session, cells("a"))
    held = schedules.contents(session, "saltmarsh", plain.number)
    handed = cells("a", status="provisional")
    stored_edition(session, {key._replace(cause="heart"): cell for key, cell in handed.items()})
    found = schedules.contents(session, "saltmarsh", 2)
    assert (found.status, found.measures) == (held.status, held.measures)
    assert Key("a", "f", "2001", "deaths", "heart") in schedules.held(session, "saltmarsh", 2)


def test_a_list_is_a_tree() -> None:
    assert in_tree_order([LIST[3], LIST[1], LIST[0], LIST[2]]) == (LIST[3], *LIST[:3])
    with pytest.raises(Refused, match="Cause heart is said to be part of z-body, which is not"):
        in_tree_order(LIST[1:2])
    round_ = (Cause("a", "", "b"), Cause("b", "", "a"))
    with pytest.raises(Refused, match=r"Causes a, b are part of themselves\."):
        in_tree_order((*LIST, *round_))


def test_deaths_are_counted_under_leaves_of_a_tree_of_any_depth() -> None:
    deep = (*LIST, Cause("valve", "", "heart"))
    assert [cause.code for cause in leaves(deep)] == ["breast", "harm", "valve"]
    assert lineages(deep)["valve"][-1] == "z-body"


def test_the_lists_of_an_edition_are_read_together_as_each_by_itself(
    session: Session, count_statements: Counting
) -> None:
    tree = (Area("w", "Whole", delivered=True), Area("a", "", "w"))
    told = (
        Break("", "2002", "coding", "heart", "new rules", 1.25, 0.03),
        Break("a", "2001", "shock"),
    )
    base = Change("saltmarsh", 0, cells(), tree, BASIS, breaks=told, causes=LIST)
    prepared = editions.prepare(session, base)
    with transaction(session):
        editions.write(session, prepared, by="a tester", note="", at=NOON)
    with count_statements() as statements:
        found = lists(session, "saltmarsh", 1)
    assert len(statements) == 1
    assert found.causes == causes.listing(session, "saltmarsh", 1) == LIST
    assert found.areas == areas.listing(session, "saltmarsh", 1)
    assert found.areas[0].delivered is True
    assert found.breaks == breaks.listing(session, "saltmarsh", 1) == told[::-1]
