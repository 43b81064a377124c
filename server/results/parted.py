"""A population in parts by sex and cause, as changes of its death rates need it."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from functools import reduce

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid
from engine.panel import Panel
from engine.whatif import SEXES, Parts
from server.results.holdings import Holdings
from server.results.keys import PopulationYear
from server.results.loading import Found, Loaded, Shared, overlap
from server.store.records import Cause

NEAR = 1e-9  # relative; so far women and men may be from persons, by the rounding of sums


@dataclass(frozen=True, slots=True)
class Parted:
    """A population on a grid, and the same in parts."""

    panel: Panel
    parts: Parts  # of each sex in turn all its causes
    causes: tuple[Cause, ...]  # those of a sex, in order; empty: all causes are one part


def members(of: PopulationYear) -> tuple[PopulationYear, ...]:
    """Of persons women and men."""
    return tuple(replace(of, sex=sex) for sex in SEXES) if of.sex == "p" else ()


def wanted(
    of: PopulationYear, other: PopulationYear | None, held: Holdings, years: int
) -> tuple[PopulationYear | Shared, ...]:
    """What is to be loaded of a population and of one whose rates it may take: themselves, women
    and men of persons, and whom both count."""
    asked: list[PopulationYear | Shared] = [of, *members(of)]
    if other is not None:
        asked += [other, *members(other)]
        pairs = [(one, two) for one in (of, *members(of)) for two in (other, *members(other))]
        both = (overlap(one, two, held.areas, years) for one, two in pairs)
        asked += [one for one in both if one is not None]
    return tuple(dict.fromkeys(asked))


def shared_grid(found: Found, of: Iterable[PopulationYear | Shared]) -> AgeGrid:
    """The finest to which all of these can be summed."""
    return reduce(AgeGrid.common, (found[one].panel.grid for one in of if one in found))


def by_sex(of: PopulationYear, found: Found) -> tuple[PopulationYear, ...]:
    """Women and men, where persons are they together; else the population itself."""
    both = [found[one] for one in members(of) if one in found]
    if len(both) < 2:
        return (of,)
    grid = reduce(AgeGrid.common, (one.panel.grid for one in (*both, found[of])))
    sums = sum(one.panel.regroup(grid).deaths for one in both)
    together = np.allclose(sums, found[of].panel.regroup(grid).deaths, rtol=NEAR, atol=1e-6)
    return members(of) if together else (of,)


def parted(of: PopulationYear, found: Found, grid: AgeGrid, *, causes: bool) -> Parted:
    """The population in its parts on a grid; `causes`: whether each is parted by cause."""
    listed = found[of].causes if causes else None
    whose = by_sex(of, found)
    several = [parts_of(found[one], grid, causes=causes) for one in whose]
    if len(whose) > 1:
        several = [
            replace(parts, sexes=(sex,) * len(parts.sexes))
            for parts, sex in zip(several, SEXES, strict=True)
        ]
    return Parted(
        found[of].panel.regroup(grid),
        Parts.together(several),
        () if listed is None else listed.list,
    )


def parts_of(loaded: Loaded, grid: AgeGrid, *, causes: bool) -> Parts:
    """The causes of one population, or all its deaths as one part."""
    own = loaded.panel.grid
    panel = loaded.panel.regroup(grid)
    if not causes or loaded.causes is None:
        return Parts.of(panel)
    return Parts.of(panel, loaded.causes.counts.regroup(own, grid))


def hidden(loaded: Loaded, grid: AgeGrid, *, causes: bool) -> NDArray[np.bool_]:
    """Cells of one population, [cause, age], whose deaths only stand in for withheld ones."""
    of_ages = loaded.withheld_on(grid)[None]
    if not causes or loaded.causes is None:
        return of_ages
    own = loaded.causes.withheld
    if own is None:
        return np.broadcast_to(of_ages, (len(loaded.causes.list), len(grid)))
    starts = [loaded.panel.grid.position(start) for start in grid.starts]
    return np.asarray(np.logical_or.reduceat(own, starts, axis=-1) | of_ages)


def hidden_causes(loaded: Loaded, grid: AgeGrid, listed: Sequence[Cause]) -> NDArray[np.bool_]:
    """As `hidden`, for the causes of a list; those that the population has no deaths of are not."""
    if loaded.causes is None:
        return np.broadcast_to(loaded.withheld_on(grid), (len(listed), len(grid)))
    cells = hidden(loaded, grid, causes=True)
    place = {cause.code: at for at, cause in enumerate(loaded.causes.list)}
    none = np.zeros(len(grid), bool)
    return np.array([cells[place[one.code]] if one.code in place else none for one in listed])


def have_causes(found: Found, of: Sequence[PopulationYear]) -> bool:
    """Whether all of these are parted by the same causes."""
    lists = [found[one].causes for one in of if one in found]
    known = [one.list for one in lists if one is not None]
    return bool(known) and len(known) == len(lists) and len(set(known)) == 1
