"""Counts dealt out over cells: nothing is lost, each gets its due."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.ages import AgeGrid
from server.intake.cells import place_of
from server.intake.dealing import UNIT, Pool, dealt, in_units
from server.intake.schedules import Block

FINE, COARSE = AgeGrid((0, 1, 5, 10)), AgeGrid((0, 5, 10))


def block(grid: AgeGrid, places: list[int], values: list[list[float]]) -> Block:
    counts = np.array(values, float)
    return Block(
        measure="deaths",
        file="deaths.csv",
        column="deaths",
        grid=grid,
        place=np.array(places),
        provisional=np.zeros(len(places), bool),
        values=counts,
        row=np.zeros(counts.shape, np.int64),
    )


@given(
    st.lists(st.tuples(st.integers(0, 4), st.integers(0, 10**12)), min_size=1, max_size=60),
    st.lists(st.integers(0, 10**13), min_size=5, max_size=5),
)
def test_all_is_dealt_in_proportion(cells: list[tuple[int, int]], amounts: list[int]) -> None:
    bins, weights = (np.array(part, np.int64) for part in zip(*cells, strict=True))
    given_ = dealt(np.array(amounts), bins, weights)
    for which, amount in enumerate(amounts):
        own = bins == which
        together = int(weights[own].sum())
        assert given_[own].sum() == (amount if together else 0)
        if together:
            due = [amount * int(weight) / together for weight in weights[own]]
            assert np.abs(given_[own] - due).max() <= 1 + 1e-12 * amount
            assert not given_[own][weights[own] == 0].any()
    assert (given_ >= 0).all()


def test_what_rounding_takes_is_carried_to_the_next_cell() -> None:
    assert dealt(np.array([1]), np.zeros(3, int), np.array([1, 1, 1])).tolist() == [0, 1, 0]
    assert dealt(np.array([2]), np.zeros(3, int), np.array([1, 1, 1])).tolist() == [1, 0, 1]
    bins = np.array([1, 0, 1, 0])
    assert dealt(np.array([3, 5]), bins, np.array([1, 1, 4, 2])).tolist() == [1, 1, 4, 2]


def test_cells_stand_in_the_order_of_their_places_whatever_the_blocks() -> None:
    one = block(FINE, [place_of(1, 0, 2001)], [[1, 2, 3, 4]])
    two = block(COARSE, [place_of(0, 1, 2001), place_of(2, 0, 2001)], [[5, 6, 7], [8, 9, 10]])
    pool = Pool.of([one, two])
    assert pool.place.tolist() == sorted([*one.place, *two.place])
    assert (pool.units / UNIT).tolist() == [5, 6, 7, 1, 2, 3, 4, 8, 9, 10]
    assert pool.start.tolist() == [0, 5, 10, 0, 1, 5, 10, 0, 5, 10]
    assert (pool.sums(pool.units) / UNIT).tolist() == [18, 10, 27]
    lines = np.array([2, 1])
    cells, which = pool.cells(lines)
    assert (pool.units[cells] / UNIT).tolist() == [8, 9, 10, 1, 2, 3, 4]
    assert which.tolist() == [0, 0, 0, 1, 1, 1, 1]
    assert pool.infants(lines).tolist() == [False, True]
    assert (pool.grid(lines[1:]), pool.grid(lines)) == (FINE, COARSE)
    back = pool.laid_out(pool.units)
    assert [(part / UNIT).tolist() for part in back] == [[[1, 2, 3, 4]], [[5, 6, 7], [8, 9, 10]]]


def test_an_empty_pool_deals_nothing() -> None:
    pool = Pool.of([])
    assert pool.laid_out(pool.units) == []
    assert not len(pool.cells(np.zeros(0, np.int64))[0])
    assert not len(dealt(np.zeros(0, np.int64), pool.place, pool.units))


@pytest.mark.parametrize("count", [0.1, 2 / 3, 1e9 + 0.000001, 123_456_789.654321])
def test_millionths_are_whole(count: float) -> None:
    units = in_units(np.array([round(count, 6)]))
    assert units[0] / UNIT == round(count, 6)
