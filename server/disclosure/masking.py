"""One mask for all that an edition holds, under the terms of its collection."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from engine.ages import AgeGrid, Array
from server.disclosure.blocks import SEXES, TOTAL, Block, Bools, block
from server.disclosure.closing import Closed, close
from server.disclosure.coarsening import coarsened
from server.disclosure.equations import equations
from server.disclosure.history import State, fresh_of, leaking, public_of, withheld_before
from server.disclosure.rounding import Rounding, on_coarser, rounding
from server.disclosure.standing_in import stand_ins
from server.store.records import Area, Hidden, Key, Mask, Terms, Unprotected, Vector

Cells = Mapping[Key, Vector]
# people before deaths, since deaths of too few people are withheld; what each is judged by
MEASURES = ("person_years", "births", "deaths", "stillbirths", "neonatal_deaths")
PEOPLE = ("person_years", "births")


@dataclass(frozen=True, slots=True)
class Content:
    """What an edition holds and did not show, and the terms that it was shown under."""

    areas: tuple[Area, ...]
    cells: Cells
    mask: Mask
    unprotected: Mapping[str, Unprotected] = field(default_factory=dict)
    terms: Terms = field(default_factory=Terms)


@dataclass(frozen=True, slots=True)
class Made:
    """A mask, and which small counts of each period could not be protected as asked."""

    mask: Mask
    unprotected: Mapping[str, Unprotected]


def mask(
    areas: tuple[Area, ...],
    cells: Cells,
    terms: Terms,
    earlier: Sequence[Content] = (),
    otherwise: Sequence[Content] = (),
    *,
    secret: str = "",
) -> Made:
    """What is withheld of an edition of these areas and counts, when `earlier` editions of the
    collection were shown as they were. A year that is as in one of them is shown as there.
    `otherwise`: what other policies, the first one first, showed of the editions, which some reader
    may have kept. `secret`: what counts are rounded with."""
    by_period, before = _periods(cells), [_periods(one.cells) for one in earlier]
    masks = [_hidden_periods(one.mask) for one in earlier]
    shown = _shown_otherwise(otherwise)
    found: dict[Key, Hidden] = {}
    left: dict[str, Unprotected] = {}
    for period, own in sorted(by_period.items()):
        way = way_of(period, terms, otherwise)
        states = [
            State(
                one.areas,
                part,
                hidden.get(period, {}),
                one.unprotected.get(period, Unprotected()),
            )
            for one, parts, hidden in zip(earlier, before, masks, strict=True)
            if (part := parts.get(period))
        ]
        made = next((one for one in states[::-1] if one.same_as(areas, own)), None)
        if made is None and way.base:
            made = _rounded(areas, period, own, way, states, secret)
        elif made is None:
            made = _withheld(areas, period, own, way, states, shown.get(period, ()))
        found |= made.mask
        left |= {period: made.unprotected} if made.unprotected != Unprotected() else {}
    return Made(found, left)


def way_of(period: str, terms: Terms, otherwise: Iterable[Content]) -> Terms:
    """The terms that hold for a year under these: it keeps the way it was first shown in, withheld
    or rounded, and to which base. Counts that are shown both ways tell one another."""
    there = [one.terms for one in otherwise if any(key.period == period for key in one.cells)]
    if not there or there[0].base == terms.base:
        return terms
    if there[0].base:
        return replace(terms, base=there[0].base)
    return [one for one in there if not one.base][-1]


def _rounded(
    areas: tuple[Area, ...],
    period: str,
    cells: Cells,
    terms: Terms,
    states: Sequence[State],
    secret: str,
) -> State:
    years = [(one.areas, one.cells) for one in _distinct(states)]
    given = rounding(areas, period, cells, Rounding(terms.base, secret), years)
    for key, vector in coarsened(areas, cells, terms).items():
        hidden = given.get(key)
        if vector.grid == cells[key].grid:
            continue
        if hidden is None or not hidden.rounded:
            given[key] = _on_groups(hidden, vector)
        else:
            given[key] = on_coarser(hidden, cells[key].grid, vector.grid)
    return State(areas, cells, given)


def _withheld(
    areas: tuple[Area, ...],
    period: str,
    cells: Cells,
    terms: Terms,
    states: Sequence[State],
    shown: Sequence[State],
) -> State:
    shaped = coarsened(areas, cells, terms)
    past = [replace(one, cells=coarsened(one.areas, one.cells, terms)) for one in states]
    made = _of_period(areas, period, shaped, terms, _distinct(past), shown)
    coarser = {
        key: _on_groups(made.mask.get(key), vector)
        for key, vector in shaped.items()
        if vector.grid != cells[key].grid
    }
    return replace(made, mask={**made.mask, **coarser})


def _on_groups(hidden: Hidden | None, vector: Vector) -> Hidden:
    return replace(hidden or Hidden((), ()), starts=vector.grid.starts)


def _periods(cells: Cells) -> dict[str, dict[Key, Vector]]:
    found: dict[str, dict[Key, Vector]] = {}
    for key, vector in cells.items():
        if not key.cause:
            found.setdefault(key.period, {})[key] = vector
    return found


def _hidden_periods(mask: Mask) -> dict[str, dict[Key, Hidden]]:
    found: dict[str, dict[Key, Hidden]] = {}
    for key, hidden in mask.items():
        found.setdefault(key.period, {})[key] = hidden
    return found


def _distinct(states: Sequence[State]) -> list[State]:
    kept: list[State] = []
    for one in states:
        if not any(one.same_as(other.areas, other.cells) for other in kept):
            kept.append(one)
    return kept


def _shown_otherwise(contents: Sequence[Content]) -> dict[str, list[State]]:
    """Each period as it was shown, on the ages it was shown by; the same state once."""
    found: dict[str, list[State]] = {}
    for one in contents:
        cells = dict(one.cells)
        for key, hidden in one.mask.items():
            if key in cells and hidden.starts:
                grid, vector = AgeGrid(hidden.starts), cells[key]
                values = vector.grid.regroup(vector.values, grid)
                cells[key] = replace(vector, grid=grid, values=values)
        masks = _hidden_periods(one.mask)
        for period, part in _periods(cells).items():
            state, kept = (
                State(one.areas, part, masks.get(period, {})),
                found.setdefault(period, []),
            )
            if not any(
                state.mask == other.mask and state.same_as(other.areas, other.cells)
                for other in kept
            ):
                kept.append(state)
    return found


def _of_period(
    areas: tuple[Area, ...],
    period: str,
    cells: Cells,
    terms: Terms,
    states: Sequence[State],
    shown: Sequence[State],
) -> State:
    found: dict[Key, Hidden] = {}
    exposed = narrow = 0
    few: dict[tuple[str, int, int], Bools] = {}  # slots of too few people
    for measure in MEASURES:
        threshold = terms.persons if measure in PEOPLE else terms.threshold
        if not threshold:
            continue
        counted = "counted_deaths" if measure == "deaths" else ""
        of = block(areas, period, measure, cells, counted=counted)
        primary = _primary(of, threshold, zeros=terms.zeros == "shown" or measure in PEOPLE)
        if measure == "deaths":
            primary |= _of_few(of, few)
        if measure == "neonatal_deaths":
            primary |= _few_later(of, period, cells, threshold)
        sticky = withheld_before(of, period, measure, states)
        if not (primary.any() or sticky.any()):
            continue
        fresh = fresh_of(of, period, measure, states)
        done = close(of, primary, sticky, fresh, threshold)
        left = _kept_secret(of, done, primary, fresh, threshold, (period, measure, states, shown))
        exposed, narrow = exposed + max(len(done.exposed), left), narrow + len(done.narrow)
        if measure == "person_years":
            few = {key: done.hidden[slot] for key, slot in of.keys().items()}
        stand = stand_ins(of, done.hidden, equations(of), max(threshold / 2, 1.0))
        found |= _by_schedule(of, period, measure, done.hidden, stand)
    found |= _of_the_same_people(cells, found)
    return State(areas, cells, found, Unprotected(exposed, narrow))


def _kept_secret(
    of: Block,
    done: Closed,
    primary: Bools,
    fresh: Bools,
    threshold: float,
    known: tuple[str, str, Sequence[State], Sequence[State]],
) -> int:
    """Withhold more, the least first, until the mask and all that was shown before tell nothing
    that it withholds; how many numbers they tell in the end."""
    period, measure, states, shown = known
    every = [*states, *shown]
    left = leaking(of, done.hidden, period, measure, every) if every else 0
    if left and shown:  # what protects must not have been shown under another policy
        secret = fresh & ~public_of(of, period, measure, shown)
        done.hidden |= close(of, primary, done.hidden, secret, threshold).hidden
        left = leaking(of, done.hidden, period, measure, every)
    if left and shown:
        done.hidden |= withheld_before(of, period, measure, shown)
        left = leaking(of, done.hidden, period, measure, every)
    if left and states:
        done.hidden |= fresh & of.held  # nothing new is shown of such a year
        left = leaking(of, done.hidden, period, measure, every)
    return left


def _primary(of: Block, threshold: float, *, zeros: bool) -> Bools:
    with np.errstate(invalid="ignore"):
        few = of.held & (of.least < threshold)
        return few if zeros else few | (of.held & (of.values == 0) & (threshold > 0))


def _of_few(of: Block, few: Mapping[tuple[str, int, int], Bools]) -> Bools:
    found = np.zeros_like(of.held)
    for key, slot in of.keys().items():
        if key in few:
            found[slot] = few[key]
    return found & of.held


def _few_later(of: Block, period: str, cells: Cells, threshold: float) -> Bools:
    """Where few infants died after their first 28 days, which a difference would tell."""
    found = np.zeros_like(of.held)
    for slot, place in enumerate(of.area.tolist()):
        for sex, code in enumerate(SEXES):
            deaths = cells.get(Key(of.areas[place].code, code, period, "deaths"))
            if deaths is not None and deaths.grid.has(1) and of.held[slot, sex]:
                later = float(deaths.values[0] - of.values[slot, sex])
                found[slot, sex] = 0 < later < threshold
    return found


def _by_schedule(
    of: Block, period: str, measure: str, hidden: Bools, stand: Array
) -> dict[Key, Hidden]:
    found: dict[Key, Hidden] = {}
    rows: dict[int, list[int]] = {}
    for slot in np.flatnonzero(hidden.any(axis=1)).tolist():
        rows.setdefault(int(of.area[slot]), []).append(slot)
    for place, slots in rows.items():
        for sex in range(3):
            own = [slot for slot in slots if hidden[slot, sex]]
            if not own:
                continue
            ages: list[int] = []
            values: list[float] = []
            for slot in own:
                inside = _inside(of, place, sex, slot)
                ages += inside
                values += [float(stand[slot, sex]) / len(inside)] * len(inside)
            key = Key(of.areas[place].code, SEXES[sex], period, measure)
            found[key] = Hidden(tuple(ages), tuple(round(value, 9) for value in values))
    return found


def _inside(of: Block, place: int, sex: int, slot: int) -> list[int]:
    """Starts of the schedule's own groups within a slot."""
    start, stop = int(of.start[slot]), int(of.stop[slot])
    if start == TOTAL:
        return [TOTAL]
    own = of.grids[(place, sex)].starts
    return [one for one in own if one >= start and (stop < 0 or one < stop)]


def _of_the_same_people(cells: Cells, found: Mapping[Key, Hidden]) -> dict[Key, Hidden]:
    """Counts from which chance is told are withheld with those they stand behind, at the share of
    them that is counted at the ages shown."""
    out: dict[Key, Hidden] = {}
    for key, hidden in found.items():
        beside = key._replace(measure="counted_deaths")
        if key.measure != "deaths" or beside not in cells:
            continue
        counted, deaths = cells[beside], cells[key]
        gone = np.isin(counted.grid.starts, hidden.ages)
        own = np.isin(deaths.grid.starts, hidden.ages)
        total = float(deaths.values[~own].sum())
        share = min(float(counted.values[~gone].sum()) / total, 1.0) if total > 0 else 1.0
        out[beside] = replace(hidden, values=tuple(share * value for value in hidden.values))
    return out
