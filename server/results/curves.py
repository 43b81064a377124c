"""Curves behind the death rates of one area, sex and year, and how it differs from its whole."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtri, ndtri

from engine import graduation, relational, smoothing, ungrouping
from engine import settings as named
from engine.ages import Array
from engine.chain import Chain, run
from engine.panel import Panel
from engine.settings import Settings
from engine.smooth_bands import averaged
from engine.stages.smoothing import LEAST_GROUPS, adult_counts, adult_groups
from server.results.holdings import holdings
from server.results.laws import Fitted, Limited, best, fitted, fitted_one, limited
from server.results.loading import Beside, Found, load
from server.results.of_one import OfOne
from server.results.questions import CurvesQuestion, PopulationYear
from server.results.revision import Moved, moved
from server.store.connect import Session
from server.store.heading import Heading

LEAST_SINGLE = 500  # deaths; with fewer, groups tell little of the single years in them


@dataclass(frozen=True, slots=True)
class Smooth:
    """Death rates read off smooth curves, from age 10 to the open age group."""

    groups: slice  # of the grid
    at_groups: Array  # [3, group], the P-spline and its limits at the middles of groups
    graduated: Array  # [group], Whittaker and Henderson's; nan where groups differ in width
    ages: Array  # [point], a year apart
    curve: Array  # [3, point], the P-spline and its limits


@dataclass(frozen=True, slots=True)
class Single:
    """Deaths of groups by single year of age, below the open age: [age]."""

    deaths: Array  # by the penalised composite link
    low: Array
    high: Array
    interpolated: Array  # by a monotone curve through the cumulated counts
    exposure: Array  # person-years by such a curve

    @property
    def rates(self) -> Array:
        return self._per_year(self.deaths)

    @property
    def rates_interpolated(self) -> Array:
        return self._per_year(self.interpolated)

    def _per_year(self, deaths: Array) -> Array:
        with np.errstate(all="ignore"):
            return np.where(self.exposure > 0, deaths / self.exposure, np.nan)


@dataclass(frozen=True, slots=True)
class Related:
    """Level and shape against the table of the area that this one is part of."""

    area: str  # its name
    median: float  # the age that half would reach there, at which the level is read
    level: Limited
    shape: Limited
    deviance: float
    freedom: int
    misses: bool  # whether no level and shape make that table into this one, as far as chance tells


@dataclass(frozen=True, slots=True)
class Curves(OfOne):
    """One population-year, its death rates described in every way."""

    question: CurvesQuestion
    chain: Chain
    laws: tuple[Fitted, ...]  # none where too few person-years were lived
    best: Fitted | None
    smooth: Smooth | None
    single: Single | None  # None where groups are single years, or deaths too few to part
    related: Related | None
    moved: Moved | None

    @property
    def withheld(self) -> NDArray[np.bool_]:
        """Groups whose deaths are withheld, [age]."""
        return self.loaded.withheld_on(self.panel.grid)

    @property
    def panel(self) -> Panel:
        return self.loaded.panel

    @property
    def parent(self) -> str:
        """Code of the area this one is part of; empty where there is none."""
        areas = self.holdings.areas
        return next((area.parent or "" for area in areas if area.code == self.of.area), "")


def curves(session: Session, heading: Heading, question: CurvesQuestion) -> Curves:
    """Load it and fit every law and curve. NotInEdition."""
    collection, number = heading.collection.code, heading.edition.number
    settings = named.find(question.settings)
    held = holdings(session, collection, number)
    held.require(question.of)
    beside = Beside.of(settings, held.areas)
    found = load(session, collection, number, [question.of], beside, figures=question.figures)
    if question.of not in found:
        raise held.lacks(question.of)
    loaded = found[question.of]
    panel, level = loaded.panel, settings.level
    chain = run(panel, settings)
    enough = enough_lived(panel, settings)
    laws = fitted(panel, level) if enough else ()
    chosen = best(laws)
    parent = next((area.parent for area in held.areas if area.code == question.of.area), "")
    return Curves(
        heading=heading,
        holdings=held,
        question=question,
        settings=settings,
        loaded=loaded,
        chain=chain,
        laws=laws,
        best=chosen,
        smooth=smooth(chain, level) if enough else None,
        single=single(panel, level) if enough else None,
        related=related(chain, held.name(parent)) if enough and parent else None,
        moved=moved(
            session,
            heading,
            [question.of],
            beside,
            lambda newer: _rise(newer, question.of, chosen),
            figures=question.figures,
        ),
    )


def enough_lived(panel: Panel, settings: Settings) -> bool:
    """Whether enough person-years were lived for figures to mean anything."""
    return float(panel.exposure.sum()) >= settings.least_exposure


def _rise(newer: Found, of: PopulationYear, chosen: Fitted | None) -> float:
    """The rise of death rates by the same law in another edition."""
    if chosen is None or of not in newer:
        return np.nan
    there = fitted_one(chosen.law.key, newer[of].panel, chosen.level)
    return there.slope.value if there else np.nan


def smooth(chain: Chain, level: float) -> Smooth | None:
    """None where too few groups, or nobody's death, bear a curve."""
    grid, groups = chain.panel.grid, adult_groups(chain.panel.grid)
    if groups.stop - groups.start < LEAST_GROUPS:
        return None
    counts = adult_counts(grid, chain.rates)
    tried = smoothing.fit_each(*counts)
    ages = np.arange(grid.starts[groups.start], grid.open_age + 1.0)
    banded = _banded(tried, np.concatenate([counts.ages, ages]), level)
    if not np.isfinite(banded).all():
        return None
    return Smooth(
        groups,
        banded[:, : len(counts.ages)],
        _graduated(grid.widths[groups], chain.rates.mx[groups], counts.deaths),
        ages,
        banded[:, len(counts.ages) :],
    )


