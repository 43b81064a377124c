"""Death rates and years lost by cause: the indicators read off rates, each cause for itself."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from engine.ages import Array
from engine.causes.counts import CauseCounts
from engine.chance import Chance, limits
from engine.estimates import Estimate, Reason
from engine.indicator import Indicator
from engine.indicators import estimates
from engine.panel import BESIDE, Panel
from engine.settings import Settings


def cause_panel(panel: Panel, causes: CauseCounts) -> Panel:
    """Each cause as if its deaths were all there are, among the same people: [..., cause, age].

    Rates may be read off it, a life table may not: nobody is left to die of anything else.
    """
    wide = panel.over(lambda array: array[..., None, :])
    shape = causes.deaths.shape
    same: dict[str, Any] = {
        name: np.broadcast_to(getattr(wide, name), (*shape[:-1], getattr(wide, name).shape[-1]))
        for name in ("infant_weight", "infant_ratio", "births")
    }
    nothing: dict[str, Any] = dict.fromkeys(BESIDE)
    return replace(
        wide,
        deaths=causes.deaths,
        exposure=np.ascontiguousarray(np.broadcast_to(wide.exposure, shape)),
        counted=causes.counted,
        **same,
        **(nothing | {"standard": _wide(wide.standard, shape)}),
    )


def _wide(standard: Panel | None, shape: tuple[int, ...]) -> Panel | None:
    if standard is None:
        return None
    return standard.over(
        lambda array: np.ascontiguousarray(np.broadcast_to(array, (*shape[:-1], array.shape[-1])))
    )


def rates_by_cause(
    indicators: Sequence[Indicator], panel: Panel, causes: CauseCounts, settings: Settings
) -> dict[str, Estimate]:
    """Indicators read off rates (crude and standardised rates, years of life lost) of every cause,
    by their keys. Those that are sums over deaths add up over the causes.

    Shape:   panel [..., age], causes [..., cause, age] -> [..., cause].
    Missing: as of the indicator; a standardised rate of a cause of fewer than ten deaths has none.
    Raises:  ValueError where an indicator is read off a life table, or off a larger area.
    Source:  those of the indicators.
    """
    for one in indicators:
        if one.needs.whole or one.needs.open_deaths or not one.unit.limits == "gamma":
            raise ValueError(
                f"{one.label} is not a rate of deaths over people, which alone a cause has"
            )
    plain = replace(settings, smoothing="none", open_interval="one_over_m", borrow=False)
    return estimates(indicators, cause_panel(panel, causes), plain)


@dataclass(frozen=True, slots=True)
class CauseShare:
    """Deaths of each cause, and their share in all deaths, [..., cause]."""

    deaths: Array
    share: Estimate


def deaths_and_shares(causes: CauseCounts, settings: Settings) -> CauseShare:
    """Deaths of each cause at all ages, and their share in all deaths with its limits: as a death
    of the cause raises it and one of any other lowers it.

    Shape:   causes [..., cause, age] -> [..., cause].
    Missing: nan where there are no deaths at all.
    Source:  those of `engine.chance.limits`.
    """
    deaths = causes.deaths.sum(axis=-1)
    counts = causes.counts
    with np.errstate(all="ignore"):
        total = deaths.sum(axis=-1, keepdims=True)
        value = deaths / total
        worth = causes.worth
        same = np.eye(deaths.shape[-1])[..., None]  # [cause, cause of the death, age]
        moved = (same - value[..., :, None, None]) / total[..., None, None]
        weights = moved * worth[..., None, :, :]
        flat = (*weights.shape[:-2], -1)
        every = np.broadcast_to(counts[..., None, :, :], weights.shape)
        chance = Chance(weights.reshape(flat), every.reshape(flat), np.zeros(value.shape))
        low, high = limits("part", value, chance, settings.level)
    none = np.where(np.isfinite(value), Reason.NONE, Reason.NO_DEATHS).astype(np.uint8)
    bare = Estimate.bare(value, none, Reason.OFTEN_LOST)
    return CauseShare(deaths, bare.within(low, high, chance.se, Reason.OFTEN_LOST))
