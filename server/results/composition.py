"""Counts of one edition under the areas of another: codes that were merged or shared out since, and
wholes that are the sum of other parts."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import reduce

import numpy as np

from engine.ages import AgeGrid
from server.intake.layout import layout
from server.intake.lists import small_table
from server.intake.mapping import Mapping as Columns
from server.intake.successions import Successions, read_lines, successions
from server.store import changes, digests, uploads
from server.store.connect import Session
from server.store.records import Area, Key, Vector

Cells = Mapping[Key, Vector]


def since(session: Session, collection: str, then: int, now: int) -> tuple[Successions, ...]:
    """What became of codes in the editions between the two, the earliest first; nothing where the
    later one was not built on the earlier. Two statements."""
    line = changes.lineage(session, collection, now)
    if then not in line:
        return ()
    between = line[: line.index(then)]
    tables = uploads.contents_of_editions(session, collection, "areas", between)
    found = []
    for number in sorted(tables):
        file, content = tables[number]
        form = Columns.from_json(file.mapping).form if file.mapping else None
        laid = layout(content, file.name, form)
        found.append(successions(read_lines(small_table(laid, "areas"))))
    return tuple(found)


def parts_of(tree: Iterable[Area], code: str) -> tuple[str, ...]:
    """The areas whose counts make up this one: itself where it has no parts or is delivered."""
    listed = tuple(tree)
    own = next((area for area in listed if area.code == code), None)
    inside = [area.code for area in listed if area.parent == code]
    if own is None or own.delivered or not inside:
        return (code,)
    return tuple(sorted(part for one in inside for part in parts_of(listed, one)))


@dataclass(frozen=True, slots=True)
class Composition:
    """How an area is made up in two editions."""

    then: tuple[str, ...]
    now: tuple[str, ...]
    became: tuple[Successions, ...]

    def differs(self, periods: Iterable[str]) -> bool:
        """Whether an area of the later edition is made of other codes than before."""
        sources = {one for code in self.now for period in periods for one in self.of(code, period)}
        return set(self.then) != set(self.now) or sources != set(self.now)

    def of(self, code: str, period: str) -> set[str]:
        """Codes of the earlier edition whose counts of a year go into this one."""
        found = {code}
        for said in reversed(self.became):
            before = {one for area in found for one in said.before(area, period)}
            kept = {area for area in found if not said.find(area, period)}
            found = before | kept
        return found

    def codes(self, periods: Iterable[str]) -> tuple[str, ...]:
        """Every code of either edition that counts are needed of."""
        found = {one for code in self.now for period in periods for one in self.of(code, period)}
        return tuple(sorted({*found, *self.then, *self.now}))

    def earlier_as_now(self, cells: Cells, area: str) -> dict[Key, Vector]:
        """Counts of the earlier edition of the area as it is made up now."""
        return _summed(self._recoded(cells), self.now, area)

    def later_as_then(self, cells: Cells, area: str) -> dict[Key, Vector]:
        """Counts of the later edition of the area as it was made up before; none of codes that
        hold others' counts since, which cannot be taken out again."""
        pure = {
            key: cell for key, cell in cells.items() if self.of(key.area, key.period) == {key.area}
        }
        return _summed(pure, self.then, area)

    def _recoded(self, cells: Cells) -> dict[Key, Vector]:
        found = dict(cells)
        for said in self.became:
            found = _recoded(found, said)
        return found


def _recoded(cells: Cells, said: Successions) -> dict[Key, Vector]:
    """Women's and men's counts under the codes that theirs became; persons are summed anew."""
    parts: dict[Key, list[Vector]] = {}
    for key, cell in cells.items():
        one = said.find(key.area, key.period)
        if one is None:
            parts.setdefault(key, []).append(cell)
            continue
        for share in one.shares_of(key):
            at = np.searchsorted(share.grid.starts, cell.grid.starts, side="right") - 1
            part = cell.values * np.array(share.values)[at]
            new = key._replace(area=share.becomes)
            parts.setdefault(new, []).append(replace(cell, values=part))
    return {key: _total(found) for key, found in parts.items()}


def _summed(cells: Cells, codes: Sequence[str], area: str) -> dict[Key, Vector]:
    """The area as the sum of these codes, of what all of them hold."""
    found: dict[Key, list[Vector]] = {}
    for key in cells:
        if key.area == codes[0]:
            several = [cells.get(key._replace(area=code)) for code in codes]
            held = [one for one in several if one is not None]
            if len(held) == len(codes):
                found[key._replace(area=area)] = held
    return {key: _total(several) for key, several in found.items()}


def _total(cells: Sequence[Vector]) -> Vector:
    grid = reduce(AgeGrid.common, (cell.grid for cell in cells))
    values = sum(cell.grid.regroup(cell.values, grid) for cell in cells)
    return replace(cells[0], grid=grid, values=digests.canonical(np.asarray(values)))
