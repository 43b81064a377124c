"""What a population's numbers would be at other death rates: changed by a percentage, or those of
another population, at chosen ages, sexes and causes."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.causes.counts import CauseCounts
from engine.chain import Chain
from engine.panel import BIRTHS, Panel

SEXES = ("f", "m")  # in the order of Panel.infant_weight


@dataclass(frozen=True, slots=True)
class Parts:
    """Deaths of a population in parts that add up to them: by cause, or by sex and cause."""

    deaths: Array  # [..., part, age]
    counts: Array  # [..., part, age], those counted, in which chance is
    exposure: Array  # [..., part, age], person-years of the sex they are of
    sexes: tuple[str, ...]  # of each part; empty: of no sex of its own

    @classmethod
    def of(cls, panel: Panel, causes: CauseCounts | None = None, *, sex: str = "") -> "Parts":
        """The causes of one panel, or all its deaths as one part."""
        by = causes or CauseCounts(panel.deaths[..., None, :], panel.counts[..., None, :])
        deaths, counts, exposure = np.broadcast_arrays(
            by.deaths, by.counts, panel.exposure[..., None, :]
        )
        return cls(deaths, counts, exposure, (sex,) * deaths.shape[-2])

    @classmethod
    def together(cls, several: "Sequence[Parts]") -> "Parts":
        """Parts of several populations beside one another."""
        deaths, counts, exposure = (
            np.concatenate([getattr(one, name) for one in several], axis=-2)
            for name in ("deaths", "counts", "exposure")
        )
        return cls(deaths, counts, exposure, tuple(sex for one in several for sex in one.sexes))

    def over(self, change: Callable[[Any], Any]) -> "Parts":
        """Every array changed alike, where the change is one of the leading axes only."""
        return Parts(change(self.deaths), change(self.counts), change(self.exposure), self.sexes)

    @property
    def worth(self) -> Array:
        """Deaths that each one counted stands for; 1 where none was."""
        with np.errstate(all="ignore"):
            return np.where(self.counts > 0, self.deaths / self.counts, 1.0)

    @property
    def rates(self) -> Array:
        """Deaths of each part over its person-years; nan where there are none."""
        with np.errstate(all="ignore"):
            return self.deaths / np.where(self.exposure > 0, self.exposure, np.nan)


@dataclass(frozen=True, slots=True)
class Benchmark:
    """Another population's deaths in the same parts, and where its rates take the place of own."""

    parts: Parts
    where: NDArray[np.bool_]  # [..., part, age]
    shared: Array  # [..., part, age], counts that stand in both populations

    def over(self, change: Callable[[Any], Any]) -> "Benchmark":
        """Every array changed alike, where the change is one of the leading axes only."""
        return Benchmark(self.parts.over(change), change(self.where), change(self.shared))


@dataclass(frozen=True, slots=True)
class Change:
    """Other death rates: a benchmark's where one is named, and all of them times a factor."""

    factor: Array  # [..., part, age]; 1: as they are
    benchmark: Benchmark | None = None

    def over(self, change: Callable[[Any], Any]) -> "Change":
        """Every array changed alike, where the change is one of the leading axes only."""
        lender = None if self.benchmark is None else self.benchmark.over(change)
        return Change(change(self.factor), lender)

    def lent(self) -> NDArray[np.bool_]:
        """Where a benchmark's rate stands in place of the own one: where it has one."""
        if self.benchmark is None:
            return np.zeros(self.factor.shape, np.bool_)
        return self.benchmark.where & np.isfinite(self.benchmark.parts.rates)

    def deaths(self, parts: Parts) -> Array:
        """Deaths there would be among the same person-years, [..., part, age]."""
        own = parts.deaths
        if self.benchmark is not None:
            rates = np.where(self.lent(), self.benchmark.parts.rates, 0.0)
            own = np.where(self.lent(), rates * parts.exposure, own)
        return np.asarray(self.factor * own)


