"""Totals of sexes and areas, summed when an upload is committed."""

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, replace
from functools import reduce
from typing import TypeVar

import numpy as np

from engine.ages import AgeGrid, Array
from server.actions.cause_counts import COUNTED, DEATHS, causes_of, outdated, places
from server.store.areas import in_tree_order
from server.store.errors import Refused
from server.store.records import ALL_OF_IT, Area, Key, Taking, Vector

Cells = Mapping[Key, Vector]
Slice = tuple[str, str, str, str]  # sex, period, measure, cause: what is summed over areas
Slices = dict[Slice, Vector]
Of = TypeVar("Of", Key, Slice)
Boundaries = Mapping[str, tuple[str, ...]]
NO_BOUNDARIES: Boundaries = {}


@dataclass(frozen=True, slots=True)
class Totalled:
    cells: dict[Key, Vector]  # handed in or summed
    ended: frozenset[Key]  # sums of the base that can no longer be made
    areas: tuple[Area, ...]  # of the new edition, in tree order


def laid_over(
    new: Cells,
    areas: Iterable[Area],
    *,
    base_areas: tuple[Area, ...],
    load: Callable[[tuple[str, ...] | None], Cells],
    handed: Cells,
    taking: Taking = ALL_OF_IT,
    boundaries: Boundaries = NO_BOUNDARIES,
) -> Totalled:
    """What is new with its totals, over a base of which some gives way to what of it was `handed`
    in; `load` gives the base's schedules of some periods (None: of all). Raises: Refused, as
    `merged` and `totalled` do."""
    listed = merged(areas, base_areas)
    every_year = taking.gives_way == "areas" or bool(boundaries)
    needed = None if every_year else periods_needed(new, listed, base_areas)
    base = load(needed) if base_areas else {}
    gone = giving_way(base, handed, taking)
    kept = {key: cell for key, cell in base.items() if key not in gone}
    made = totalled(new, listed, base=kept, base_areas=base_areas, boundaries=boundaries)
    return replace(made, ended=made.ended | (gone - made.cells.keys()))


def giving_way(base: Iterable[Key], handed: Iterable[Key], taking: Taking) -> frozenset[Key]:
    """Schedules of the base that are dropped for what is taken of an upload, whether it holds the
    same ones or not."""
    periods = {key.period for key in handed}
    areas = {key.area for key in handed}
    places = {(key.area, key.period) for key in handed}
    drops: dict[str, Callable[[Key], bool]] = {
        "cells": lambda key: False,
        "handed": lambda key: (key.area, key.period) in places,
        "years": lambda key: key.period in periods,
        "areas": lambda key: key.area in areas,
        "all": lambda key: True,
    }
    return frozenset(filter(drops[taking.gives_way], base))


def merged(areas: Iterable[Area], into: Iterable[Area]) -> tuple[Area, ...]:
    """Areas of an upload laid over those of the base, in tree order.

    An upload that says nothing of an area's whole leaves it where it was, and what was declared as
    delivered stays so; only a replacing upload can take either back.
    Raises: Refused where they form no tree.
    """
    together = {area.code: area for area in into}
    for area in areas:
        before = together.get(area.code, area)
        together[area.code] = replace(
            area,
            parent=area.parent or before.parent,
            delivered=area.delivered or before.delivered,
        )
    return in_tree_order(together.values())


def periods_needed(
    handed: Cells, areas: Iterable[Area], base_areas: Iterable[Area]
) -> tuple[str, ...] | None:
    """Periods of the base that the totals rest on; None: all, since the tree has changed."""

    def tree(of: Iterable[Area]) -> set[tuple[str, str, bool]]:
        return {(area.code, area.parent, area.delivered) for area in of}

    if tree(areas) != tree(base_areas):
        return None
    return tuple(sorted({key.period for key in handed}))


