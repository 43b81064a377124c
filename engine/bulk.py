"""Jobs over whole collections: all tables, simulation for ranks, many differences, many curves.

Each job is done by compiled code where numba is installed and the settings' chain is one that the
kernels follow, and by the numpy engine in cache-sized blocks otherwise; the record says by which,
and that is part of the engine's version. The two agree to 1e-12, curves to what rounding moves a
fit. Which one works is never a
question of size, so that a figure does not depend on how much was asked for at once. Pages and
single figures are never made here.
"""

import importlib.util
import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.special import pdtr

from engine import in_place, in_place_line
from engine.ages import Array
from engine.chain import run
from engine.decomposition import Contributions
from engine.decomposition import contributions as line_integral
from engine.in_place import followed
from engine.indicators import INDICATORS
from engine.panel import Panel
from engine.settings import Settings
from engine.simulation import flat
from engine.smoothing import Basis, Curve, fit
from engine.streams import generator
from engine.tables import LifeTable

Maker = Literal["compiled", "numpy"]

NUMBERS = ("e0", "e65", "median", "mode_raw", "edagger", "H", "gini", "sd0")
COLUMNS = in_place.COLUMNS
CELLS = 65_536  # of a column in a block: half a megabyte
MOST = 900.0  # mean up to which counts are drawn by the table of their distribution


@dataclass(frozen=True, slots=True)
class Tables:
    """Life tables [..., age] and NUMBERS read off each [...], as `indicator.value` reads them:
    whether one may be given is for `engine.reasons`."""

    table: LifeTable
    numbers: dict[str, Array]
    version: str


@dataclass(frozen=True, slots=True)
class Expectancies:
    """e0 of simulated tables, [draw, ...]."""

    e0: Array
    version: str


@dataclass(frozen=True, slots=True)
class Explained:
    """Differences in e0 by age."""

    contributions: Contributions
    version: str


@dataclass(frozen=True, slots=True)
class Curves:
    """Smooth curves of log rates."""

    curve: Curve
    version: str


def maker(settings: Settings | None = None) -> Maker:
    """Who does a job under these settings where nobody is named."""
    if importlib.util.find_spec("numba") is None:
        return "numpy"
    return "compiled" if settings is None or followed(settings) else "numpy"


def version(by: Maker) -> str:
    """What made a figure, for the engine's version."""
    if by == "numpy":
        return f"numpy {np.__version__}"
    from engine.compiled.jit import VERSION

    return VERSION


def tables(panel: Panel, settings: Settings, *, by: Maker | None = None) -> Tables:
    """All life tables of a panel and eight numbers off each.

    Shape:   panel [..., age] -> columns [..., age], numbers [...].
    Missing: as in `engine.chain.run` and the indicators' own values.
    Raises:  ValueError where compiled code is asked for and cannot follow the settings.
    """
    by, batch = _chosen(by, settings), panel.batch_shape
    if by == "compiled":
        from engine.compiled import tables as kernel
        from engine.compiled.rules import rules

        found, read = kernel.tables(rules(panel.grid, settings), *_rows(panel))
        columns = dict(zip(COLUMNS, (part.reshape(*batch, -1) for part in found), strict=True))
        numbers = {key: read[:, k].reshape(batch).copy() for k, key in enumerate(NUMBERS)}
        return Tables(LifeTable(panel.grid, **columns), numbers, version(by))
    rows, count = flat(panel), math.prod(batch)
    grid = run(rows[:1], settings).table.grid  # a law's is longer than the panel's
    columns = {name: np.empty((count, len(grid))) for name in COLUMNS}
    numbers = {key: np.empty(count) for key in NUMBERS}
    fill(rows, settings, columns, numbers)
    columns = {name: column.reshape(*batch, len(grid)) for name, column in columns.items()}
    numbers = {key: values.reshape(batch) for key, values in numbers.items()}
    return Tables(LifeTable(grid, **columns), numbers, version(by))


def fill(
    rows: Panel, settings: Settings, columns: dict[str, Array], numbers: dict[str, Array]
) -> None:
    """Tables of populations in a row, by the numpy engine, into columns [row, age] and numbers
    [row] that are there already."""
    which = np.arange(len(rows.deaths))
    if followed(settings):
        which = np.flatnonzero(~in_place.fill(rows, settings, columns, numbers))
    _through_the_chain(rows, settings, columns, numbers, which)


