"""What is withheld of one period: small counts, and what protects them."""

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from engine.ages import Array
from server.disclosure.blocks import SEXES, TOTAL, Block, Bools, block
from server.disclosure.closing import Closed, close
from server.disclosure.equations import equations
from server.disclosure.history import State, fresh_of, leaking, public_of, withheld_before
from server.disclosure.standing_in import expected, stand_ins
from server.store.records import Area, Hidden, Key, Terms, Unprotected, Vector

Cells = Mapping[Key, Vector]
# people before deaths, since deaths of too few people are withheld; what each is judged by
MEASURES = ("person_years", "births", "deaths", "stillbirths", "neonatal_deaths")
PEOPLE = ("person_years", "births")


def of_period(
    areas: tuple[Area, ...],
    period: str,
    cells: Cells,
    terms: Terms,
    states: Sequence[State],
    shown: Sequence[State],
) -> State:
    """What is withheld of a period when `states` were shown of it in earlier editions, and `shown`
    under other policies."""
    found: dict[Key, Hidden] = {}
    exposed = narrow = 0
    few: dict[tuple[str, int, int], Bools] = {}  # slots of too few people
    for measure in MEASURES:
        threshold = terms.persons if measure in PEOPLE else terms.threshold
        if not threshold:
            continue
        counted = "counted_deaths" if measure == "deaths" else ""
        of = block(areas, period, measure, cells, counted=counted)
        primary = small(of, threshold, zeros=terms.zeros == "shown" or measure in PEOPLE)
        if measure == "deaths":
            primary |= _of_few(of, few)
        if measure == "neonatal_deaths":
            primary |= _few_later(of, period, cells, threshold)
        sticky = withheld_before(of, period, measure, states)
        if not (primary.any() or sticky.any()):
            continue
        fresh = fresh_of(of, period, measure, states)
        done = close(of, primary, sticky, fresh, threshold)
        left = kept_secret(of, done, primary, fresh, threshold, (period, measure, states, shown))
        exposed, narrow = exposed + max(len(done.exposed), left), narrow + len(done.narrow)
        if measure == "person_years":
            few = {key: done.hidden[slot] for key, slot in of.keys().items()}
        begin = expected(of, done.hidden, max(threshold / 2, 1.0))
        stand = stand_ins(of, done.hidden, equations(of), begin=begin)
        found |= by_schedule(of, period, measure, done.hidden, stand)
    found |= _of_the_same_people(cells, found)
    return State(areas, cells, found, Unprotected(exposed, narrow))


def kept_secret(
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


def small(of: Block, threshold: float, *, zeros: bool) -> Bools:
    """Counts from 1 to one below the threshold, and nil unless `zeros` are shown, [slot, sex]."""
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


def by_schedule(
    of: Block, period: str, measure: str, hidden: Bools, stand: Array
) -> dict[Key, Hidden]:
    """What is withheld, [slot, sex], and what stands in for it, by schedule."""
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
