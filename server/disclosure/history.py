"""What earlier editions showed of a period, and whether together they tell what each withholds."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from scipy.sparse import csr_array, identity, vstack
from scipy.sparse.linalg import splu

from engine.ages import Array
from server.disclosure.blocks import SEXES, TOTAL, Block, Bools, Ints, block
from server.disclosure.equations import equations
from server.store.records import Area, Hidden, Key, Unprotected, Vector

_DRAWS = 3
_NOTHING = 1e-7  # of a drawn change: what rounding leaves where the equations allow none


@dataclass(frozen=True, slots=True)
class State:
    """One period as an edition has it."""

    areas: tuple[Area, ...]
    cells: Mapping[Key, Vector]
    mask: Mapping[Key, Hidden]
    unprotected: Unprotected = field(default_factory=Unprotected)

    def same_as(self, areas: tuple[Area, ...], cells: Mapping[Key, Vector]) -> bool:
        """Whether it has the same tree and counts. (Status and names are no counts.)"""
        tree = {(one.code, one.parent) for one in self.areas}
        return (
            tree == {(one.code, one.parent) for one in areas}
            and self.cells.keys() == cells.keys()
            and all(
                vector.grid == cells[key].grid
                and np.array_equal(vector.values, cells[key].values, equal_nan=True)
                for key, vector in self.cells.items()
            )
        )


def withheld_before(of: Block, period: str, measure: str, states: Sequence[State]) -> Bools:
    """What an earlier edition withheld, [slot, sex]: that stays so."""
    found = np.zeros_like(of.held)
    for state in states:
        found |= _hidden(of, period, measure, state)
    return found & of.held


def _hidden(of: Block, period: str, measure: str, state: State) -> Bools:
    found = np.zeros_like(of.held)
    for place, area in enumerate(of.areas):
        for sex, code in enumerate(SEXES):
            hidden = state.mask.get(Key(area.code, code, period, measure))
            if hidden is None:
                continue
            for slot in np.flatnonzero(of.area == place).tolist():
                start, stop = int(of.start[slot]), int(of.stop[slot])
                found[slot, sex] |= any(
                    age == start
                    if TOTAL in (start, age)
                    else age >= start and (stop < 0 or age < stop)
                    for age in hidden.ages
                )
    return found


def fresh_of(of: Block, period: str, measure: str, states: Sequence[State]) -> Bools:
    """Numbers that no earlier edition has, [slot, sex]: nobody knows them yet."""
    fresh = np.ones_like(of.held)
    for state in states:
        fresh &= ~_same(of, period, measure, state)
    return fresh


def public_of(of: Block, period: str, measure: str, states: Sequence[State]) -> Bools:
    """Numbers that were shown, [slot, sex]."""
    public = np.zeros_like(of.held)
    for state in states:
        public |= _same(of, period, measure, state) & ~_hidden(of, period, measure, state)
    return public


def _same(of: Block, period: str, measure: str, state: State) -> Bools:
    """Where an edition has the same number, [slot, sex]."""
    found = np.zeros_like(of.held)
    for place, area in enumerate(of.areas):
        for sex, code in enumerate(SEXES):
            vector = state.cells.get(Key(area.code, code, period, measure))
            if vector is not None:
                rows = np.flatnonzero(of.area == place)
                found[rows, sex] = _then(of, rows, vector) == of.values[rows, sex]
    return found


def _then(of: Block, rows: Ints, vector: Vector) -> Array:
    """What a schedule held of these slots; nan where its groups do not add up to them."""
    starts = vector.grid.starts
    found = np.full(len(rows), np.nan)
    for at, slot in enumerate(rows.tolist()):
        start, stop = int(of.start[slot]), int(of.stop[slot])
        if start == TOTAL:
            found[at] = vector.values.sum()
        elif start in starts and (stop < 0 or stop in starts):
            end = len(starts) if stop < 0 else starts.index(stop)
            found[at] = vector.values[starts.index(start) : end].sum()
    return found


def leaking(of: Block, hidden: Bools, period: str, measure: str, states: Sequence[State]) -> int:
    """How many withheld numbers all states together fix that those before did not. A number
    that two editions share is taken to be known to be the same."""
    before = [as_block(state, period, measure) for state in states]
    return len(told([*before, (of, hidden)]) - told(before))


def as_block(state: State, period: str, measure: str) -> tuple[Block, Bools]:
    """What an edition had of a period and measure, and what of it was withheld."""
    then = block(state.areas, period, measure, state.cells)
    return then, _hidden(then, period, measure, state)


Name = tuple[str, int, int, int, float]  # area, start, stop, sex and number


def told(shown: Sequence[tuple[Block, Bools]]) -> set[Name]:
    """Withheld numbers that what is shown of these blocks fixes. A number of the same area, sex and
    age is one unknown wherever it stands."""
    unknowns: dict[Name, int] = {}
    known: set[int] = set()
    placed: list[tuple[csr_array, list[int]]] = []
    for of, hidden in shown:
        places = []
        for slot, area in enumerate(of.area.tolist()):
            where = (of.areas[area].code, int(of.start[slot]), int(of.stop[slot]))
            for sex in range(3):
                value = float(of.values[slot, sex]) if of.held[slot, sex] else -1.0
                places.append(unknowns.setdefault((*where, sex, value), len(unknowns)))
                if not hidden[slot, sex]:
                    known.add(places[-1])
        placed.append((equations(of).matrix, places))
    if not placed:
        return set()
    joint = csr_array(vstack([_placed(one, at, len(unknowns)) for one, at in placed]))
    open_ = np.array([at for at in range(len(unknowns)) if at not in known], int)
    fixed = set(open_[_fixed(csr_array(joint[:, open_]))].tolist())
    return {name for name, at in unknowns.items() if at in fixed}


def _placed(matrix: csr_array, places: list[int], width: int) -> csr_array:
    return csr_array(
        (matrix.data, np.array(places)[matrix.indices], matrix.indptr), (matrix.shape[0], width)
    )


def _fixed(matrix: csr_array) -> Bools:
    """Unknowns that no change allowed by the equations moves: drawn changes, projected on what they
    allow, leave them where they are."""
    rows = matrix[np.diff(matrix.indptr) > 0]
    moved = np.zeros(matrix.shape[1])
    if not rows.shape[0]:
        return moved > 0
    inner = (rows @ rows.T + 1e-10 * identity(rows.shape[0])).tocsc()
    solve = splu(inner).solve
    draw = np.random.default_rng(0)
    for _draw in range(_DRAWS):
        change = draw.uniform(0.5, 1.5, matrix.shape[1]) * draw.choice([-1, 1], matrix.shape[1])
        for _again in range(3):
            change = change - rows.T @ solve(rows @ change)
        moved = np.maximum(moved, np.abs(change))
    return np.asarray(moved < _NOTHING)
