"""Where a function passes 0."""

import numpy as np
from numpy.testing import assert_allclose, assert_array_equal
from scipy.optimize import brentq

from engine.roots import false_position

HIGH = np.array([3.0, 3.0, 3.0, 3.0])
LOW = np.zeros(4)
AIMS = np.array([0.5, 8.0, 40.0, 0.0])


def left(place: np.ndarray) -> np.ndarray:
    return np.asarray(place**3 - AIMS[: place.size])


def found(some: slice = slice(None)) -> np.ndarray:
    low, high, aims = LOW[some], HIGH[some], AIMS[some]
    return false_position(
        lambda place: place**3 - aims,
        low,
        high,
        at_low=low**3 - aims,
        at_high=high**3 - aims,
        close=np.full(aims.shape, 1e-12),
    )


def test_it_finds_what_brent_finds_and_nothing_where_nothing_is() -> None:
    here = found()
    for row in (0, 1):
        root = brentq(lambda place, row=row: place**3 - AIMS[row], 0, 3, xtol=1e-14)
        assert_allclose(here[row], root, rtol=1e-11)
    assert np.isnan(here[2])
    assert here[3] == 0


def test_a_batch_is_its_rows() -> None:
    together = found()
    for row in range(4):
        assert_array_equal(found(slice(row, row + 1)), together[row : row + 1])