def _through_the_chain(
    rows: Panel,
    settings: Settings,
    columns: dict[str, Array],
    numbers: dict[str, Array],
    which: NDArray[np.intp],
) -> None:
    for where in _blocks(len(which), len(rows.grid)):
        places = which[where]
        chain = run(rows[places], settings)
        for name, column in columns.items():
            column[places] = getattr(chain.table, name)
        with np.errstate(all="ignore"):
            for key, values in numbers.items():
                values[places] = INDICATORS[key].value(chain)


def simulated(
    panel: Panel,
    settings: Settings,
    streams: NDArray[np.str_],
    *,
    draws: int,
    purpose: str,
    by: Maker | None = None,
) -> Expectancies:
    """e0 of tables of simulated deaths, each cell Poisson with the observed count as its mean.

    A mean up to MOST is drawn as the least count whose cumulated chance is above a uniform number,
    a larger one by numpy's generator. The numbers are those of the population's own stream: the
    same alone, in a batch, and in any order. They are not those of `engine.streams.poisson_draws`.

    Shape:   panel [..., age], streams [...] -> [draw, ...].
    Missing: nan where a count is nan, and where the drawn open group has no deaths.
    Raises:  ValueError as in `tables`, or where streams and populations do not match.
    Source:  Devroye (1986), Non-Uniform Random Variate Generation, chapter III.2 (inversion).
    """
    by = _chosen(by, settings)
    if np.shape(streams) != panel.batch_shape:
        raise ValueError(
            f"streams have shape {np.shape(streams)} but the populations {panel.batch_shape}; "
            "give one code for each population"
        )
    rows, names = flat(panel), np.asarray(streams).ravel().tolist()
    found = np.empty((draws, len(names)))
    counts, worth = rows.counts, rows.worth
    if by == "compiled":
        from engine.compiled.chance import Sampler
        from engine.compiled.rules import rules

        sampler = Sampler(rules(panel.grid, settings), draws)
        for row, code in enumerate(names):  # a keyed stream is one population's
            deaths = _drawn(counts[row], generator(purpose, code), draws, sampler.counts)
            if worth is not None:
                deaths *= worth[row][:, None]
            found[:, row] = sampler.expectancies(
                deaths, rows.exposure[row], rows.infant_weight[row], rows.infant_ratio[row]
            )
    else:
        for row, code in enumerate(names):
            deaths = _drawn(counts[row], generator(purpose, code), draws, _counts)
            if worth is not None:
                deaths *= worth[row][:, None]
            chain = run(_copies(rows[row], deaths.T), settings)
            found[:, row] = chain.table.ex[:, 0]
    return Expectancies(found.reshape(draws, *panel.batch_shape), version(by))


def contributions(
    this: Panel, that: Panel, settings: Settings, *, by: Maker | None = None
) -> Explained:
    """What each age contributes to the difference in e0, this minus that, of many pairs: as
    `engine.decomposition.contributions`.

    Shape: panels [..., age] of one shape on one grid.
    Raises: ValueError as in `tables`, or where the grids or shapes differ.
    """
    if this.grid != that.grid or this.batch_shape != that.batch_shape:
        raise ValueError("the panels differ in their age groups or in shape; bring both to one")
    by, batch, ages = _chosen(by, settings), this.batch_shape, len(this.grid)
    upper, lower = flat(this), flat(that)
    by_age, difference = np.empty((math.prod(batch), ages)), np.empty(math.prod(batch))
    if by == "compiled":
        from engine.compiled import line
        from engine.compiled.rules import rules

        line.explain(rules(this.grid, settings), lower, upper, by_age, difference)
    else:
        _explain(lower, upper, settings, by_age, difference)
    remainder = difference - by_age.sum(axis=-1)
    parts = by_age.reshape(*batch, ages), remainder.reshape(batch), difference.reshape(batch)
    return Explained(Contributions(*parts), version(by))


