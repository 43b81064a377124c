"""Deaths by cause of an area that is part of none: what of them is withheld.

The causes of one area and year form a table like that of areas: causes are parts of their group as
areas are of their whole, ages add up, women and men add up to persons. So the same closing protects
it, with the deaths of all causes, which are known, as the whole.

Where the deaths of all causes are withheld themselves, they must stay as free as the table of areas
left them. Therefore every cause is withheld at such an age, of women, men and persons, and nil
ones too. Then whatever may move in the table of areas, the causes can follow: a death that moves
from one age to another is one of some cause, which moves with it, and all else stays. Deaths by
cause of other areas are not shown: the sums over areas and causes together are no network.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import reduce

import numpy as np

from engine.ages import AgeGrid, Array
from server.disclosure.blocks import SEXES, Block, Bools, block
from server.disclosure.closing import close
from server.disclosure.equations import equations
from server.disclosure.history import State, as_block, fresh_of, withheld_before
from server.disclosure.showing import shown
from server.disclosure.standing_in import stand_ins
from server.disclosure.withholding import by_schedule, kept_secret, small
from server.store.records import (
    NOT_STATED,
    Area,
    Cause,
    Hidden,
    Key,
    Mask,
    Terms,
    Unprotected,
    Vector,
)

Cells = Mapping[Key, Vector]
ALL = "all causes"  # the whole of the table, where areas have the one they are part of
_NOTHING = 1e-6
_MEASURES = ("deaths", "counted_deaths")


@dataclass(frozen=True, slots=True)
class Table:
    """Deaths by cause of an area and year, a cause standing where areas do."""

    causes: tuple[Area, ...]
    cells: Cells  # person-years too, those of the area for every cause
    grid: AgeGrid  # the ages that all causes and all deaths share
    finer: frozenset[Key]  # schedules by cause that have finer ones


def table(listed: Sequence[Cause], area: str, period: str, cells: Cells) -> Table | None:
    """Of the sexes that have any deaths by cause; None where none has, or where the list knows some
    cause not or as one with parts. A cause that is not held has no deaths. Sums of groups and
    deaths of no stated cause are worked out."""
    own = {key: one for key, one in cells.items() if (key.area, key.period) == (area, period)}
    held = {key: one for key, one in own.items() if key.measure in _MEASURES}
    sexes = [sex for sex in SEXES if any(key.cause and key.sex == sex for key in held)]
    parents = {one.code: one.parent or ALL for one in listed}
    leaves = [code for code in parents if code not in set(parents.values())]
    if not sexes or not {key.cause for key in held} <= {"", *leaves}:
        return None
    grid = reduce(AgeGrid.common, (one.grid for one in held.values()))
    found: dict[Key, Vector] = {}
    for sex in sexes:
        years = own.get(Key(area, sex, period, "person_years"))
        for measure in _MEASURES:
            whole = own.get(Key(area, sex, period, measure))
            if whole is None:
                continue
            counts = {
                code: _on(grid, own.get(Key(area, sex, period, measure, code))) for code in leaves
            }
            total = _on(grid, whole)
            rest = total - sum(counts.values(), np.zeros(len(grid)))
            counts |= {ALL: total, NOT_STATED: np.where(np.abs(rest) < _NOTHING, 0.0, rest)}
            for code, values in _with_groups(counts, parents).items():
                found[Key(code, sex, period, measure)] = Vector("final", grid, values)
        if years is not None:
            found |= {Key(code, sex, period, "person_years"): years for code in (*parents, ALL)}
    tree = [Area(ALL, ""), *(Area(code, "", parent) for code, parent in parents.items())]
    finer = frozenset(key for key, one in held.items() if key.cause and one.grid != grid)
    if any(one.values.any() for key, one in found.items() if key.area == NOT_STATED):
        return Table((*tree, Area(NOT_STATED, "", ALL)), found, grid, finer)
    found = {key: one for key, one in found.items() if key.area != NOT_STATED}
    return Table(tuple(tree), found, grid, finer)


def _on(grid: AgeGrid, one: Vector | None) -> Array:
    return np.zeros(len(grid)) if one is None else one.grid.regroup(one.values, grid)


def _with_groups(counts: Mapping[str, Array], parents: Mapping[str, str]) -> dict[str, Array]:
    found = dict(counts)
    for code in counts:
        above = parents.get(code, ALL)
        while above != ALL:
            found[above] = found.get(above, 0.0) + counts[code]
            above = parents[above]
    return found


@dataclass(frozen=True, slots=True)
class Past:
    """A table as an edition has it, and what of it is not shown, as keys of the table: of causes,
    and of the deaths of all causes."""

    area: str
    period: str
    table: Table
    mask: Mask
    total: Mapping[str, Array]  # deaths of all causes as they are shown, by sex: [age]
    whole_grid: AgeGrid  # the ages that all deaths are shown by

    @property
    def state(self) -> State:
        return State(self.table.causes, self.table.cells, self.mask)

    @property
    def of_all(self) -> dict[Key, Hidden]:
        return {key: one for key, one in self.mask.items() if key.area == ALL}

    def same_as(self, other: "Past") -> bool:
        return self.of_all == other.of_all and self.state.same_as(
            other.table.causes, other.table.cells
        )


def joined(one: Past) -> tuple[Block, Bools]:
    """The table as a block, of which the deaths of all causes are those of the area."""
    of, hidden = as_block(one.state, one.period, "deaths")

    def name(code: str) -> str:
        return one.area if code == ALL else f"cause {code}" if code else ""

    named = tuple(replace(it, code=name(it.code), parent=name(it.parent)) for it in of.areas)
    return replace(of, areas=named), hidden


def past(listed: Sequence[Cause], area: str, period: str, cells: Cells, mask: Mask) -> Past | None:
    """What an edition has of the causes of an area and year; None where it has none."""
    made = table(listed, area, period, cells)
    if made is None:
        return None
    hidden: dict[Key, Hidden] = {}
    total: dict[str, Array] = {}
    grids: list[AgeGrid] = []
    for code, sex, _period, measure, _none in made.cells:
        key = Key(area, sex, period, measure, "" if code == ALL else code)
        if measure in _MEASURES and key in mask:
            hidden[Key(code, sex, period, measure)] = mask[key]
        if (code, measure) == (ALL, "deaths"):
            given = shown(cells[key], mask[key]) if key in mask else cells[key]
            total[sex] = _on(made.grid, given)
            grids.append(given.grid)
    return Past(area, period, made, hidden, total, reduce(AgeGrid.common, grids))


@dataclass(frozen=True, slots=True)
class MadeOf:
    """What of an area's causes is withheld."""

    mask: dict[Key, Hidden]
    unprotected: Unprotected


