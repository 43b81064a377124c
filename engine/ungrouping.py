"""Single ages from counts in age groups.

Two ways: `interpolated` draws a monotone curve through the cumulated counts, and each group's sum
stays as it is; `ungrouped` looks for the smoothest curve of counts or rates whose sums the counts
are likely to come from, and says how sure it is of each age. Infants are kept as counted where
age 0 is a group of its own. Arrays inside this file are [age or group, row].
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import PchipInterpolator

from engine.ages import AgeGrid, Array
from engine.banded import added, inner, inverse, roughness, solve, total

PENALTIES = 10.0 ** np.arange(-1.0, 8.5, 0.5)
CRITERIA: dict[str, Callable[[int], float]] = {"aic": lambda groups: 2.0, "bic": np.log}
ORDER = 2
STEPS = 200  # of Fisher scoring
LONGEST_STEP = 1.0  # change of a logarithm
SETTLED = 1e-8


@dataclass(frozen=True, slots=True)
class Ungrouped:
    """Counts by single age as the fitted curve expects them, [..., age] from age 0 on."""

    counts: Array  # [..., age]
    log_errors: Array  # [..., age], standard errors of their logarithms
    penalty: Array  # [...]
    groups: NDArray[np.intp]  # [age], the group of each age
    given: Array  # [..., group], the counts fitted to

    @property
    def sums(self) -> Array:
        """The fitted counts in the groups, [..., group]."""
        return np.add.reduceat(self.counts, np.unique(self.groups, return_index=True)[1], axis=-1)

    @property
    def counts_kept(self) -> Array:
        """The fitted counts, scaled in each group to the sum that was given: [..., age]."""
        with np.errstate(all="ignore"):
            share = self.counts / self.sums[..., self.groups]
        return share * self.given[..., self.groups]


def interpolated(grid: AgeGrid, counts: Array, *, last: int | None = None) -> Array:
    """Counts by single age under a monotone cubic through the counts cumulated over age.

    Without `last` the open group is left out; with it, its counts lie below that age. No count is
    negative, and the sum of each group is kept.

    Shape:   counts [..., group] -> [..., age].
    Missing: nan anywhere in the groups used makes the row nan.
    Raises:  ValueError where `last` does not lie above the open age.
    Source:  Fritsch & Carlson (1980), SIAM Journal on Numerical Analysis 17, 238-246.
    >>> interpolated(AgeGrid((0, 2, 4, 6)), np.array([6.0, 6.0, 6.0, 9.0])).round(9)
    array([3., 3., 3., 3., 3., 3.])
    """
    edges = _edges(grid, last)
    used = np.asarray(counts, float)[..., : len(edges) - 1]
    holed = np.isnan(used).any(axis=-1, keepdims=True)
    reached = np.cumsum(np.where(holed, 0.0, used), axis=-1)
    reached = np.concatenate([np.zeros_like(reached[..., :1]), reached], axis=-1)
    found = np.diff(PchipInterpolator(edges, reached, axis=-1)(np.arange(edges[-1] + 1)), axis=-1)
    return np.where(holed, np.nan, np.maximum(found, 0.0))  # below 0 by rounding only


def ungrouped(
    grid: AgeGrid,
    counts: Array,
    *,
    exposure: Array | None = None,
    last: int | None = None,
    criterion: str = "aic",
) -> Ungrouped:
    """Counts by single age under the penalised composite link model.

    Counts of a group are Poisson with the mean sum E(x) exp(eta(x)) over its ages; the penalty is
    on second differences of eta, its weight the one of PENALTIES with the least deviance plus
    dimension times 2 ('aic') or log(groups) ('bic'). With person-years by single age as `exposure`
    exp(eta) is a rate, and the rates are smooth; without, the counts are. Sums of groups come near
    the counts, not onto them: `counts_kept` sets them so. The errors are Bayesian, from (X'WX +
    penalty D'D)^-1. Where the open group is left out (without `last`) nothing is read from it.

    Shape:   counts [..., group], exposure [..., age] -> [..., age].
    Missing: nan in, nan out; a row without counts beyond infants gives nan, and so does one whose
             search does not settle. A group without person-years tells nothing.
    Raises:  ValueError where `last` does not lie above the open age, where ages of exposure and
             groups differ, or where the criterion is unknown.
    Source:  Rizzi, Gampe & Eilers (2015), Efficient estimation of smooth distributions from
             coarsely grouped data, American Journal of Epidemiology 182, 138-147; Eilers (2007),
             Statistical Modelling 7, 239-254.
    """
    if criterion not in CRITERIA:
        raise ValueError(f"no criterion {criterion!r}; there are {', '.join(CRITERIA)}")
    edges = _edges(grid, last)
    groups = np.repeat(np.arange(len(edges) - 1), np.diff(edges))
    given = np.asarray(counts, float)[..., : len(edges) - 1]
    years = np.ones((*given.shape[:-1], len(groups))) if exposure is None else exposure
    if years.shape[-1] != len(groups):
        raise ValueError(
            f"exposure has {years.shape[-1]} ages but the groups {len(groups)}; give it by single "
            f"age from 0 to {len(groups) - 1}"
        )
    years = np.array(np.broadcast_to(years, (*given.shape[:-1], len(groups))))
    alone = int(edges[1] == 1)  # the fall from birth is no part of a smooth curve
    rows = _Rows(groups[alone:] - alone, _rows(given[..., alone:]), _rows(years[..., alone:]))
    with np.errstate(all="ignore"):  # rows that cannot be fitted end as nan
        found, errors, penalty = _fitted(rows, CRITERIA[criterion](len(edges) - 1))
        infants = [given[..., :alone], 1 / np.sqrt(given[..., :alone])]
    batch = given.shape[:-1]
    counts_found, log_errors = (
        np.concatenate([infant, part.T.reshape(*batch, len(part))], axis=-1)
        for infant, part in zip(infants, (found, errors), strict=True)
    )
    return Ungrouped(counts_found, log_errors, penalty.reshape(batch), groups, given)


def _edges(grid: AgeGrid, last: int | None) -> NDArray[np.intp]:
    """First ages of the groups and the age at which the last one ends."""
    if last is None:
        return np.array(grid.starts)
    if last <= grid.open_age:
        raise ValueError(f"the open group begins at {grid.open_age}; it cannot end at {last}")
    return np.array((*grid.starts, last))


@dataclass(frozen=True, slots=True)
class _Rows:
    """Counts in groups [group, row] and person-years by age [age, row]."""

    group: NDArray[np.intp]  # [age]
    counts: Array
    exposure: Array

    def take(self, where: NDArray[np.intp]) -> "_Rows":
        return _Rows(self.group, self.counts[:, where], self.exposure[:, where])

    def begin(self) -> Array:
        """Logarithm of each group's own rate, half a count added, at all its ages."""
        overall = total(self.counts) / total(self.exposure)
        years = self.summed(self.exposure)
        return np.asarray(np.log((self.counts + 0.5) / (years + 0.5 / overall))[self.group])

    def summed(self, values: Array) -> Array:
        """[age, row] -> [group, row]."""
        starts = np.unique(self.group, return_index=True)[1]
        return np.add.reduceat(values, starts, axis=0)

    def information(self, expected: Array) -> Array:
        """X'WX: ages of one group stand for one another, as bands as wide as the widest group."""
        share = expected / np.maximum(self.summed(expected), 1e-300)[self.group]
        half = int(np.bincount(self.group).max())
        bands = np.zeros((half, *expected.shape))
        for d in range(half):
            end = len(expected) - d
            same = (self.group[:end] == self.group[d:])[:, None]
            bands[d, :end] = np.where(same, share[:end] * expected[d:], 0.0)
        return bands

    def score(self, expected: Array) -> Array:
        sums = self.summed(expected)
        ratio = np.where(sums > 0, self.counts / np.where(sums > 0, sums, 1.0), 1.0)
        return np.asarray(expected * (ratio - 1)[self.group])

    def deviance(self, expected: Array) -> Array:
        sums, counts = self.summed(expected), self.counts
        logs = np.log(np.where(counts > 0, counts / sums, 1.0))
        return 2 * total(counts * logs - counts + sums)


def _fitted(rows: _Rows, price: float) -> tuple[Array, Array, Array]:
    """Counts by age, errors of their logarithms, and the penalty of the least criterion."""
    many, kept = len(PENALTIES), np.arange(rows.counts.shape[1])
    each, weight = rows.take(np.repeat(kept, many)), np.tile(PENALTIES, len(kept))
    curves = _settled(each, weight)
    expected = each.exposure * np.exp(curves)
    rough = _penalty(len(curves), weight)
    spread = inverse(added(each.information(expected), rough))
    dimension = len(curves) - inner(spread, rough)
    score = (each.deviance(expected) + price * dimension).reshape(-1, many)
    best = kept * many + np.argmin(np.where(np.isnan(score), np.inf, score), axis=1)
    return expected[:, best], np.sqrt(spread[0][:, best]), weight[best]


def _settled(rows: _Rows, weight: Array) -> Array:
    """Fisher scoring of the logarithms by age, [age, row]."""
    found = rows.begin()
    left = np.arange(found.shape[1])
    for _ in range(STEPS):
        part, rough = rows.take(left), _penalty(len(found), weight[left])
        expected = part.exposure * np.exp(found[:, left])
        bent = _product(rough, found[:, left])
        step = solve(added(part.information(expected), rough), part.score(expected) - bent)
        size = np.abs(step).max(axis=0)
        found[:, left] += step * np.minimum(1.0, LONGEST_STEP / size)
        left = left[size > SETTLED]  # nan rows stay nan
        if not left.size:
            return found
    found[:, left] = np.nan
    return found


def _penalty(size: int, weight: Array) -> Array:
    return np.asarray(roughness(size, ORDER)[:, :, None] * weight)


def _product(bands: Array, values: Array) -> Array:
    """The matrix times a column for each row."""
    found = bands[0] * values
    for d in range(1, len(bands)):
        found[:-d] += bands[d, :-d] * values[d:]
        found[d:] += bands[d, :-d] * values[:-d]
    return np.asarray(found)


def _rows(array: Array) -> Array:
    """[..., age] -> [age, row], a copy in that order."""
    return np.ascontiguousarray(array.reshape(-1, array.shape[-1]).T)
