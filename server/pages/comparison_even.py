"""Longer or more even: what early and late deaths add to both, and the two signs of every age."""

import numpy as np

from server.exports.table import Cell, Column, Row, Table
from server.pages.cells import columns, number
from server.pages.comparison_contributions import Printed, printed
from server.results.compared import Comparison
from server.results.explaining import DECOMPOSED, Halves
from server.sentences import longer_even as say
from server.sentences.pieces import Sentence
from server.sentences.text import _


def sentence(found: Comparison) -> Sentence:
    of = found.explained.longer_even
    if of is None or found.same:
        return ()
    early, late = (
        say.Half(_part(found, "e0", of.longer, at), _part(found, "H", of.even, at)) for at in (0, 1)
    )
    if found.kind == "revision" and not any(
        part.sign for half in (early, late) for part in (half.longer, half.even)
    ):
        return ()
    return say.told(early, late, of.age)


def _part(found: Comparison, key: str, halves: Halves, at: int) -> say.Part:
    one = printed(key)
    value, low, high = (
        one.scale * float(part[at]) for part in (halves.values, halves.low, halves.high)
    )
    return say.Part(value, low, high, one.decimals, exact=found.kind == "revision")


def table(found: Comparison) -> Table | None:
    """Early and late deaths, then the ages of each pair of signs; both lists add up to the
    differences but for the remainder."""
    of = found.explained.longer_even
    if of is None or found.same:
        return None
    one, other = printed("e0"), printed("H")
    heads = (
        Column("deaths", _("deaths")),
        *columns("e0", one.label, one.decimals, unit=one.unit, signed=True),
        *columns("H", other.label, other.decimals, unit=other.unit, signed=True),
    )
    rows = [
        Row((words, *_cells(one, of.longer, at), *_cells(other, of.even, at)))
        for at, words in enumerate((_("before {age}", age=of.age), _("from {age} on", age=of.age)))
    ]
    rows += _signs(found)
    return Table(
        "longer",
        _("Longer or more even: early and late deaths, and the two signs of every age"),
        heads,
        tuple(rows),
        say.threshold(*of.thresholds, of.age),
    )


def _cells(of: Printed, halves: Halves, at: int) -> list[Cell]:
    parts = (halves.values, halves.low, halves.high)
    return [number(of.scale * float(part[at])) for part in parts]


SIGNS = ((1, -1), (1, 1), (-1, 1), (-1, -1))


def _signs(found: Comparison) -> list[Row]:
    """Sums over the ages that move both in the same pair of directions, as they came out."""
    words = {
        (1, -1): _("of ages that make lives longer and more even"),
        (1, 1): _("of ages that make lives longer and less even"),
        (-1, 1): _("of ages that make lives shorter and less even"),
        (-1, -1): _("of ages that make lives shorter and more even"),
    }
    parts = [found.explained.contributions[key].by_group for key in DECOMPOSED]
    none = number(np.nan, _("a sum over ages chosen by their signs, hence no interval"))
    rows = []
    for signs in SIGNS:
        some = (np.sign(parts[0]) == signs[0]) & (np.sign(parts[1]) == signs[1])
        if some.any():
            sums = [
                printed(key).scale * float(part[some].sum())
                for key, part in zip(DECOMPOSED, parts, strict=True)
            ]
            ages = [label for label, so in zip(found.groups.labels, some, strict=True) if so]
            cells = (words[signs], sums[0], none, none, sums[1], none, none)
            rows.append(Row(cells, second=_runs(found, some) or ", ".join(ages)))
    return rows


def _runs(found: Comparison, some: np.ndarray) -> str:
    """Neighbouring groups told as one span of ages."""
    starts, labels, runs = found.groups.starts, found.groups.labels, []
    at = 0
    while at < len(some):
        end = at
        while end + 1 < len(some) and some[end] and some[end + 1]:
            end += 1
        if some[at]:
            last = end == len(some) - 1
            one = (
                labels[at]
                if end == at
                else f"{starts[at]}–{starts[end + 1] - 1}"
                if not last
                else ""
            )
            runs.append(one or _("{first} and over", first=starts[at]))
        at = end + 1
    return ", ".join(runs)
