"""People on 1 January made people at risk: the mean of this 1 January and the next."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from server.intake.cells import Ints, parts_of
from server.intake.forms.found import Found
from server.intake.schedules import DECIMALS, Aside, Block


@dataclass(frozen=True, slots=True)
class Averaged:
    blocks: tuple[Block, ...]
    asides: tuple[Aside, ...]
    found: tuple[Found, ...]


def averaged(blocks: Sequence[Block], asides: Sequence[Aside]) -> Averaged:
    """Person-years of year t = (people on 1 January t + people on 1 January t + 1) / 2, for each
    area, sex and age, in the age groups that both have. Deaths and births stay as they are.

    Missing: the last 1 January of a series, and one with none the year after, give no year.
    Source:  Preston, Heuveline & Guillot (2001), Demography, ch. 1.
    """
    people = [block for block in blocks if block.measure == "person_years"]
    kept = [block for block in blocks if block.measure != "person_years"]
    found: list[Found] = []
    begins, next_ones, last = _pairs(people)
    for one, other in dict.fromkeys(zip(begins[:, 1], next_ones[:, 1], strict=True)):
        both = (begins[:, 1] == one) & (next_ones[:, 1] == other)
        first = people[one].pick(begins[both, 2])
        second = people[other].pick(next_ones[both, 2])
        grid = first.grid.common(second.grid)
        if not first.grid == second.grid == grid:
            found += _regrouped(first, ", ".join(grid.labels))
        first, second = first.regroup(grid), second.regroup(grid)
        mean = np.round((first.values + second.values) / 2, DECIMALS)
        provisional = first.provisional | second.provisional
        kept.append(replace(first, values=mean, provisional=provisional))
    found += _without_next(people, last)
    if people and not len(begins):
        found = [Found("one_january", people[0].fault(people[0].row, {}))]
    return Averaged(tuple(kept), tuple(map(_mean_aside, asides)), tuple(found))


def _pairs(blocks: Sequence[Block | Aside]) -> tuple[Ints, Ints, Ints]:
    """[line, (place, block, line of the block)]: those with a 1 January the year after, that one,
    and those without."""
    rows = [
        np.column_stack(
            [block.place, np.full(len(block.place), number), np.arange(len(block.place))]
        )
        for number, block in enumerate(blocks)
    ]
    at = np.concatenate([np.zeros((0, 3), np.int64), *rows])
    at = at[np.argsort(at[:, 0], kind="stable")]
    followed = np.append(at[1:, 0] == at[:-1, 0] + 1, np.zeros(min(len(at), 1), bool))
    return at[followed], at[np.flatnonzero(followed) + 1], at[~followed]


def _without_next(blocks: Sequence[Block], last: Ints) -> Iterator[Found]:
    years = parts_of(last[:, 0])[2]
    for year in np.unique(years).tolist():
        for number, block in enumerate(blocks):
            lines = last[(years == year) & (last[:, 1] == number), 2]
            if len(lines):
                rows = block.row[lines].ravel()
                yield Found("last_january", block.fault(rows, {"year": str(year)}))


def _regrouped(block: Block, groups: str) -> list[Found]:
    years = np.unique(parts_of(block.place)[2])
    values = {"years": ", ".join(map(str, years.tolist())), "groups": groups}
    return [Found("january_groups_differ", block.fault(block.row, values))]


def _mean_aside(aside: Aside) -> Aside:
    if aside.measure != "person_years":
        return aside
    begins, next_ones, _ = _pairs([aside])
    first, second = aside.pick(begins[:, 2]), aside.pick(next_ones[:, 2])
    return replace(
        first,
        values=(first.values + second.values) / 2,
        provisional=first.provisional | second.provisional,
    )
