"""Where closing the gap to a benchmark adds most: by age and cause, beside what chance alone would
show were all areas alike.

Shapes: deaths by cell are [..., cause, age], person-years [..., age], of many areas at once.
"""

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import betainc

from engine.ages import Array
from engine.streams import poisson_draws

FIRST = 5  # places among which a cell is looked for
DRAWS = 400
ALIKE = "gaps if all areas were alike"  # purposes of streams
RANKS = "ranks of gaps"
SHARE = 1 / 3  # of the areas that are large enough: those that live longest are the benchmark
ROUNDING = 1e-9

Codes = NDArray[np.str_]


class Counted(NamedTuple):
    """Deaths by cell [..., cause, age] among person-years [..., age]."""

    deaths: Array
    exposure: Array
    counted: Array | None = None  # those in which chance is, as `CauseCounts`; None: all deaths

    @property
    def counts(self) -> Array:
        """None where those counted were all given to other causes."""
        return self.deaths if self.counted is None else np.where(self.deaths > 0, self.counted, 0.0)

    @property
    def worth(self) -> Array:
        """Deaths that each one counted stands for; 1 where none was."""
        with np.errstate(all="ignore"):
            return np.where(self.counts > ROUNDING, self.deaths / self.counts, 1.0)

    @property
    def rates(self) -> Array:
        """[..., cause, age]; nan without person-years."""
        with np.errstate(all="ignore"):
            lived = np.where(self.exposure > 0, self.exposure, np.nan)
            return np.asarray(self.deaths / lived[..., None, :])

    def less(self, other: "Counted") -> "Counted":
        """What is left without these."""
        return Counted(
            np.maximum(self.deaths - other.deaths, 0.0),
            np.maximum(self.exposure - other.exposure, 0.0),
            np.maximum(self.counts - other.counts, 0.0),
        )

    def plus(self, other: "Counted") -> "Counted":
        return Counted(
            self.deaths + other.deaths,
            self.exposure + other.exposure,
            self.counts + other.counts,
        )


def chosen(value: Array, lived: Array, least: float, *, share: float = SHARE) -> NDArray[np.bool_]:
    """The areas that make the benchmark: of those with enough person-years the share with the
    highest value, at least one. Equal ones at the edge are all taken, so that the order of the
    areas does not matter.

    Shape:   value, lived [..., area] -> [..., area].
    Missing: an area without a value is not chosen.
    >>> chosen(np.array([80.0, 82.0, 81.0, 90.0]), np.array([9.0, 9.0, 9.0, 1.0]), 5.0)
    array([False,  True, False, False])
    """
    fit = np.where((lived >= least) & np.isfinite(value), value, -np.inf)
    wanted = np.ceil(share * np.isfinite(fit).sum(axis=-1, keepdims=True) - ROUNDING).astype(int)
    ordered = -np.sort(-fit, axis=-1)
    edge = np.take_along_axis(ordered, np.maximum(wanted - 1, 0), axis=-1)
    return np.asarray((fit >= edge) & np.isfinite(fit))


@dataclass(frozen=True, slots=True)
class Sides:
    """An area and the benchmark, nobody counted twice: those of the area alone, those of the
    benchmark alone, and those of both, as where the area is one of the benchmark's."""

    alone: Counted
    others: Counted
    both: Counted

    @classmethod
    def of(cls, own: Counted, benchmark: Counted, both: Counted) -> "Sides":
        """From the area and the benchmark, each whole."""
        return cls(own.less(both), benchmark.less(both), both)

    @property
    def own(self) -> Counted:
        return self.alone.plus(self.both)

    @property
    def benchmark(self) -> Counted:
        return self.others.plus(self.both)


def excess(own: Counted, benchmark: Counted) -> Array:
    """By how much the own rate lies above the benchmark's; 0 where it does not."""
    with np.errstate(invalid="ignore"):
        above = own.rates - benchmark.rates
    return np.asarray(np.maximum(above, 0.0))


def by_chance(sides: Sides) -> Array:
    """As `surplus`: the area against the others of the benchmark; where it has no people but
    those of both, or the benchmark has not, these are its own."""
    apart = sides.alone.exposure.sum(axis=-1) > 0, sides.others.exposure.sum(axis=-1) > 0
    own = _either(apart[0], sides.alone, sides.both)
    others = _either(apart[1], sides.others, sides.both)
    none = ~(apart[0] | apart[1])
    return np.where(none[..., None, None], 1.0, surplus(own, others))


def _either(first: NDArray[np.bool_], one: Counted, other: Counted) -> Counted:
    return Counted(
        np.where(first[..., None, None], one.deaths, other.deaths),
        np.where(first[..., None], one.exposure, other.exposure),
        np.where(first[..., None, None], one.counts, other.counts),
    )


