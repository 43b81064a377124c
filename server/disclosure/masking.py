"""One mask for all that an edition holds, under the terms of its collection."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace

from engine.ages import AgeGrid
from server.disclosure.causes import Past, joined, of_causes, past
from server.disclosure.coarsening import coarsened
from server.disclosure.history import State, as_block, told
from server.disclosure.rounding import Rounding, on_coarser, rounding
from server.disclosure.withholding import of_period
from server.store.records import Area, Cause, Hidden, Key, Mask, Terms, Unprotected, Vector

Cells = Mapping[Key, Vector]
Place = tuple[str, str]  # area and period


@dataclass(frozen=True, slots=True)
class Content:
    """What an edition holds and did not show, and the terms that it was shown under."""

    areas: tuple[Area, ...]
    cells: Cells
    mask: Mask
    unprotected: Mapping[str, Unprotected] = field(default_factory=dict)
    terms: Terms = field(default_factory=Terms)
    causes: tuple[Cause, ...] = ()
    by_cause: frozenset[Place] = frozenset()  # whose deaths by cause are shown


@dataclass(frozen=True, slots=True)
class Made:
    """A mask, and which small counts of each period could not be protected as asked."""

    mask: Mask
    unprotected: Mapping[str, Unprotected]
    by_cause: frozenset[Place] = frozenset()


def mask(
    areas: tuple[Area, ...],
    cells: Cells,
    terms: Terms,
    earlier: Sequence[Content] = (),
    otherwise: Sequence[Content] = (),
    *,
    secret: str = "",
    causes: tuple[Cause, ...] = (),
) -> Made:
    """What is withheld of an edition of these areas and counts, when `earlier` editions of the
    collection were shown as they were. A year that is as in one of them is shown as there.
    `otherwise`: what other policies, the first one first, showed of the editions, which some reader
    may have kept. `secret`: what counts are rounded with. `causes`: the edition's list."""
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
    content = Content(areas, cells, found, left, terms, causes)
    return _with_causes(content, earlier, otherwise)


def _with_causes(own: Content, earlier: Sequence[Content], otherwise: Sequence[Content]) -> Made:
    """Of each area that is part of none, by year. Rounded counts have none by cause: these would
    have to add up to them. Where with those shown before they would tell a withheld number, of
    causes or of areas, none are shown."""
    found, left, shown = dict(own.mask), dict(own.unprotected), set()
    now, before, beside = ([_Tables(one) for one in ones] for ones in ((own,), earlier, otherwise))
    for place in now[0].places if own.terms.causes == "whole" else ():
        way, table = way_of(place[1], own.terms, otherwise), now[0].of(place, own.mask)
        if way.base or table is None:
            continue
        ours, others = ([p for one in ones if (p := one.shown(place))] for ones in (before, beside))
        made = of_causes(table, way, ours, others)
        mine = now[0].of(place, {**own.mask, **made.mask})
        all_of_them = [one.total(place[1]) for one in (*before, *beside, *now)]
        if mine and (ours or others) and _tells(mine, [*ours, *others], all_of_them):
            continue
        found |= made.mask
        shown.add(place)
        rest, also = left.get(place[1], Unprotected()), made.unprotected
        if also != Unprotected():
            left[place[1]] = Unprotected(rest.exposed + also.exposed, rest.narrow + also.narrow)
    return Made(found, left, frozenset(shown))


def _tells(now: Past, shown: Sequence[Past], totals: Sequence[State]) -> bool:
    """Whether causes, with all else that is shown of a year, fix more than all deaths do and than
    the causes shown before did. (The last of `totals` is of now.)"""
    if any(one.table.grid != one.whole_grid for one in (now, *shown)):
        return True  # the ages do not allow to set them beside all deaths
    blocks = [as_block(one, now.period, "deaths") for one in totals]
    causes = [joined(one) for one in shown]
    return bool(told([*blocks, *causes, joined(now)]) - told(blocks) - told(blocks[:-1] + causes))


class _Tables:
    """Counts of the areas of an edition that are part of none and have deaths by cause."""

    def __init__(self, content: Content) -> None:
        self.content = content
        self.periods: dict[str, dict[Key, Vector]] | None = None
        tops = {area.code for area in content.areas if not area.parent}
        grouped: dict[Place, dict[Key, Vector]] = {}
        if any(key.cause for key in content.cells):
            for key, vector in content.cells.items():
                if key.area in tops:
                    grouped.setdefault((key.area, key.period), {})[key] = vector
        self.cells = {
            place: cells for place, cells in grouped.items() if any(key.cause for key in cells)
        }

    @property
    def places(self) -> list[Place]:
        return sorted(self.cells)

    def of(self, place: Place, mask: Mask) -> Past | None:
        return past(self.content.causes, *place, self.cells.get(place, {}), mask)

    def total(self, period: str) -> State:
        """Counts of all areas, on the ages they are shown by."""
        if self.periods is None:
            self.periods = _periods(self.content.cells)
        hidden = _hidden_periods(self.content.mask).get(period, {})
        return _on_shown_ages(self.content.areas, self.periods.get(period, {}), hidden)

    def shown(self, place: Place) -> Past | None:
        """The table, where it was shown."""
        return self.of(place, self.content.mask) if place in self.content.by_cause else None


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
    made = of_period(areas, period, shaped, terms, _distinct(past), shown)
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
        if not key.cause:
            found.setdefault(key.period, {})[key] = hidden
    return found


def _distinct(states: Sequence[State]) -> list[State]:
    kept: list[State] = []
    for one in states:
        if not any(one.same_as(other.areas, other.cells) for other in kept):
            kept.append(one)
    return kept


def _shown_otherwise(contents: Sequence[Content]) -> dict[str, list[State]]:
    """Each period as it was shown; the same state once."""
    found: dict[str, list[State]] = {}
    for one in contents:
        masks = _hidden_periods(one.mask)
        for period, part in _periods(one.cells).items():
            state = _on_shown_ages(one.areas, part, masks.get(period, {}))
            kept = found.setdefault(period, [])
            if not any(
                state.mask == other.mask and state.same_as(other.areas, other.cells)
                for other in kept
            ):
                kept.append(state)
    return found


def _on_shown_ages(areas: tuple[Area, ...], part: Cells, hidden: Mask) -> State:
    cells = dict(part)
    for key, one in hidden.items():
        if key in cells and one.starts:
            grid, vector = AgeGrid(one.starts), cells[key]
            values = vector.grid.regroup(vector.values, grid)
            cells[key] = replace(vector, grid=grid, values=values)
    return State(areas, cells, hidden)
