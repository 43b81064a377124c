"""Contributions by replacing one age after another, for numbers that have no gradient."""

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.chain import Reading, run
from engine.decomposition.straight import require_one_grid
from engine.panel import BESIDE, Panel
from engine.settings import Settings

# words for the reader on numbers whose ages no method tells: between Danes of two years their
# order_share is mostly above 0.6, that of other numbers that are not smooth never above 0.43
_SEAM = (
    "It is read off the shape of death rates around one age. To tell the ages' parts, populations"
    " would have to be put together from the younger ages of one and the older ages of the other;"
    " the seam then makes a shape that neither has, and the parts come out as large steps to and"
    " fro, at other ages for another order of replacing."
)
NOT_DECOMPOSED = dict.fromkeys(("mode", "mode_raw", "mode_parabola"), _SEAM)

OF_FIRST_AGE = ("infant_weight", "infant_ratio", "births")


@dataclass(frozen=True, slots=True)
class Stepwise:
    """The difference, this minus that, by age; by_age and remainder add up to it."""

    by_age: Array  # [..., age], the mean of the two orders
    young_first: Array  # [..., age]
    old_first: Array  # [..., age]
    remainder: Array  # [...], rounding
    difference: Array  # [...]

    @property
    def order_share(self) -> Array:
        """How far the order decides the contributions, 0 to 1: what the two orders differ by, over
        what they hold, both summed without signs. [...]; nan where nothing is contributed."""
        apart = np.abs(self.young_first - self.old_first).sum(axis=-1)
        held = (np.abs(self.young_first) + np.abs(self.old_first)).sum(axis=-1)
        with np.errstate(all="ignore"):
            return np.asarray(apart / held)


def stepwise(indicator: Reading, this: Panel, that: Panel, settings: Settings) -> Stepwise:
    """What the number moves by as the counts of one age after another are replaced.

    Beginning with that, each age takes the deaths and person-years of this, from the youngest to
    the oldest, and each move of the number is the contribution of the age just replaced; then again
    from the oldest to the youngest; the contribution is the mean of the two. (Beginning with this
    is the same two orders the other way round: turned round, contributions change their sign.) The
    infants' mix of sexes and births go with the first age, and of populations that stand beside
    the counts the same ages as of the counts.

    Of a number that jumps, one age may be given a whole jump because its turn came last before it,
    and the two orders then name different ages: `order_share` tells. Numbers of which that is the
    rule are named in NOT_DECOMPOSED, with the reason.

    Shape:   panels [..., age] on one grid; batches broadcast.
    Missing: nan where either value is, and where one of the populations passed through has none.
    Raises:  ValueError where the grids differ.
    Source:  Andreev, Shkolnikov & Begun (2002), Demographic Research 7(14), 499-522; Andreev &
             Shkolnikov (2012), MPIDR Technical Report 2012-016.
    """
    require_one_grid(this, that)
    passed = run(passed_through(this, that), settings)
    return of_values(indicator.value(passed))


def of_values(values: Array) -> Stepwise:
    """The contributions, from the number of each population passed through, [order, step, ...]."""
    difference = values[0, -1] - values[0, 0]
    moves = np.moveaxis(np.diff(values, axis=1), 1, -1)  # [order, ..., step]
    young, old = moves[0], np.flip(moves[1], axis=-1)
    known = np.isfinite(young + old).all(axis=-1, keepdims=True)
    young, old = (np.ascontiguousarray(np.where(known, part, np.nan)) for part in (young, old))
    by_age = (young + old) / 2
    return Stepwise(by_age, young, old, difference - by_age.sum(axis=-1), difference)


def passed_through(this: Panel, that: Panel) -> Panel:
    """That, then with one age more of this at each step: [order, step, ..., age], the order from
    the youngest on first, the one from the oldest on second."""
    ages = len(this.grid)
    turn = np.arange(ages)
    steps = np.arange(ages + 1)[:, None]
    replaced = np.stack([turn < steps, turn >= ages - steps])
    batch = np.broadcast_shapes(this.batch_shape, that.batch_shape)
    return _joined(this, that, replaced.reshape(2, ages + 1, *(1,) * len(batch), ages))


def _joined(this: Panel, that: Panel, replaced: NDArray[np.bool_]) -> Panel:
    """Ages of this where replaced, of that where not."""
    parts: dict[str, Any] = {
        name: np.where(replaced, getattr(this, name), getattr(that, name))
        for name in ("deaths", "exposure")
    }
    for name in OF_FIRST_AGE:
        parts[name] = np.where(replaced[..., :1], getattr(this, name), getattr(that, name))
    for name in BESIDE:
        ours, theirs = _both(getattr(this, name), getattr(that, name))
        parts[name] = None if ours is None or theirs is None else _joined(ours, theirs, replaced)
    return replace(that, **parts)


def _both(ours: Panel | None, theirs: Panel | None) -> tuple[Panel | None, Panel | None]:
    """Where one side has none, a panel of nan stands for it."""
    if ours is None and theirs is not None:
        ours = theirs.over(lambda array: np.full_like(array, np.nan))
    if theirs is None and ours is not None:
        theirs = ours.over(lambda array: np.full_like(array, np.nan))
    return ours, theirs
