"""Coarser ages for areas with few people."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

from engine.ages import AgeGrid
from server.store.records import Area, Key, Terms, Vector

Cells = Mapping[Key, Vector]


def coarsened(areas: Iterable[Area], cells: Cells, terms: Terms) -> Cells:
    """Counts of areas with few people on five-year groups, and of all other parts of their wholes:
    what a whole has more than its other parts would tell them. Everything else as it is."""
    if not terms.coarse_below:
        return cells
    people: dict[tuple[str, str], float] = {}
    for key, vector in cells.items():
        if key.measure == "person_years":
            place = (key.area, key.period)
            most = float(vector.values.sum())
            people[place] = max(people.get(place, 0.0), most if key.sex == "p" else 2 * most)
    parts = _parts(areas)
    whole_of = {one: whole for whole, inside in parts.items() for one in inside}
    coarse: set[tuple[str, str]] = set()
    for (area, period), lived in people.items():
        if lived < terms.coarse_below:
            top = whole_of.get(area) or area
            coarse |= {(one, period) for one in (area, *_all_parts(parts, top))}
    out = dict(cells)
    for key, vector in cells.items():
        if (key.area, key.period) in coarse:
            starts = tuple(s for s in vector.grid.starts if s in (0, 1) or s % 5 == 0)
            grid = AgeGrid(starts)
            out[key] = replace(vector, grid=grid, values=vector.grid.regroup(vector.values, grid))
    return out


def _parts(areas: Iterable[Area]) -> dict[str, list[str]]:
    found: dict[str, list[str]] = {}
    for one in areas:
        found.setdefault(one.parent, []).append(one.code)
    return found


def _all_parts(parts: Mapping[str, Sequence[str]], whole: str) -> list[str]:
    """Parts of a whole, their parts, and so on."""
    return [one for part in parts.get(whole, ()) for one in (part, *_all_parts(parts, part))]
