"""Headings of one row or several."""

from collections.abc import Sequence


def joined(rows: Sequence[tuple[str, ...]]) -> tuple[str, ...]:
    """Names of the columns: the rows of the heading from above, joined by a blank. What stands in
    an upper row holds to the right until the next one, as a merged cell would.

    >>> joined([("", "Deaths", "", "People", ""), ("age", "men", "women", "men", "women")])
    ('age', 'Deaths men', 'Deaths women', 'People men', 'People women')
    """
    width = max((len(row) for row in rows), default=0)
    whole = [tuple(map(_plain, row)) + ("",) * (width - len(row)) for row in rows]
    parts = [_carried(row) for row in whole[:-1]] + whole[-1:]
    return tuple(" ".join(filter(None, column)) for column in zip(*parts, strict=True))


def _plain(text: str) -> str:
    return " ".join(text.split())


def _carried(row: tuple[str, ...]) -> tuple[str, ...]:
    found, last = [], ""
    for text in row:
        last = text or last
        found.append(last)
    return tuple(found)
