"""The same content has the same digest, another content another."""

import hashlib
import json
import struct
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.ages import AgeGrid
from server.store import digests
from server.store.records import Area, Key, Vector
from tests.factories import BASIS

KEY = Key("north", "f", "2014", "deaths")
GRID = AgeGrid((0, 1, 5))
COUNTS = st.floats(allow_infinity=False) | st.floats(-1e12, 1e12)


def _of(*values: float, status: str = "final", key: Key = KEY, grid: AgeGrid = GRID) -> bytes:
    return digests.of_schedule(key, Vector(status, grid, np.array(values)))


@given(values=st.lists(COUNTS, min_size=1, max_size=5))
def test_the_canonical_spelling_of_numbers_is_its_own(values: list[float]) -> None:
    """Totals are summed and written again: a second rounding must change no bit."""
    once = digests.canonical(np.array(values))
    assert digests.canonical(once).tobytes() == once.tobytes()


def test_counts_that_round_alike_are_the_same() -> None:
    assert _of(1.0, 2.0000001, 3.0) == _of(1.0, 2.0, 3.0)
    assert _of(1.0, 2.000001, 3.0) != _of(1.0, 2.0, 3.0)


def test_there_is_one_zero_and_one_nan() -> None:
    other_nan = np.frombuffer(b"\x01\x00\x00\x00\x00\x00\xf8\xff", "<f8")[0]
    assert np.isnan(other_nan)
    assert _of(0.0, np.nan, 1.0) == _of(-0.0, other_nan, 1.0) == _of(-1e-9, -np.nan, 1.0)
    assert _of(0.0, np.nan, 1.0) != _of(0.0, 0.0, 1.0)


def test_the_layout_in_memory_does_not_matter() -> None:
    wide = np.array([[1.0, 9.0], [2.0, 9.0], [3.0, 9.0]])
    swapped = np.array([1.0, 2.0, 3.0], ">f8")
    plain = Vector("final", GRID, np.array([1.0, 2.0, 3.0]))
    for values in (wide[:, 0], swapped):
        assert digests.of_schedule(KEY, replace(plain, values=values)) == _of(1.0, 2.0, 3.0)


def test_every_code_the_status_and_the_ages_are_covered() -> None:
    several = [
        _of(1.0, 2.0, 3.0),
        _of(1.0, 2.0, 3.0, status="provisional"),
        _of(1.0, 2.0, 3.0, grid=AgeGrid((0, 1, 6))),
        *(
            _of(1.0, 2.0, 3.0, key=KEY._replace(**{name: "x"}))
            for name in ("area", "sex", "period", "measure", "cause")
        ),
        _of(1.0, 3.0, 2.0),
    ]
    assert len(set(several)) == len(several)


def test_words_cannot_run_into_each_other() -> None:
    assert _of(1.0, 1.0, 1.0, key=Key("a\x1fb", "c", "1", "d")) != _of(
        1.0, 1.0, 1.0, key=Key("a", "b\x1fc", "1", "d")
    )
    assert digests.of_area(Area("a", "", 'b", "c')) != digests.of_area(Area('a", "b', "", "c"))


def test_a_name_is_no_content_but_place_and_delivery_are() -> None:
    area = Area("a", "North", "w")
    assert digests.of_area(area) == digests.of_area(replace(area, name="The North"))
    assert digests.of_area(area) != digests.of_area(replace(area, parent=""))
    assert digests.of_area(area) != digests.of_area(replace(area, delivered=True))


def test_every_word_of_the_basis_is_content() -> None:
    others = {digests.of_basis(replace(BASIS, **{name: "x"})) for name in BASIS.__slots__}
    assert len(others | {digests.of_basis(BASIS)}) == 7


def test_an_edition_does_not_depend_on_the_order_of_its_parts() -> None:
    one, two, three = (_of(float(n), 0.0, 0.0) for n in range(3))
    assert digests.of_edition([one, two, three]) == digests.of_edition([three, one, two])
    assert digests.of_edition([one, two]) != digests.of_edition([one, three])


def test_what_is_no_vector_of_counts_is_refused() -> None:
    with pytest.raises(ValueError, match="a count is infinite"):
        digests.canonical(np.array([1.0, np.inf]))
    with pytest.raises(ValueError, match=r"the axis age only; found the shape \(1, 2\)"):
        digests.canonical(np.array([[1.0, 2.0]]))


def test_many_are_packed_as_each_alone_is_whatever_grid_object_they_have() -> None:
    keys = [KEY._replace(period=str(year)) for year in range(2000, 2006)]
    cells = {
        key: Vector(
            "provisional" if at % 2 else "final",
            AgeGrid((0, 1, 5) if at < 4 else (0, 5, 10)),
            np.array([1.0, 0.5, at]),
            estimated=at == 3,
        )
        for at, key in enumerate(keys)
    }
    packed = digests.packed(cells)
    assert packed.keys() == cells.keys()
    for key, cell in cells.items():
        words = ["schedule", *key, cell.status, cell.grid.code]
        head = json.dumps(words + ["estimated"] * cell.estimated).encode()
        vector = struct.pack("<3d", *cell.values)
        assert packed[key] == (hashlib.sha256(head + b"\0" + vector).digest(), vector)
        assert packed[key].digest == digests.of_schedule(key, cell)
