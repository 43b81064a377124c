"""Counts given to the codes that their areas have become."""

from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from server.actions.cause_counts import COUNTED, DEATHS, places
from server.actions.totals import total
from server.intake.successions import Share, Successions
from server.store.errors import Refused
from server.store.records import Area, Key, Vector

Cells = Mapping[Key, Vector]


@dataclass(frozen=True, slots=True)
class Recoded:
    made: dict[Key, Vector]  # under the new codes
    gone: frozenset[Key]  # schedules of the old codes that were used up, or have ended


def recoded(cells: Cells, said: Successions) -> Recoded:
    """What the schedules of old codes become. A merge is the exact sum of all its codes; a part by
    a share is estimated and carries the deaths as they were counted.

    Persons beside women and men are left to be summed anew.
    Of deaths by cause nothing is made where one of the codes to be merged has none at all.
    Raises: Refused where deaths or population of one of the codes to be merged are lacking.
    """
    parts: dict[Key, dict[str, Vector]] = defaultdict(dict)  # by the old code
    gone = set()
    for key, cell in cells.items():
        one = said.find(key.area, key.period)
        if one is None:
            continue
        gone.add(key)
        if _summed_anew(key, cells):
            continue
        shares = one.shares_of(key)
        if one.shares and not shares:
            raise _unshared(key)
        for share in shares:
            if key.measure == COUNTED and not share.whole:
                continue  # they go along whole with the deaths
            new = key._replace(area=share.becomes)
            parts[new][key.area] = _part(cell, share)
            if key.measure == DEATHS and not share.whole:
                counted = cells.get(key._replace(measure=COUNTED), cell)
                parts[new._replace(measure=COUNTED)][key.area] = counted
    made, held = {}, places(cells)
    for new, found in sorted(parts.items()):
        codes = said.before(new.area, new.period)
        if new.measure == COUNTED:
            deaths = parts[new._replace(measure=DEATHS)]
            found = {code: found.get(code, deaths[code]) for code in deaths}
        if new.cause:  # a code that has deaths by cause, but none of this one, has nil
            if any((code, new.sex, new.period) not in held for code in codes):
                continue
            codes = tuple(code for code in codes if code in found)
        if lacking := [code for code in codes if code not in found]:
            _require_optional(new, lacking)
            continue
        made[new] = total([found[code] for code in codes])
    return Recoded(made, frozenset(gone))


def _part(cell: Vector, share: Share) -> Vector:
    """The part of one schedule; a count without ages takes the share of age 0."""
    if share.whole:
        return cell
    at = np.searchsorted(share.grid.starts, cell.grid.starts, side="right") - 1
    values = cell.values * np.array(share.values)[at]
    return replace(cell, values=values, estimated=True)


def _unshared(key: Key) -> Refused:
    return Refused(
        "{area} is shared out, but no share is stated for its {measure} ({sex}, {period}). Add the "
        "share in the table of areas.",
        area=key.area,
        measure=key.measure,
        sex=key.sex,
        period=key.period,
    )


def _summed_anew(key: Key, cells: Cells) -> bool:
    return key.sex == "p" and all(key._replace(sex=sex, cause="") in cells for sex in ("f", "m"))


def _require_optional(new: Key, lacking: list[str]) -> None:
    """Counts beside the rates may be lacking: the new code then has none of them."""
    if new.measure in (DEATHS, "person_years"):
        raise Refused(
            "{area} in {period} is to be made of counts of {codes}, of which there are none "
            "({measure}, {sex}). Hand them in, or narrow the years in the table of areas.",
            area=new.area,
            period=new.period,
            codes=", ".join(lacking),
            measure=new.measure,
            sex=new.sex,
        )


def _common_whole(new: str, said: Successions, known: Mapping[str, Area]) -> str:
    """The whole that the codes share of which a new one is made; empty where they share none."""
    old = {one.code for one in said.of if new in one.becomes and one.code != new}
    wholes = {known[code].parent for code in old if code in known}
    return wholes.pop() if len(wholes) == 1 else ""


def listed(
    areas: Iterable[Area], said: Successions, left: Iterable[Key], known: Mapping[str, Area]
) -> tuple[tuple[Area, ...], frozenset[str]]:
    """Areas without the old codes that have no counts left, with the new ones; and the codes that
    ended. A new code belongs where it is said to, else where the codes do that it comes from."""
    codes = {key.area for key in left} | {area.code for area in said.areas}
    ended = frozenset(said.codes) - codes
    kept = {area.code: area for area in areas if area.code not in ended}
    for area in said.areas:
        before = kept.get(area.code) or known.get(area.code, area)
        parent = area.parent or before.parent or _common_whole(area.code, said, known)
        kept[area.code] = replace(before, name=area.name or before.name, parent=parent)
    return tuple(kept.values()), ended
