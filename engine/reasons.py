"""Why a value is missing: the one place where it is decided."""

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.ageing import within
from engine.ages import Array
from engine.chain import Chain
from engine.estimates import Reason
from engine.indicator import Needs
from engine.laws import LEAST_AGES
from engine.panel import BIRTHS, Panel
from engine.stages.rates import death_rates

Rules = Iterator[tuple[Reason, Any]]  # what holds, of the batch's shape or for all of it


def judge(needs: Needs, chain: Chain, value: Array) -> NDArray[np.uint8]:
    """The reason for each population, NONE where its value stands: [...].

    Where several hold, the one is given that must be mended first.
    """
    return unless_found(against(needs, chain), needs, value)


def against(needs: Needs, chain: Chain) -> NDArray[np.uint8]:
    """The same before the value is looked at, for all numbers that need the same: [...]."""
    found = np.zeros(chain.panel.batch_shape, np.uint8)
    with np.errstate(invalid="ignore"):
        for reason, holds in (*_of_counts(needs, chain), *_of_ages(needs, chain)):
            found = np.where((found == Reason.NONE) & holds, np.uint8(reason), found)
    return found


def unless_found(reason: NDArray[np.uint8], needs: Needs, value: Array) -> NDArray[np.uint8]:
    """Where nothing is against a number and yet there is none, the reason that it has for that."""
    none = (reason == Reason.NONE) & ~np.isfinite(value)
    return np.where(none, np.uint8(needs.otherwise), reason)


def _of_counts(needs: Needs, chain: Chain) -> Rules:
    """What was not handed in, or is too little."""
    panel, rates, settings = chain.panel, chain.rates, chain.settings
    deaths, exposure = np.real(rates.deaths), np.real(rates.exposure)
    births = panel.births[..., [BIRTHS.index(name) for name in needs.births]]
    total = deaths.sum(axis=-1)
    yield Reason.NOT_AVAILABLE, np.isnan(deaths + exposure).any(axis=-1)
    yield Reason.TOO_FEW_PERSON_YEARS, exposure.sum(axis=-1) < settings.least_exposure
    yield Reason.NO_BIRTHS, np.isnan(births).any(axis=-1)
    yield Reason.NO_WHOLE, needs.whole and not_known(panel.whole)
    yield Reason.NO_STANDARD, needs.standard != "" and not_held(panel.standard)
    yield Reason.NO_POPULATION, np.isnan(rates.mx).any(axis=-1)
    yield Reason.NO_DEATHS, (total == 0) & (not needs.births)  # no infant's death is a figure
    yield Reason.TOO_FEW_DEATHS, total < needs.least_deaths


def _of_ages(needs: Needs, chain: Chain) -> Rules:
    """Ages that are no group's, and an open group that hides what is read."""
    settings, grid = chain.settings, chain.panel.grid
    deaths = np.real(chain.rates.deaths)
    unfitted = chain.modelled & np.isnan(np.real(chain.table.mx[..., -1]))
    fitted_to = sum(start >= settings.fit_from for start in grid.starts[:-1])
    no_law = Reason.NO_LAW if fitted_to >= LEAST_AGES else Reason.TOO_FEW_AGES
    too_large = (chain.open_reach > settings.open_share) & (not chain.modelled)
    empty = (np.real(chain.rates.mx[..., -1]) == 0) & ~chain.borrowed & (not chain.modelled)
    in_span = deaths[..., within(grid, settings.ageing_span)].sum(axis=-1)
    yield Reason.AGE_NOT_ON_GRID, not all(chain.table.grid.has(age) for age in needs.ages)
    yield no_law, (needs.open_small or needs.open_deaths) & unfitted
    yield Reason.OPEN_GROUP_TOO_LARGE, needs.open_small & too_large
    yield Reason.NO_DEATHS_IN_OPEN_GROUP, needs.open_deaths & empty
    yield Reason.OPEN_AGE_TOO_LOW, needs.open_deaths and chain.open_too_low
    yield Reason.NO_DEATHS, needs.span_deaths & (in_span == 0)


def not_known(whole: Panel | None) -> NDArray[np.bool_]:
    """Where there is no larger area, or it lacks the rate of an age: [...]."""
    if whole is None:
        return np.array(True)
    mx = death_rates(np.real(whole.deaths), np.real(whole.exposure)).mx
    return np.asarray(np.isnan(mx).any(axis=-1))


def not_held(standard: Panel | None) -> NDArray[np.bool_]:
    """Where no standard is held, or it lacks the people of an age: [...]."""
    if standard is None:
        return np.array(True)
    return np.asarray(np.isnan(np.real(standard.exposure)).any(axis=-1))