def totalled(
    handed: Cells,
    areas: tuple[Area, ...],
    *,
    base: Cells,
    base_areas: tuple[Area, ...] = (),
    boundaries: Boundaries = NO_BOUNDARIES,
) -> Totalled:
    """What was handed in, laid over the base, with its totals.

    Persons are women and men together where both stand. An area that has parts and
    is not delivered is the sum of all its parts on their common age groups, or not available where
    a part is missing; what was handed in for it must agree with the sum. A sum is provisional
    or estimated where a part of it is. Deaths by cause are summed where every part has some, and a
    cause that a part lacks has no deaths there.

    `areas` are those of the new edition in tree order; `base` holds the periods needed.
    `boundaries` are the years of breaks of boundaries by area: a part whose series ends or begins
    there is not missed beyond.
    Raises: ValueError where a schedule is of no known area; Refused where persons were handed in
    beside women and men that stand, or counts for an area that has parts, is not delivered, and
    cannot be summed or is not the sum.
    """
    unknown = {key.area for key in handed} - {area.code for area in areas}
    if unknown:
        raise ValueError(f"schedules of areas that are not listed: {sorted(unknown)}")
    parts, summed = _parts(areas), _summed(areas)
    sums_before = {key for key in base if key.area in summed | _summed(base_areas)}
    own = {key: cell for key, cell in handed.items() if key.area not in summed}
    gone = sums_before | outdated(base, own)
    standing = {key: cell for key, cell in base.items() if key not in gone} | own
    made = _persons(own, standing)
    standing.update(made)
    for key in outdated(base, made):  # before wholes are made of them
        standing.pop(key, None)
    among = {part for whole in summed for part in parts[whole]}
    by_area: dict[str, dict[Slice, Vector]] = {}
    for key, cell in standing.items() if among else ():
        if key.area in among:
            by_area.setdefault(key.area, {})[_slice(key)] = cell
    for whole in reversed(areas):  # parts before their whole
        if whole.code in summed:
            own_parts = {part: by_area.get(part, {}) for part in parts[whole.code]}
            sums = by_area[whole.code] = _sums(own_parts, boundaries)
            made.update(
                (Key(whole.code, sex, period, measure, cause), cell)
                for (sex, period, measure, cause), cell in sums.items()
            )
    cells = own | made
    lost = sorted(key for key in handed if key not in cells)
    if lost:
        raise Refused(
            "Counts were handed in for {area} in {period}, which is summed from its parts, but "
            "not every part has {measure} for that year. Hand in the missing parts, or declare "
            "{area} as delivered.",
            area=lost[0].area,
            period=lost[0].period,
            measure=lost[0].measure,
        )
    for key in sorted(handed.keys() - own.keys()):
        _require_sum(key, handed[key], cells[key], len(parts[key.area]))
    ended = (gone | outdated(base, cells)) - cells.keys()
    return Totalled(cells, frozenset(ended), areas)


def total(cells: list[Vector]) -> Vector:
    """The sum on the common age groups; provisional where one part is."""
    grid = reduce(AgeGrid.common, (cell.grid for cell in cells))
    values = cells[0].grid.regroup(cells[0].values, grid)
    for cell in cells[1:]:
        values = values + cell.grid.regroup(cell.values, grid)
    return _of_parts(cells, grid, values)


def _of_parts(cells: list[Vector], grid: AgeGrid, values: Array) -> Vector:
    status = "final"
    estimated = False
    for cell in cells:
        if cell.status == "provisional":
            status = "provisional"
        estimated |= cell.estimated
    return Vector(status, grid, values, estimated)


def totals(parts: Mapping[Of, list[Vector]]) -> dict[Of, Vector]:
    """`total` of many; those whose parts share a grid are added up together, in the order of their
    parts as one alone is, so that each comes out the same to the last bit."""
    alike: dict[tuple[int, frozenset[int]], list[Of]] = {}
    for key in parts:
        grids = frozenset(id(cell.grid) for cell in parts[key])
        alike.setdefault((len(parts[key]), grids), []).append(key)
    made: dict[Of, Vector] = {}
    for (count, grids), keys in alike.items():
        if len(grids) > 1:
            made.update((key, total(parts[key])) for key in keys)
            continue
        values = np.array([parts[key][0].values for key in keys])
        for at in range(1, count):
            values = values + np.array([parts[key][at].values for key in keys])
        grid = parts[keys[0]][0].grid
        summed = zip(keys, values, strict=True)
        made.update((key, _of_parts(parts[key], grid, row)) for key, row in summed)
    return {key: made[key] for key in parts}


def _require_sum(key: Key, handed: Vector, made: Vector, parts: int) -> None:
    """Refuse counts of a whole that its parts do not add up to. (Of a whole handed in with all its
    parts, and said to be the whole, the checks have told, and only the parts are handed on.)"""
    grid = handed.grid.common(made.grid)
    given = handed.grid.regroup(handed.values, grid)
    off = np.abs(given - made.grid.regroup(made.values, grid))
    if off.max() > 0.5 * (parts + 1):  # whole numbers of persons may each have been rounded
        raise Refused(
            "The {measure} handed in for {area} in {period} ({sex}, age {age}) differ by {off} "
            "from the sum of its parts. Hand in all its parts, take {area} out, or declare it as "
            "delivered.",
            measure=key.measure,
            area=key.area,
            sex=key.sex,
            period=key.period,
            age=grid.labels[int(off.argmax())],
            off=f"{off.max():.15g}",
        )


