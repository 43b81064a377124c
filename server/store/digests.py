"""Canonical bytes and digests: two contents are the same exactly where their digests are.

A digest covers codes, status, age starts and numbers, never row ids, dates, people or names.
"""

import hashlib
import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
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
    return _canonical(numbers)


def _canonical(numbers: Array) -> Array:
    """In place; any axes."""
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


@dataclass(frozen=True, slots=True)
class Packed:
    """A schedule as it is stored."""

    digest: bytes  # 32 bytes
    vector: bytes  # '<f8'


def packed(cells: Mapping[Key, Vector]) -> dict[Key, Packed]:
    """Many schedules at once: those of one grid are made canonical together."""
    by_grid: dict[AgeGrid, list[Key]] = {}
    for key, cell in cells.items():
        by_grid.setdefault(cell.grid, []).append(key)
    found: dict[Key, Packed] = {}
    for grid, keys in by_grid.items():
        numbers = np.array([cells[key].values for key in keys], "<f8")
        if numbers.shape != (len(keys), len(grid)):
            raise ValueError(f"vectors on {len(grid)} age groups have the shape {numbers.shape}")
        content, width = _canonical(numbers).tobytes(), 8 * len(grid)
        for place, key in enumerate(keys):
            vector = content[place * width : (place + 1) * width]
            found[key] = Packed(_of_schedule(key, cells[key], vector), vector)
    return found


def of_schedule(key: Key, vector: Vector) -> bytes:
    """Digest of one schedule, 32 bytes."""
    return _of_schedule(key, vector, canonical(vector.values).tobytes())


def _of_schedule(key: Key, vector: Vector, tail: bytes) -> bytes:
    codes = ("schedule", key.area, key.sex, key.period, key.measure, key.cause)
    marks = ("estimated",) if vector.estimated else ()
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
    # a list in JSON keeps the words apart whatever stands in them, and has no zero byte
    head = ", ".join(map(_quoted, words))
    return hashlib.sha256(b"[%b]\0%b" % (head.encode(), tail)).digest()


@lru_cache(maxsize=4096)
def _quoted(word: str) -> str:
    return json.dumps(word, ensure_ascii=False)
