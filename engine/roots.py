"""Where a function of one number passes 0, for many populations at once."""

from collections.abc import Callable

import numpy as np

from engine.ages import Array

STEPS = 60


def false_position(
    left: Callable[[Array], Array],
    low: Array,
    high: Array,
    *,
    at_low: Array,
    at_high: Array,
    close: Array,
) -> Array:
    """A place between `low` and `high` at which `left` is within `close` of 0, by false position,
    the end that stays a second time counted half (Illinois).

    Shape:   all [...], `left` gives a number for each of its places.
    Missing: nan where the two ends are not of unlike sign, or no place was found.
    Source:  Dowell & Jarratt (1971), BIT 11, 168-174 (the Illinois variant).
    >>> ends = {"at_low": np.array([-2.0]), "at_high": np.array([2.0])}
    >>> false_position(lambda x: x**2 - 2, np.array([0.0]), np.array([2.0]), close=1e-12, **ends)
    array([1.41421356])
    """
    with np.errstate(all="ignore"):
        found = np.where(at_low == 0, low, np.where(at_high == 0, high, np.nan))
        searching = at_low * at_high < 0
        below, above = at_low, at_high
        for _ in range(STEPS):
            if not searching.any():
                break
            place = np.where(searching, (low * above - high * below) / (above - below), high)
            here = left(place)
            met = searching & (np.abs(here) < close)
            found, searching = np.where(met, place, found), searching & ~met
            with_low = here * below > 0
            low, high = np.where(with_low, place, low), np.where(with_low, high, place)
            below, above = (
                np.where(with_low, here, below / 2),
                np.where(with_low, above / 2, here),
            )
    return np.asarray(found)
