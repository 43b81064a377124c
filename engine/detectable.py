"""How small a change could have been seen, and how many years together would show one."""

import numpy as np
from scipy.special import ndtri

from engine.ages import Array

POWER = 0.8  # chance with which a change of the smallest size is seen


def smallest_change(se: Array, level: float, *, power: float = POWER) -> Array:
    """The smallest true difference that would have been seen with the stated chance.

    A difference is seen where its interval at the level leaves out 0. One of the size
    (z_{(1+level)/2} + z_{power}) se is, with the chance `power`, since then its estimate lies that
    far from 0 or farther. It tells what the counts can show, whatever they did show.

    Shape:   se [...], the standard error of a difference -> [...], in its unit.
    Missing: nan where the standard error is.
    Raises:  ValueError where level or power are no chances, or the power is below a half.
    Source:  Lachin (1981), Introduction to sample size determination and power analysis for
             clinical trials, Controlled Clinical Trials 2, 93-113.
    >>> smallest_change(np.array([0.1, 1.0]), 0.95).round(3)
    array([0.28 , 2.802])
    """
    return np.asarray(_times(level, power) * se)


def pooled_years(change: Array, se: Array, level: float, *, power: float = POWER) -> Array:
    """Years of such a size to add up on each side, so that a true difference as large as the one
    found would be seen with the stated chance; 1 where one year is enough.

    The variance of a difference falls as 1 / years, so that n = (smallest change / change)^2,
    rounded up. What the years have in common (an error of the population that stays) does not fall;
    it is taken to fall here, so where the settings name one the true number is larger.

    Shape:   change, se [...], which broadcast -> [...], whole numbers.
    Missing: nan where either is, and where there was no change: no pooling shows what is not there.
    Raises, source: as `smallest_change`.
    >>> pooled_years(np.array([0.5, -0.1, 0.0]), np.array([0.1, 0.1, 0.1]), 0.95)
    array([ 1.,  8., nan])
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        years = np.ceil((smallest_change(se, level, power=power) / change) ** 2)
    return np.where(np.isfinite(years), np.maximum(years, 1.0), np.nan)


def _times(level: float, power: float) -> float:
    """Standard errors between no change and the smallest."""
    if not (0 < level < 1 and 0.5 <= power < 1):
        raise ValueError(
            f"a level of {level} and a power of {power} have no smallest change; the level lies "
            "between 0 and 1, the power between 0.5 and 1"
        )
    return float(ndtri((1 + level) / 2) + ndtri(power))
