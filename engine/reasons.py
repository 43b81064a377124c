"""Why a value is missing: the one place where it is decided."""

import numpy as np
from numpy.typing import NDArray

from engine.ageing import within
from engine.ages import Array
from engine.chain import Chain
from engine.estimates import Reason
from engine.indicator import Needs
from engine.laws import LEAST_AGES


def judge(needs: Needs, chain: Chain, value: Array) -> NDArray[np.uint8]:
    """The reason for each population, NONE where its value stands: [...].

    Where several hold, the one is given that must be mended first.
    """
    settings, rates = chain.settings, chain.rates
    deaths, exposure = np.real(rates.deaths), np.real(rates.exposure)
    shape = value.shape
    span = within(chain.panel.grid, settings.ageing_span)
    off_grid = not all(chain.table.grid.has(age) for age in needs.ages)
    unfitted = chain.modelled & np.isnan(np.real(chain.table.mx[..., -1]))
    fitted_to = sum(start >= settings.fit_from for start in chain.panel.grid.starts[:-1])
    no_law = Reason.NO_LAW if fitted_to >= LEAST_AGES else Reason.TOO_FEW_AGES
    with np.errstate(invalid="ignore"):
        rules = (  # the first that holds is the reason
            (Reason.NOT_AVAILABLE, np.isnan(deaths + exposure).any(axis=-1)),
            (Reason.TOO_FEW_PERSON_YEARS, exposure.sum(axis=-1) < settings.least_exposure),
            (Reason.NO_POPULATION, np.isnan(rates.mx).any(axis=-1)),
            (Reason.NO_DEATHS, deaths.sum(axis=-1) == 0),
            (Reason.AGE_NOT_ON_GRID, np.full(shape, off_grid)),
            (no_law, (needs.open_small or needs.open_deaths) & unfitted),
            (
                Reason.OPEN_GROUP_TOO_LARGE,
                needs.open_small & (chain.open_reach > settings.open_share) & (not chain.modelled),
            ),
            (
                Reason.NO_DEATHS_IN_OPEN_GROUP,
                needs.open_deaths
                & (np.real(rates.mx[..., -1]) == 0)
                & ~chain.borrowed
                & (not chain.modelled),
            ),
            (
                Reason.OPEN_AGE_TOO_LOW,
                np.full(shape, needs.open_deaths and chain.open_too_low),
            ),
            (Reason.NO_DEATHS, needs.span_deaths & (deaths[..., span].sum(axis=-1) == 0)),
            (needs.otherwise, ~np.isfinite(value)),
        )
    return np.select(
        [np.broadcast_to(holds, shape) for _, holds in rules],
        [np.uint8(reason) for reason, _ in rules],
        np.uint8(Reason.NONE),
    )