def _persons(own: Cells, standing: Cells) -> dict[Key, Vector]:
    """Persons anew wherever women or men were handed in. Raises: Refused where persons were."""
    parts: dict[Key, list[Vector]] = {}
    slices = dict.fromkeys((key.area, *key[2:]) for key in own if not key.cause)
    for area, period, measure, cause in slices:
        persons = Key(area, "p", period, measure, cause)
        women = standing.get(Key(area, "f", period, measure, cause))
        men = standing.get(Key(area, "m", period, measure, cause))
        if women is None or men is None:
            continue
        if persons in own:
            raise Refused(
                "Persons were handed in for {area} in {period}, but the edition that stands has "
                "women and men, and persons are their sum. Hand in women and men, or replace the "
                "edition as a whole.",
                area=persons.area,
                period=persons.period,
            )
        if measure != COUNTED:
            parts[persons] = [women, men]
        beside = [standing.get(Key(area, sex, period, COUNTED, cause)) for sex in ("f", "m")]
        if measure == DEATHS and any(beside):
            both = zip((women, men), beside, strict=True)
            parts[persons._replace(measure=COUNTED)] = _counted(both)
    return totals(parts | _persons_by_cause(parts, standing))


def _persons_by_cause(made: Iterable[Key], standing: Cells) -> dict[Key, list[Vector]]:
    """The parts of the causes of persons whose deaths are made: where women and men both have
    causes, those of either."""
    held, causes = places(standing), causes_of(standing)
    parts: dict[Key, list[Vector]] = {}
    for persons in made:
        sexes = [persons._replace(sex=sex) for sex in ("f", "m")]
        if persons.measure != DEATHS or any(one[:3] not in held for one in sexes):
            continue
        for cause in causes[persons.area, persons.period]:
            of_cause = [one._replace(cause=cause) for one in sexes]
            there = [one for one in of_cause if one in standing]
            beside = [standing.get(one._replace(measure=COUNTED)) for one in there]
            parts[persons._replace(cause=cause)] = [standing[one] for one in there]
            if any(beside):
                both = zip((standing[one] for one in there), beside, strict=True)
                parts[persons._replace(cause=cause, measure=COUNTED)] = _counted(both)
    return parts


def _sums(parts: dict[str, Slices], boundaries: Boundaries) -> Slices:
    """Sums of the slices that no part lacks; but for parts that have ended or not yet begun."""
    held = {code: [period for _, period, *_ in part] for code, part in parts.items()}
    absent = {code: _absent(boundaries.get(code, ()), held[code]) for code in parts}
    caused = {code: {one[:2] for one in part if one[3]} for code, part in parts.items()}
    summands: dict[Slice, list[Vector]] = {}
    for which in sorted(set[Slice]().union(*parts.values())):
        sex, period, measure, cause = which
        lacking = [code for code, part in parts.items() if which not in part]
        nil = {code for code in lacking if cause and (sex, period) in caused[code]}
        missed = any(not absent[code](period) for code in lacking if code not in nil)
        if measure == COUNTED or missed:
            continue
        there = [part for code, part in parts.items() if code not in lacking]
        summands[which] = [part[which] for part in there]
        beside = (sex, period, COUNTED, cause)
        if measure == DEATHS and any(beside in part for part in there):
            summands[beside] = _counted((part[which], part.get(beside)) for part in there)
    sums = totals(summands)
    for sex, period, measure, cause in summands:
        if measure == COUNTED:  # parts of one split carry the same deaths: together no more
            counted, deaths = sums[sex, period, COUNTED, cause], sums[sex, period, DEATHS, cause]
            most = np.minimum(counted.values, deaths.values)
            sums[sex, period, COUNTED, cause] = replace(counted, values=most)
    return sums


def _absent(years: Iterable[str], held: list[str]) -> Callable[[str], bool]:
    """In which years there is no such part: it ends, or begins, at a break of boundaries."""
    first, last = min(held, default=""), max(held, default="")
    ends = min((year for year in years if last < year), default="9999")
    begins = max((year for year in years if first >= year), default="0000")
    return lambda period: bool(held) and not begins <= period < ends


def _counted(parts: Iterable[tuple[Vector, Vector | None]]) -> list[Vector]:
    """Deaths as they were counted, where `deaths` beside them may be shared out."""
    return [deaths if counted is None else counted for deaths, counted in parts]


def _parts(areas: Iterable[Area]) -> dict[str, list[str]]:
    """Codes of the parts of each area, in code order."""
    parts: dict[str, list[str]] = {}
    for area in sorted(areas, key=lambda area: area.code):
        parts.setdefault(area.parent, []).append(area.code)
    return parts


def _summed(areas: tuple[Area, ...]) -> set[str]:
    parts = _parts(areas)
    return {area.code for area in areas if area.code in parts and not area.delivered}


def _slice(key: Key) -> Slice:
    return (key.sex, key.period, key.measure, key.cause)
