"""Numbers that every cause of death has: what each states about itself, and their intervals."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.causes.counts import CauseCounts
from engine.causes.parting import Parted, Slopes, part
from engine.chance import Chance, astray, limits
from engine.estimates import Estimate, Reason
from engine.indicator import Needs, Unit
from engine.panel import Panel
from engine.reasons import against, unless_found
from engine.settings import Settings


@dataclass(frozen=True, slots=True)
class CauseNumber:
    """A number of every cause, read off a life table whose deaths are parted by cause. As of an
    Indicator every field would be true in a printed report."""

    key: str
    symbol: str
    label: str
    unit: Unit
    definition: str
    formula: str
    source: str
    needs: Needs
    adds_up: bool  # over causes, to the number of all
    read: Callable[[Parted], Slopes]


def estimates(
    numbers: Sequence[CauseNumber], panel: Panel, causes: CauseCounts, settings: Settings
) -> dict[str, Estimate]:
    """Each number of every cause with its interval at the settings' level, by its key.

    The delta method: what one death more of the cause, and one of any other, moves the number by at
    each age; limits as those of an indicator (`engine.chance.limits`). Chance is in the deaths
    counted under each cause, each of which stands for those that were shared out by it.

    Shape:   panel [..., age], causes [..., cause, age] -> [..., cause].
    Missing: nan with the reason where the population has no number, or the cause none.
    Raises:  ValueError where the causes do not add up to all deaths.
    Source:  Chiang (1968), Introduction to Stochastic Processes in Biostatistics, chapter 11
             (deaths of several causes as one Poisson or multinomial experiment), and those of
             `engine.chance.limits`.
    """
    parted = part(panel, causes, settings)
    with np.errstate(all="ignore"):
        slopes = {one.key: one.read(parted) for one in numbers}
        out = _astray(numbers, panel, causes, settings)
        return {
            one.key: _within(one, parted, slopes[one.key], out[place])
            for place, one in enumerate(numbers)
        }


def _within(one: CauseNumber, parted: Parted, slopes: Slopes, out: Array) -> Estimate:
    chance = parted.chance(slopes)
    chance = Chance(chance.weights, chance.counts, chance.astray + out)
    level = parted.chain.settings.level
    reason = unless_found(against(one.needs, parted.chain), one.needs, slopes.value)
    low, high = limits(one.unit.limits, slopes.value, chance, level)
    found = Estimate.bare(slopes.value, reason, Reason.OFTEN_LOST)
    found = found.within(low, high, chance.se, Reason.OFTEN_LOST)
    return Estimate(*(np.moveaxis(getattr(found, name), 0, -1) for name in found.__slots__))


def _astray(
    numbers: Sequence[CauseNumber], panel: Panel, causes: CauseCounts, settings: Settings
) -> Array:
    """Standard deviation owed to persons counted wrongly, [number, cause, ...]."""

    def values(other: Panel) -> Array:
        parted = part(other, causes, settings)
        return np.stack([one.read(parted).value for one in numbers])

    shape = (len(numbers), causes.deaths.shape[-2], *panel.batch_shape)
    return np.broadcast_to(astray(values, panel, settings=settings), shape)
