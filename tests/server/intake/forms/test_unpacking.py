"""Packed files, unpacked within bounds."""

import tracemalloc
from gzip import compress

import pytest

from server.intake.forms.unpacking import unpacked

CONTENT = bytes(range(256)) * 4_000


def test_what_is_packed_comes_back() -> None:
    assert unpacked(CONTENT).content == CONTENT
    for packed in (compress(CONTENT), compress(CONTENT[:99]) + compress(CONTENT[99:])):
        found = unpacked(packed)
        assert (found.content, found.packed, found.found) == (CONTENT, True, ())


@pytest.mark.parametrize("cut", [3, 12, 400, -9, -1])
def test_a_damaged_package_is_told(cut: int) -> None:
    (found,) = unpacked(compress(CONTENT)[:cut]).found
    assert found.key == "broken_package"


def test_a_spoilt_byte_is_told() -> None:
    packed = bytearray(compress(CONTENT))
    packed[-6] ^= 1  # of the sum that proves the content
    assert unpacked(bytes(packed)).found[0].key == "broken_package"


def test_nothing_beyond_the_bound_is_unpacked() -> None:
    """However much a package would grow to, not much more than the bound is held."""
    bomb = compress(b"0" * 60_000_000)
    assert unpacked(compress(b"0" * 1_000_000), most=1_000_000).found == ()
    tracemalloc.start()
    (found,) = unpacked(bomb, most=1_000_000).found
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert found.key == "package_too_large"
    assert found.fault.values == {"packed": len(bomb), "most": 1_000_000}
    assert peak < 10_000_000


def test_a_package_in_a_package_is_refused() -> None:
    assert unpacked(compress(compress(CONTENT))).found[0].key == "package_in_package"