def surplus(own: Counted, others: Counted) -> Array:
    """The chance of so many deaths of the own, or more, of those of both together, were the rates
    equal: of d + D deaths each is of the own with the chance N / (N + M) of its person-years. Where
    each one counted stands for k deaths (K of the others), N / k and M / K take their place.

    Shape:   [..., cause, age]; the two count nobody twice.
    Missing: 1 where nobody died in the own, or either has no person-years.
    Source:  Przyborowski & Wilenski (1940), Homogeneity of results in testing samples from Poisson
             series, Biometrika 31, 313-323.
    >>> one = Counted(np.array([[9.0]]), np.array([100.0]))
    >>> surplus(one, Counted(np.array([[1.0]]), np.array([100.0]))).round(6)
    array([[0.010742]])
    """
    # where one of the two counted none, what each stands for is that of the other
    each = np.where(own.counts > ROUNDING, own.worth, others.worth)
    theirs = np.where(others.counts > ROUNDING, others.worth, own.worth)
    with np.errstate(all="ignore"):
        lived, beside = own.exposure[..., None, :] / each, others.exposure[..., None, :] / theirs
        chance = betainc(own.counts, others.counts + 1, lived / (lived + beside))
    known = (own.counts > 0) & (own.exposure > 0)[..., None, :]
    return np.where(known & (others.exposure > 0)[..., None, :], chance, 1.0)


def clear(chance: Array, level: float) -> NDArray[np.bool_]:
    """Which of all these are named, so that with the chance `level` none is named, in any area,
    that chance alone brought about: from the smallest on, as long as the i-th is at most
    (1 - level) over those not yet looked at.

    Shape:   any -> the same; all cells of all areas are one family.
    Source:  Holm (1979), A simple sequentially rejective multiple test procedure, Scandinavian
             Journal of Statistics 6, 65-70.
    >>> clear(np.array([0.001, 0.2, 0.02, 0.9]), 0.95)
    array([ True, False, False, False])
    """
    ordered = np.sort(chance, axis=None)
    over = np.flatnonzero(ordered > (1 - level) / np.arange(ordered.size, 0, -1))
    named = int(over[0]) if over.size else ordered.size
    return np.asarray(chance <= ordered[named - 1]) if named else np.zeros(chance.shape, bool)


def to_first_order(slopes: Array, above: Array) -> Array:
    """What a number gains where each rate alone falls by what it lies above: minus its derivative
    by the rate of all causes times that. slopes [..., age] -> [..., cause, age]."""
    with np.errstate(invalid="ignore"):
        return np.asarray(np.where(above == 0, 0.0, -slopes[..., None, :] * above))


@dataclass(frozen=True, slots=True)
class Alike:
    """Gains that chance alone shows where all areas have the same rates."""

    expected: Array  # [..., cause, age], the mean gain of a cell
    total: Array  # [...], of all cells together
    total_most: Array  # [...], that all together stay below in 95 of 100
    largest: Array  # [...], that the largest of a population's cells stays below in 95 of 100


def alike(sides: Sides, rates: Array, slopes: Array, codes: Codes) -> Alike:
    """What gaps look like if area and benchmark have these rates and chance does the rest.

    Shape:   sides [...], rates [cause, age], slopes [..., age], codes [..., 3] of the streams of
             those alone, the others and both -> as `Alike`.
    """

    def at_these(one: Counted) -> Counted:
        deaths = np.nan_to_num(rates * one.exposure[..., None, :])
        return Counted(deaths, one.exposure, deaths / one.worth)

    same = Sides(*(at_these(one) for one in (sides.alone, sides.others, sides.both)))
    gains = _drawn(same, slopes, codes, ALIKE)
    cells = gains.reshape(*gains.shape[:-2], -1)
    total = cells.sum(axis=-1)
    most = (np.quantile(of, 0.95, axis=0) for of in (total, cells.max(axis=-1)))
    return Alike(_mean(gains), _mean(total), *most)


def among_first(sides: Sides, slopes: Array, codes: Codes, *, first: int = FIRST) -> Array:
    """The chance that a cell is among the first by its gain, had chance dealt the deaths anew: the
    share of draws about the counts there are in which fewer than `first` cells gain more, and it
    gains at all.

    Shape: as `alike` -> [..., cause, age].
    """
    gains = _drawn(sides, slopes, codes, RANKS)
    cells = gains.reshape(*gains.shape[:-2], -1)
    places = min(first, cells.shape[-1])
    edge = -np.sort(-cells, axis=-1)[..., places - 1 : places]
    inside = (cells >= edge) & (cells > 0)
    return _mean(inside.astype(float)).reshape(gains.shape[1:])


def _drawn(sides: Sides, slopes: Array, codes: Codes, purpose: str) -> Array:
    """Gains of deaths as chance might have had them, [draw, ..., cause, age]."""
    drawn = []
    for place, one in enumerate((sides.alone, sides.others, sides.both)):
        cells = np.nan_to_num(one.counts)
        if cells.any():
            flat = cells.reshape(*cells.shape[:-2], -1)
            streams = np.broadcast_to(codes[..., place], flat.shape[:-1])
            cells = poisson_draws(flat, streams, DRAWS, purpose).reshape(DRAWS, *cells.shape)
        drawn.append(Counted(cells * one.worth, one.exposure))
    found = Sides(*drawn)
    gains = to_first_order(slopes, excess(found.own, found.benchmark))
    return np.where(np.isfinite(gains), gains, 0.0)


def _mean(draws: Array) -> Array:
    """Over the first axis, in its order."""
    return np.asarray(np.cumsum(draws, axis=0)[-1] / len(draws))