def of_causes(
    now: Past, terms: Terms, earlier: Sequence[Past] = (), otherwise: Sequence[Past] = ()
) -> MadeOf:
    """What is withheld of the causes of an area and year whose deaths of all causes are shown as
    `now` says, when others were shown in `earlier` editions and under other policies."""
    for one in earlier[::-1]:
        if one.same_as(now):
            return MadeOf(_stored(one.mask, now), Unprotected())
    period = now.period
    of = block(now.table.causes, period, "deaths", now.table.cells, counted="counted_deaths")
    whole = np.array([of.areas[place].code == ALL for place in of.area.tolist()])[:, None]
    states, before = [one.state for one in earlier], [one.state for one in otherwise]
    known = whole & withheld_before(of, period, "deaths", [State(of.areas, {}, now.of_all)])
    dark = np.isin(of.start, of.start[known.any(axis=1)])[:, None] & of.held & ~whole
    primary = small(of, terms.threshold, zeros=terms.zeros == "shown") & ~whole
    sticky = withheld_before(of, period, "deaths", states) & ~whole
    fresh = fresh_of(of, period, "deaths", states) & ~whole
    done = close(of, primary, sticky | dark | known, fresh, terms.threshold)
    left = kept_secret(
        of, done, primary, fresh, terms.threshold, (period, "deaths", states, before)
    )
    hidden = done.hidden & ~whole
    own = by_schedule(of, period, "deaths", hidden, _stand_ins(of, hidden, whole, now))
    if states or before:  # what may be told was looked for in all that is shown
        return MadeOf(_stored(own, now), Unprotected(left, len(done.exposed) + len(done.narrow)))
    return MadeOf(_stored(own, now), Unprotected(len(done.exposed), len(done.narrow)))


def _stand_ins(of: Block, hidden: Bools, whole: Bools, now: Past) -> Array:
    """Begins with what is left of each cause, spread over ages as what is left of all causes."""
    values = np.array(of.values)
    for sex, total in now.total.items():
        rows = np.flatnonzero(whole[:, 0])
        both = np.append(total, total.sum()) if len(rows) > len(total) else total
        values[rows, SEXES.index(sex)] = both
    given = np.where(hidden, 0.0, np.nan_to_num(values)).reshape(len(of.areas), -1, 3)
    gone = hidden.reshape(given.shape)
    ages = slice(0, len(now.table.grid))
    wholes = {one.parent for one in of.areas}
    leaves = [at for at, one in enumerate(of.areas) if one.code not in wholes]
    everything = given[whole.reshape(len(of.areas), -1)[:, 0]]
    at_age = np.maximum(everything[:, ages] - given[leaves][:, ages].sum(axis=0), 1e-3)
    weights = np.where(gone[:, ages], at_age, 0.0)
    together = np.maximum(weights.sum(axis=1, keepdims=True), 1e-9)
    left = np.maximum(given[:, -1:] - given[:, ages].sum(axis=1, keepdims=True), 1e-3)
    begin = np.zeros_like(given)
    begin[:, ages] = left * weights / together
    begin[:, len(now.table.grid) :] = begin[:, ages].sum(axis=1, keepdims=True)
    shaped = replace(of, values=values)
    return stand_ins(shaped, hidden, equations(of), begin=begin.reshape(values.shape))


def _stored(mask: Mapping[Key, Hidden], now: Past) -> dict[Key, Hidden]:
    """As keys of schedules, on the ages that all causes share. Counts from which chance is told
    are given with the deaths they stand behind."""
    found: dict[Key, Hidden] = {}
    for sex in now.total:
        for cause in now.table.causes:
            of = Key(cause.code, sex, now.period, "deaths")
            if cause.code == ALL:
                continue
            hidden = replace(mask.get(of, Hidden((), ())), starts=now.table.grid.starts)
            for measure in _MEASURES:
                key = Key(now.area, sex, now.period, measure, cause.code)
                held = of._replace(measure=measure) in now.table.cells
                if held and (hidden.ages or key in now.table.finer):
                    found[key] = hidden
    return found
