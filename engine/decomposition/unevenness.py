"""A difference in the unevenness of length of life, owed to e-dagger and to life expectancy."""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.chain import Reading, run
from engine.decomposition.line import contributions
from engine.panel import Panel
from engine.settings import Settings


@dataclass(frozen=True, slots=True)
class UnevennessParts:
    """The difference in H, this minus that: what both parts hold adds up to it."""

    lost: Array  # [..., age], through the years lost per death (e-dagger)
    lived: Array  # [..., age], through life expectancy at birth
    lost_remainder: Array  # [...], what no age's rate accounts for
    lived_remainder: Array
    difference: Array  # [...]


def unevenness_parts(
    lost: Reading, lived: Reading, this: Panel, that: Panel, settings: Settings
) -> UnevennessParts:
    """H = e-dagger / e0, so its relative change is that of e-dagger less that of e0, exactly:
    ln H - ln H' = (ln e-dagger - ln e-dagger') - (ln e0 - ln e0').

    With L(a, b) = (a - b) / (ln a - ln b), the logarithmic mean, times L(H, H') this is the
    difference in H, and D / L(e-dagger, e-dagger') is the relative change that a difference D in
    e-dagger makes. So each age's contribution to e-dagger, and to e0, is carried over to H. An age
    where longer lives make H fall through e0 may raise it through e-dagger.

    Shape:   `lost` reads e-dagger, `lived` e0; panels [..., age] on one grid -> [..., age].
    Missing: nan where either value is.
    Raises:  ValueError where the grids differ.
    Source:  Vaupel & Canudas-Romo (2003), Demography 40, 201-216 (H as the ratio); Ang (2005),
             Energy Policy 33, 867-871 (logarithmic mean weights); Horiuchi, Wilmoth & Pletcher
             (2008), Demography 45 (ages).
    """
    years = contributions(lost, this, that, settings)
    mean = contributions(lived, this, that, settings)
    chains = run(this, settings), run(that, settings)
    top, bottom = ([one.value(chain) for chain in chains] for one in (lost, lived))
    with np.errstate(all="ignore"):
        ratio = [a / b for a, b in zip(top, bottom, strict=True)]
        scale = log_mean(*ratio)
        up, down = scale / log_mean(*top), -scale / log_mean(*bottom)
    return UnevennessParts(
        up[..., None] * years.by_age,
        down[..., None] * mean.by_age,
        up * years.remainder,
        down * mean.remainder,
        ratio[0] - ratio[1],
    )


def log_mean(a: Array, b: Array) -> Array:
    """Logarithmic mean (a - b) / (ln a - ln b) of two numbers above 0; a where they are equal.

    >>> log_mean(np.array([2.0, 4.0]), np.array([2.0, 1.0])).round(6)
    array([2.      , 2.164043])
    """
    rise = np.log(a / b)
    with np.errstate(invalid="ignore"):
        return np.asarray(b * np.where(rise == 0, 1.0, np.expm1(rise) / rise))
