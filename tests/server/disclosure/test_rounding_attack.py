"""The attack on rounded counts in short; `python -m tests.studies.rounding_attack` takes every page
of many countries."""

from collections.abc import Iterator

import numpy as np
import pytest
from starlette.testclient import TestClient

from server.disclosure.rounding import Rounding
from server.results.questions import PopulationYear, PopulationYearQuestion
from server.store.connect import Session
from server.store.records import Terms
from tests.studies.attack import YEAR, country, harvest, shown
from tests.studies.rounding_attack import EDITIONS, attack, beyond, numbers, solved

BASE = 3


@pytest.fixture(scope="module")
def isle() -> Iterator[tuple[Session, TestClient]]:
    with country(3, terms=Terms(base=BASE)) as (session, reader):
        yield session, reader


def test_every_count_may_be_as_many_as_the_base(isle: tuple[Session, TestClient]) -> None:
    session, _reader = isle
    found = attack(session, shown(session, EDITIONS), BASE)
    assert found.counts == 80
    assert not found.narrow
    assert not found.beyond
    assert found.fewest == BASE


def test_pages_tell_rounded_numbers_and_their_sums(isle: tuple[Session, TestClient]) -> None:
    session, reader = isle
    asked = [
        PopulationYearQuestion(PopulationYear(area, sex, YEAR))
        for area, sex in (("cape", "f"), ("whole", "p"))
    ]
    told = harvest(reader, (2,), asked)
    assert len(told) > 10
    shows = [numbers(session, edition, "released") for edition in EDITIONS]
    assert not beyond(told, shows)
    cell, (low, high) = next(iter(told.items()))
    off = {cell: (low + 1, high + 1)}
    assert beyond(off, shows) == ((*cell, low + 1, high + 1, low),)


def test_a_shift_drawn_anew_in_each_edition_would_tell() -> None:
    """So the attack can find something: some counts, moved by a known number, are left with fewer
    than the base."""
    cells = [("cape", "f", age) for age in range(60)]
    truth = [{cell: float(4 + age % 7) for age, cell in enumerate(cells)}]
    truth.append({cell: number + 1 for cell, number in truth[0].items()})

    def shows(secrets: str) -> list[dict[tuple[str, str, int], float]]:
        names = [str(age) for age in range(60)]
        return [
            dict(
                zip(
                    cells,
                    Rounding(BASE, secret).shown(np.array(list(one.values())), names),
                    strict=True,
                )
            )
            for one, secret in zip(truth, secrets, strict=True)
        ]

    assert not solved(truth, shows("aa"), {}, BASE).narrow
    with pytest.raises(AssertionError, match="contradicts itself"):
        solved(truth, shows("ab"), {}, BASE)