def _banded(tried: smoothing.Fit, ages: Array, level: float) -> Array:
    """The curve and its limits, even on the scale of logarithms: [3, point]."""
    found = averaged(tried, ages)
    logs, half = found.log_rates, float(ndtri((1 + level) / 2)) * found.standard_errors
    return np.exp(np.stack([logs, logs - half, logs + half]))


def _graduated(widths: Array, mx: Array, deaths: Array) -> Array:
    """Log rates weighted by deaths (the inverse of their variance), drawn smooth; nan on groups of
    different widths, between which differences of the graduation do not compare."""
    if np.any(widths != widths[0]):
        return np.full_like(mx, np.nan)
    with np.errstate(all="ignore"):
        return np.asarray(np.exp(graduation.graduate(np.log(mx), deaths).values))


def single(panel: Panel, level: float) -> Single | None:
    """None where every closed group is a single year, or with fewer deaths than 500 in them."""
    grid = panel.grid
    if np.all(grid.widths[:-1] == 1) or not panel.deaths[:-1].sum() >= LEAST_SINGLE:
        return None
    exposure = ungrouping.interpolated(grid, panel.exposure)
    found = ungrouping.ungrouped(grid, panel.deaths, exposure=exposure)
    if not np.isfinite(found.counts).all():
        return None
    reach = np.exp(float(ndtri((1 + level) / 2)) * found.log_errors)
    with np.errstate(all="ignore"):
        low, high = found.counts / reach, found.counts * reach
    return Single(found.counts, low, high, ungrouping.interpolated(grid, panel.deaths), exposure)


def related(chain: Chain, area: str) -> Related | None:
    """None where the larger area's table is not known, or no level and shape are greatest."""
    whole, level = chain.panel.whole, chain.settings.level
    if whole is None:
        return None
    standard = run(whole, chain.settings).table
    found = relational.relate(chain, standard.lx[: len(chain.panel.grid)])
    if not np.isfinite(found.alpha + found.beta):
        return None
    deviance, freedom = float(found.deviance), int(found.freedom)
    return Related(
        area,
        _median(standard.lx, np.array(standard.grid.starts)),
        limited(float(found.alpha), float(found.alpha_error), level),
        limited(float(found.beta), float(found.beta_error), level),
        deviance,
        freedom,
        freedom > 0 and deviance > float(chdtri(freedom, 1 - level)),
    )


def _median(lx: Array, starts: NDArray[np.intp]) -> float:
    """The age that half would reach, straight between the starts of groups; nan beyond the last."""
    reached = np.flatnonzero(lx < 0.5)
    if not reached.size or reached[0] == 0:
        return np.nan
    at = int(reached[0])
    share = (lx[at - 1] - 0.5) / (lx[at - 1] - lx[at])
    return float(starts[at - 1] + share * (starts[at] - starts[at - 1]))
