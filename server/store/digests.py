"""Canonical bytes and digests: two contents are the same exactly where their digests are.

A digest covers codes, status, age starts and numbers, never row ids, dates, people or names.
"""

import hashlib
import json
from collections.abc import Iterable, Mapping
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from engine.ages import AgeGrid, Array
from server.store.records import Area, Basis, Break, Cause, Key, Vector

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


class Packed(NamedTuple):
    """A schedule as it is stored."""

    digest: bytes  # 32 bytes
    vector: bytes  # '<f8'


def packed(cells: Mapping[Key, Vector]) -> dict[Key, Packed]:
    """Many schedules at once: those of one grid are made canonical together."""
    found: dict[Key, Packed] = {}
    for grid, keys in by_grid(cells).items():
        numbers = np.array([cells[key].values for key in keys], "<f8")
        if numbers.shape != (len(keys), len(grid)):
            raise ValueError(f"vectors on {len(grid)} age groups have the shape {numbers.shape}")
        content, width = _canonical(numbers).tobytes(), 8 * len(grid)
        code = starts(grid)
        for place, key in enumerate(keys):
            vector = content[place * width : (place + 1) * width]
            cell = cells[key]
            digest = _of_schedule(key, cell.status, code, cell.estimated, vector)
            found[key] = Packed(digest, vector)
    return found


def by_grid(cells: Mapping[Key, Vector]) -> dict[AgeGrid, list[Key]]:
    """Keys by the grids of their schedules, most of which share the very object: to tell that is
    quicker than to compare the ages."""
    same: dict[int, list[Key]] = {}
    for key, cell in cells.items():
        same.setdefault(id(cell.grid), []).append(key)
    found: dict[AgeGrid, list[Key]] = {}
    for keys in same.values():
        found.setdefault(cells[keys[0]].grid, []).extend(keys)
    return found


def of_schedule(key: Key, vector: Vector) -> bytes:
    """Digest of one schedule, 32 bytes."""
    tail = canonical(vector.values).tobytes()
    return _of_schedule(key, vector.status, starts(vector.grid), vector.estimated, tail)


def _of_schedule(key: Key, status: str, grid: str, estimated: bool, tail: bytes) -> bytes:
    area, sex, period, measure, cause = key
    end = _what(measure, cause, status, grid, estimated)
    return _hashed(f'"schedule", {_quoted(area)}, {_quoted(sex)}, {_quoted(period)}, {end}', tail)


@lru_cache(maxsize=4096)
def _what(measure: str, cause: str, status: str, grid: str, estimated: bool) -> str:
    """The end of the words of a schedule, which thousands share."""
    return _words(measure, cause, status, grid, *(("estimated",) if estimated else ()))


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


def of_cause(cause: Cause) -> bytes:
    return _digest(
        "cause", cause.code, cause.parent, cause.kind, cause.care, cause.sex, *cause.ranges
    )


def of_edition(parts: Iterable[bytes]) -> str:
    """Content hash of an edition from the digests of all that holds in it, in any order."""
    return hashlib.sha256(b"".join(sorted(parts))).hexdigest()


def _digest(*words: str) -> bytes:
    return _hashed(_words(*words), b"")


def _hashed(words: str, tail: bytes) -> bytes:
    # a list in JSON keeps the words apart whatever stands in them, and has no zero byte
    return hashlib.sha256(b"[%b]\0%b" % (words.encode(), tail)).digest()


def _words(*words: str) -> str:
    return ", ".join(map(_quoted, words))


@lru_cache(maxsize=4096)
def _quoted(word: str) -> str:
    return json.dumps(word, ensure_ascii=False)
