"""Canonical bytes and digests: two contents are the same exactly where their digests are.

A digest covers codes, status, age starts and numbers, never row ids, dates, people or names.
"""

import hashlib
import json
from collections.abc import Iterable
from functools import lru_cache

import numpy as np

from engine.ages import AgeGrid, Array
from server.store.records import Area, Basis, Break, Key, Vector

DECIMALS = 6  # of a count: nobody delivers a millionth of a person-year
_ROUNDED_BELOW = 2.0**31  # above, a double has few decimals left and rounding twice might move it


def canonical(values: Array) -> Array:
    """The one spelling of these numbers: six decimals, one nan, 0 for -0; '<f8', [age].

    Raises: ValueError where one is infinite or there is more than one axis.
    """
    numbers = np.array(values, "<f8", ndmin=1)
    if numbers.ndim != 1:
        raise ValueError(f"a vector has the axis age only; found the shape {numbers.shape}")
    if np.isinf(numbers).any():
        raise ValueError("a count is infinite; expected a number, or nan where there is none")
    small = np.abs(numbers) < _ROUNDED_BELOW
    numbers[small] = np.round(numbers[small], DECIMALS)
    numbers[np.isnan(numbers)] = np.nan
    return numbers + 0.0  # -0.0 + 0.0 is 0.0


@lru_cache(maxsize=256)
def starts(grid: AgeGrid) -> str:
    """Code of a grid; thousands of schedules share one."""
    return grid.code


def of_schedule(key: Key, vector: Vector) -> bytes:
    """Digest of one schedule, 32 bytes."""
    codes = ("schedule", key.area, key.sex, key.period, key.measure, key.cause)
    marks = ("estimated",) if vector.estimated else ()
    tail = canonical(vector.values).tobytes()
    return _digest(*codes, vector.status, starts(vector.grid), *marks, tail=tail)


def of_area(area: Area) -> bytes:
    return _digest("area", area.code, area.parent, "delivered" if area.delivered else "summed")


def of_basis(basis: Basis) -> bytes:
    return _digest(
        "basis",
        basis.people,
        basis.dated_by,
        basis.population,
        basis.population_date,
        basis.source,
        *([basis.vintage] if basis.vintage else []),
    )


def of_break(one: Break) -> bytes:
    """Its note counts: a page that is pinned says why its line stops."""
    numbers = ("" if number is None else repr(number) for number in (one.ratio, one.ratio_error))
    return _digest("break", one.area, one.period, one.kind, one.cause, one.note, *numbers)


def of_edition(parts: Iterable[bytes]) -> str:
    """Content hash of an edition from the digests of all that holds in it, in any order."""
    return hashlib.sha256(b"".join(sorted(parts))).hexdigest()


def _digest(*words: str, tail: bytes = b"") -> bytes:
    # JSON keeps the words apart whatever stands in them, and has no zero byte
    head = json.dumps(words, ensure_ascii=False).encode()
    return hashlib.sha256(head + b"\0" + tail).digest()