def _explain(
    lower: Panel, upper: Panel, settings: Settings, by_age: Array, difference: Array
) -> None:
    """upper minus lower by numpy, panels [pair], into by_age [pair, age] and difference [pair]."""
    which, ages = np.arange(len(difference)), len(lower.grid)
    if followed(settings):
        size = max(1, min(in_place.CELLS // ages, len(difference)))
        room, odd = in_place_line.Room.of(lower.grid, settings, size), []
        for first in range(0, len(difference), size):
            part = slice(first, first + size)
            pairs = lower[part], upper[part]
            odd.append(~in_place_line.explain(*pairs, room, by_age[part], difference[part]))
        which = _places(odd)
    for where in _blocks(len(which), 16 * ages):
        at = which[where]
        found = line_integral(INDICATORS["e0"], upper[at], lower[at], settings)
        by_age[at], difference[at] = found.by_age, found.difference


def curves(
    basis: Basis, ages: Array, deaths: Array, exposure: Array, *, by: Maker | None = None
) -> Curves:
    """Smooth log rates of many populations, the penalty chosen for each: as
    `engine.smoothing.fit`.

    Shape: ages [age], deaths, exposure [..., age].
    """
    by = _chosen(by, None)
    exposure = np.broadcast_to(exposure, deaths.shape)
    if by == "compiled":
        from engine.compiled.curves import fit as kernel

        return Curves(kernel(basis, ages, deaths, exposure), version(by))
    shape = deaths.shape[:-1]
    counts, years = (part.reshape(-1, len(ages)) for part in (deaths, exposure))
    found = [
        fit(basis, ages, counts[where], years[where])
        for where in _blocks(len(counts), 4 * basis.size * 15)
    ]
    coefficients = np.concatenate([one.coefficients for one in found])
    penalty = np.concatenate([one.penalty for one in found])
    curve = Curve(basis, coefficients.reshape(*shape, basis.size), penalty.reshape(shape))
    return Curves(curve, version(by))


def _chosen(by: Maker | None, settings: Settings | None) -> Maker:
    able = maker(settings)
    if by == "compiled" and able == "numpy":
        raise ValueError(
            f"compiled code cannot follow {settings.key if settings else 'this'}, or numba is not "
            "installed (pip install 'ebbline[bulk]'); leave the choice open or name numpy"
        )
    return by or able


def _rows(panel: Panel) -> tuple[Array, Array, Array, Array]:
    """Deaths, person-years and the infants' mix, each population a row."""
    rows = flat(panel)
    deaths, exposure = np.broadcast_arrays(rows.deaths, rows.exposure)
    parts = (deaths, exposure, rows.infant_weight, rows.infant_ratio)
    first, second, third, fourth = (np.ascontiguousarray(part, dtype=float) for part in parts)
    return first, second, third, fourth


def _copies(one: Panel, deaths: Array) -> Panel:
    """One population with each of many columns of deaths [draw, age]."""
    many = one.over(lambda array: np.broadcast_to(array, (len(deaths), array.shape[-1])))
    return replace(many, deaths=deaths)


def _blocks(rows: int, each: int) -> Iterator[slice]:
    """Rows of so many cells each, a cache full at a time."""
    size = max(1, CELLS // each)
    return (slice(first, first + size) for first in range(0, rows, size))


def _places(odd: list[NDArray[np.bool_]]) -> NDArray[np.intp]:
    """Positions of the rows marked in one block after another."""
    return np.flatnonzero(np.concatenate(odd)) if odd else np.arange(0)


def _drawn(
    means: Array,
    rng: np.random.Generator,
    draws: int,
    counts: Callable[[Array, Array, Array], None],
) -> Array:
    """Deaths of one population, [age, draw]: `counts` turns means [cell] and uniform numbers
    [cell, draw] into counts of the same shape."""
    found = np.where(np.isnan(means), np.nan, 0.0)[:, None] * np.ones(draws)
    few, many = (means > 0) & (means <= MOST), means > MOST
    small = np.empty((int(few.sum()), draws))
    counts(means[few], rng.random(small.shape), small)
    found[few] = small
    found[many] = rng.poisson(means[many, None], (int(many.sum()), draws))
    return found


def _counts(means: Array, uniform: Array, drawn: Array) -> None:
    for mean, row, to in zip(means.tolist(), uniform, drawn, strict=True):
        most = int(mean + 12 * math.sqrt(mean) + 40)
        to[:] = np.searchsorted(pdtr(np.arange(most), np.full(most, mean)), row, side="right")
