"""The attack in short; `python -m tests.studies.attack` takes every page of many countries."""

from collections.abc import Iterator

import pytest
from starlette.testclient import TestClient

from server.results.questions import PopulationYear, PopulationYearQuestion
from server.store.connect import Session
from tests.studies.attack import YEAR, Facts, attack, country, harvest, shown

EDITIONS = (1, 2)


@pytest.fixture(scope="module")
def isle() -> Iterator[tuple[Session, TestClient, Facts]]:
    with country(3) as (session, reader):
        yield session, reader, shown(session, EDITIONS)


def test_no_withheld_count_of_two_editions_can_be_told(
    isle: tuple[Session, TestClient, Facts],
) -> None:
    session, _reader, facts = isle
    found = attack(session, facts)
    assert found.withheld > 20
    assert found.held, found


def test_one_total_too_many_is_found(isle: tuple[Session, TestClient, Facts]) -> None:
    """A single withheld count let through fixes others; the attack says which."""
    session, _reader, facts = isle
    full = shown(session, EDITIONS, figures="full")
    for cell in sorted(full.keys() - facts.keys()):
        leaked = attack(session, facts | {cell: full[cell]})
        if len(leaked.fixed) > 1:
            break
    else:
        pytest.fail("no leak was found")
    assert cell in leaked.fixed


@pytest.mark.parametrize(("area", "sex"), [("cape", "f"), ("whole", "p")])
def test_pages_tell_no_more_than_the_door_they_read_through(
    isle: tuple[Session, TestClient, Facts], area: str, sex: str
) -> None:
    _session, reader, facts = isle
    asked = [PopulationYearQuestion(PopulationYear(area, sex, YEAR))]
    told = harvest(reader, (2,), asked)
    assert len(told) > 3
    for cell, (low, high) in told.items():
        if cell in facts:
            assert low - 1e-6 <= facts[cell][0] <= high + 1e-6, cell
        else:
            assert cell[3] < 0, f"{cell} is withheld and told"
