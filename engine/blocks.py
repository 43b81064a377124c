"""Work in blocks, so that memory does not grow with the batch."""

from collections.abc import Iterator

BLOCK = 4096  # life tables held in memory at once


def blocks(length: int, each: int) -> Iterator[slice]:
    """Slices of an axis of `length` places, each of which holds so many life tables.

    >>> list(blocks(3, 2000))
    [slice(0, 2, None), slice(2, 4, None)]
    """
    size = max(1, BLOCK // max(1, each))
    return (slice(first, first + size) for first in range(0, length, size))
