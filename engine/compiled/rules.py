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
    return np.array(rule, float)


@compiled
def by_infant_rate(
    pieces: Array, m0: float, weight: Array, ratio: Array, t: int, r: int
) -> tuple[float, float]:
    """Mean of the sexes' rules and its derivative in m0; weight, ratio [tile, row, 2]."""
    value, bend = 0.0, 0.0
    for sex in range(2):
        share, times = weight[t, r, sex], ratio[t, r, sex]
        if share == 0:
            continue
        rate, intercept, slope = times * m0, pieces[sex, 0, 1], pieces[sex, 0, 2]
        for k in range(1, pieces.shape[1]):
            above = rate >= pieces[sex, k, 0]
            other, steeper = pieces[sex, k, 1], pieces[sex, k, 2]
            intercept, slope = other if above else intercept, steeper if above else slope
        value += share * (intercept + slope * rate)
        bend += share * times * slope
    return value, bend
