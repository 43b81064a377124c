"""What an upload makes of its base: the same for a commit, a look ahead and a rebuild."""

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from server.actions import cause_lists, totals
from server.actions.cause_counts import outdated
from server.actions.recoding import Recoded, listed, recoded
from server.actions.taking import taken
from server.intake import break_rows
from server.intake.parsing import Parsed
from server.intake.successions import Successions
from server.store import breaks
from server.store.errors import Refused
from server.store.records import Area, Break, Cause, Key, Selection, Taking, Vector

Cells = Mapping[Key, Vector]
SLACK = 0.5  # deaths by which causes may exceed all: rounded fractions, as the checks allow


@dataclass(frozen=True, slots=True)
class Base:
    """What is laid over; empty where nothing stands or all of it gives way."""

    areas: tuple[Area, ...]  # in tree order
    breaks: tuple[Break, ...]
    load: Callable[[Selection], Cells]
    causes: tuple[Cause, ...] = ()  # in the order of their list
    held: Callable[[], Iterable[Key]] = tuple  # every schedule


@dataclass(frozen=True, slots=True)
class Made:
    """What is new and what has ended; see `Change`."""

    cells: dict[Key, Vector]
    areas: tuple[Area, ...]
    ended: frozenset[Key]
    ended_areas: frozenset[str]
    breaks: tuple[Break, ...]
    ended_breaks: tuple[Break, ...]
    causes: cause_lists.Laid


def made_of(parsed: Parsed, taking: Taking, base: Base) -> Made:
    """What is taken of an upload, under the codes its areas have become, with totals and breaks.

    Raises: Refused, as `taken`, `recoded`, `totals.laid_over` and `cause_lists.laid_over` do, and
    where deaths by cause are more than all deaths.
    """
    cells, areas = taken(parsed, taking, base.areas)
    said = parsed.successions
    old = base.load(Selection(areas=said.codes, cause=None)) if said and base.areas else {}
    before, own = recoded(old, said), _own(cells, recoded(cells, said))
    _require_within(own)
    cells = _laid(before.made, own, taking)
    known = {area.code: area for area in (*base.areas, *areas)}
    areas, ended = listed(areas, said, {*old.keys() - before.gone, *cells}, known)
    kept = tuple(area for area in base.areas if area.code not in ended)

    def load(periods: tuple[str, ...] | None) -> Cells:
        found = base.load(Selection(periods=periods, cause=None))
        return {key: cell for key, cell in found.items() if key not in before.gone}

    new = breaks.in_order((*break_rows.new(parsed.breaks), *_carried(base.breaks, said, ended)))
    gone = (
        *break_rows.ended(parsed.breaks, base.breaks),
        *(one for one in base.breaks if one.area in ended),
    )
    summed = totals.laid_over(
        cells,
        areas,
        base_areas=kept,
        load=load,
        handed=own,
        taking=taking,
        boundaries=_boundaries((*(one for one in base.breaks if one not in gone), *new)),
    )
    lost = (summed.ended | before.gone) - summed.cells.keys()
    return Made(
        cells=summed.cells,
        areas=summed.areas,
        ended=lost,
        ended_areas=ended & {area.code for area in base.areas},
        breaks=new,
        ended_breaks=gone,
        causes=cause_lists.laid_over(
            parsed.causes,
            base.causes,
            new=summed.cells,
            gone=lost | summed.cells.keys(),
            held=base.held,
        ),
    )


def _boundaries(held: Iterable[Break]) -> dict[str, tuple[str, ...]]:
    """Years of breaks of boundaries, by area."""
    found: dict[str, tuple[str, ...]] = {}
    for one in held:
        if one.kind == "boundary" and one.area:
            found[one.area] = (*found.get(one.area, ()), one.period)
    return found


def _own(cells: Cells, handed: Recoded) -> dict[Key, Vector]:
    """Counts handed in, under the codes that theirs have become."""
    return {key: cell for key, cell in cells.items() if key not in handed.gone} | handed.made


def _laid(before: Cells, own: dict[Key, Vector], taking: Taking) -> dict[Key, Vector]:
    """Counts handed in go before those made of the base, of which the same gives way to them as of
    the base. Persons give way where a sex is handed in, since they are its sum with the other."""
    if not before:
        return own
    gone = totals.giving_way(before, own, taking)
    gone |= {key._replace(sex="p") for key in own if key.sex in ("f", "m")}
    gone |= outdated(before, {*own, *gone})
    return {key: cell for key, cell in before.items() if key not in gone} | own


def _require_within(cells: Cells) -> None:
    """Refuse deaths by cause that are more than the deaths of all causes."""
    parts: dict[Key, list[Vector]] = {}
    for key, cell in cells.items():
        if key.cause:
            parts.setdefault(key._replace(cause=""), []).append(cell)
    for key, by_cause in totals.totals(parts).items():
        total = cells.get(key)
        if total is None:
            continue
        grid = total.grid.common(by_cause.grid)
        given = by_cause.grid.regroup(by_cause.values, grid)
        over = given - total.grid.regroup(total.values, grid)
        over = np.nan_to_num(over)
        if over.max() > SLACK:
            at = int(over.argmax())
            raise Refused(
                "The deaths by cause of {area} in {period} ({sex}, age {age}) are {off} more than "
                "the deaths of all causes. Correct the file, or hand in the causes alone: their "
                "sum is then the deaths of all causes.",
                area=key.area,
                period=key.period,
                sex=key.sex,
                age=grid.labels[at],
                off=f"{over[at]:.15g}",
            )


def _carried(stood: Iterable[Break], said: Successions, ended: Iterable[str]) -> tuple[Break, ...]:
    """A break of a code that has ended parts the counts made of it too."""
    stood = tuple(stood)
    known = {(one.area, one.period, one.kind, one.cause) for one in stood}
    made = {
        (new, one.period, one.kind, one.cause): replace(one, area=new)
        for one in stood
        if one.area in set(ended)
        for succession in said.of
        if succession.code == one.area
        for new in succession.becomes
    }
    return tuple(one for key, one in made.items() if key not in known)