def factor(percents: Array, cells: NDArray[np.bool_], of: tuple[int, int] | None = None) -> Array:
    """What the rates are multiplied by: changes of so many per cent that meet in a cell multiply,
    in any order.

    Shape: percents [change], cells [change, part, age] -> [part, age].
    >>> some = np.array([[[True, True]], [[False, True]]])
    >>> factor(np.array([-20.0, -50.0]), some).round(3)
    array([[0.8, 0.4]])
    """
    each = 1 + np.asarray(percents, float)[:, None, None] / 100
    return np.asarray(np.prod(np.where(cells, each, 1.0), axis=0))


def changed(panel: Panel, parts: Parts, change: Change) -> Panel:
    """The population at the changed death rates, its person-years as they are.

    Deaths before 28 days move as those of the first year do; stillbirths and births stay. Where
    women and men are parts, the mix by which persons take their first-year rule follows.

    Shape:   panel [..., age]; the batches of panel, parts and change broadcast.
    Missing: nan in, nan out.
    """
    then = change.deaths(parts)
    fewer = in_order(parts.deaths - then)
    none = in_order(np.abs(then)) == 0
    deaths = np.where(none, 0.0, np.maximum(panel.deaths - fewer, 0.0))
    batch = deaths.shape[:-1]
    wide = panel.over(lambda array: np.broadcast_to(array, (*batch, array.shape[-1])))
    with np.errstate(all="ignore"):
        infants = np.where(panel.deaths[..., 0] > 0, deaths[..., 0] / panel.deaths[..., 0], 1.0)
    births = np.array(wide.births)
    births[..., BIRTHS.index("neonatal_deaths")] *= infants
    weight, ratio = _mix(wide, parts, then)
    return replace(
        wide, deaths=deaths, births=births, infant_weight=weight, infant_ratio=ratio, counted=None
    )


def in_order(by_part: Array) -> Array:
    """The sum over parts, one after another whatever the memory's order: [..., part, age] ->
    [..., age]."""
    return np.asarray(np.cumsum(by_part, axis=-2)[..., -1, :])


def _mix(panel: Panel, parts: Parts, then: Array) -> tuple[Array, Array]:
    """Share of infant deaths and relative rate of women and men, moved as their deaths move."""
    if not set(SEXES) <= set(parts.sexes):
        return panel.infant_weight, panel.infant_ratio
    now, moved = (_first_year(parts, deaths) for deaths in (parts.deaths, then))
    return (
        panel.infant_weight + (moved[0] - now[0]),
        panel.infant_ratio + (moved[1] - now[1]),
    )


def _first_year(parts: Parts, deaths: Array) -> tuple[Array, Array]:
    """As `Panel.persons` has them, from deaths [..., part, age]."""
    of = [np.array([one == sex for one in parts.sexes]) for sex in SEXES]
    infant = np.stack([in_order(deaths[..., sex, :1])[..., 0] for sex in of], axis=-1)
    years = np.stack([parts.exposure[..., int(np.argmax(sex)), 0] for sex in of], axis=-1)
    total = infant.sum(axis=-1, keepdims=True)
    with np.errstate(all="ignore"):
        weight = np.where(total > 0, infant / total, 0.5)
        ratio = (infant / years) / (total / years.sum(axis=-1, keepdims=True))
    return weight, np.where(np.isfinite(ratio), ratio, 1.0)


def years_left(chain: Chain) -> Array:
    """Years that those who die in each group would have had left at the rates there are: between
    e(x) and e(x+n), as far along as they lived in the group. In the open group e(x); where a law
    spreads it, the mean over its ages by deaths.

    Shape:   chain [...] -> [..., age] on the grid of its panel.
    Source:  Vaupel & Canudas-Romo (2003), Demography 40, 201-216 (years lost by deaths).
    """
    table, groups = chain.table, len(chain.panel.grid)
    with np.errstate(all="ignore"):
        lived = table.ax[..., :-1] / table.grid.widths[:-1]
        within = (1 - lived) * table.ex[..., :-1] + lived * table.ex[..., 1:]
        left = np.concatenate([within, table.ex[..., -1:]], axis=-1)
        above = table.dx[..., groups - 1 :]
        last = (above * left[..., groups - 1 :]).sum(axis=-1) / above.sum(axis=-1)
    return np.concatenate([left[..., : groups - 1], last[..., None]], axis=-1)
