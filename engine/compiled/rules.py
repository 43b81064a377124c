"""What the kernels must know of a grid and of its settings' first-year rules."""

from typing import NamedTuple

import numpy as np

from engine.ages import AgeGrid, Array
from engine.compiled.jit import compiled
from engine.settings import Settings
from engine.stages.separation import (
    CHILD,
    FIRST_YEAR,
    Pieces,
    has_child_group,
    has_first_year,
)
from engine.stages.smoothing import adult_groups

PIECES = 3  # of the rule with most of them


class Rules(NamedTuple):
    """Ages and rules of one chain. The open group is closed by 1 / m, the others at half their
    width, but for those that a rule by the infant rate is for."""

    starts: Array  # [age]
    widths: Array  # [age]; 0 for the open group
    first: Array  # [sex, piece, 3]: (infant rate from which, intercept, slope); no piece, no rule
    child: Array  # the same for ages 1 to 4
    per_year: Array  # [age]; one over the width, 0 for the open group
    adult_widths: Array  # [age]; nan for groups whose deaths do not count for the mode
    adults: int  # how many groups count
    at_65: int  # position of the group that begins at 65; -1 where none does


def rules(grid: AgeGrid, settings: Settings) -> Rules:
    none, adult = np.empty((2, 0, 3)), np.zeros(len(grid), bool)
    adult[adult_groups(grid)] = True
    first, child = FIRST_YEAR[settings.first_year], CHILD[settings.child]
    return Rules(
        np.array(grid.starts, float),
        np.append(grid.widths[:-1], 0.0),
        _pieces(first) if has_first_year(grid) else none,
        _pieces(child) if has_child_group(grid) else none,
        1 / grid.widths,
        np.where(adult, grid.widths, np.nan),
        int(adult.sum()),
        grid.position(65) if grid.has(65) else -1,
    )


def _pieces(rule: tuple[Pieces, Pieces]) -> Array:
    """Of one length, so that a choice among them is no loop."""
    more = ((np.inf, 0.0, 0.0),) * PIECES
    return np.array([(*pieces, *more)[:PIECES] for pieces in rule], float)


@compiled
def by_infant_rate(
    pieces: Array, m0: float, women: float, men: float, times_women: float, times_men: float
) -> tuple[float, float]:
    """Mean of the sexes' rules and its derivative in m0; their weights and the ratios of their
    rates to m0."""
    first, bend = _of_sex(pieces[0], times_women * m0)
    second, slope = _of_sex(pieces[1], times_men * m0)
    return women * first + men * second, women * times_women * bend + men * times_men * slope


@compiled
def _of_sex(pieces: Array, rate: float) -> tuple[float, float]:
    intercept, slope = pieces[0, 1], pieces[0, 2]
    for k in range(1, PIECES):
        above = rate >= pieces[k, 0]
        intercept = pieces[k, 1] if above else intercept
        slope = pieces[k, 2] if above else slope
    return intercept + slope * rate, slope
