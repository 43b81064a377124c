"""Lengths of life under a fitted law: expectancy, years lost, adult mode; with derivatives."""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.hazards import Groups, Law, local
from engine.laws import Fit

OLDEST = 150.0
EDGES = np.array([0, 0.03, 0.1, 0.3, 1, 3, *range(10, 131, 10), 150.0])  # close where infants die
NODES, WEIGHTS = np.polynomial.legendre.leggauss(8)


@dataclass(frozen=True, slots=True)
class Lives:
    """Of those alive at an age, under a law."""

    expectancy: Array  # [...], years
    lost: Array  # [...], years lost per death on average
    slopes: Array  # [..., parameter], derivatives of the expectancy


def lives(law: Law, parameters: Array, centre: float, *, age: float = 0.0) -> Lives:
    """Life expectancy and years lost under a law from an age on, up to 150.

    With S the survivors and L the hazard summed from the age, the expectancy is the integral of S,
    the years lost that of S L, and the derivative of the expectancy minus that of S dL; eight
    Gauss-Legendre nodes to a piece, L in closed form.

    Shape:   parameters [..., parameter] -> [...]; real or complex.
    Missing: nan in, nan out.
    Raises:  ValueError for a law that saturates, whose sum is not that of its terms.
    Source:  Vaupel & Canudas-Romo (2003), Demography 40, 201-216 (years lost); Missov & Lenart
             (2013), Theoretical Population Biology 90, 29-35 (expectancy under Gompertz-Makeham).
    """
    if law.saturates:
        raise ValueError(f"the {law.label} law is no sum of terms; its lives are not read here")
    edges = np.unique(np.clip([*EDGES, 1 - age], 0, OLDEST - age))  # some laws break at age 1
    half = np.diff(edges)[:, None] / 2
    t = (edges[:-1, None] + half * (1 + NODES)).ravel()
    weights = (half * WEIGHTS).ravel()
    with np.errstate(all="ignore"):
        here = local(law, Groups(age + t / 2, t, np.zeros_like(t), centre), parameters)
        spent = t * here.mu
        alive = weights * np.exp(-spent)
        slopes = [-(alive * spent * part).sum(axis=-1) for part in here.relative]
    return Lives(alive.sum(axis=-1), (alive * spent).sum(axis=-1), np.stack(slopes, axis=-1))


@dataclass(frozen=True, slots=True)
class AdultMode:
    """The age at which the rising term alone would have most deaths, with its standard error."""

    age: Array  # [...]
    se: Array


def adult_mode(fit: Fit) -> AdultMode:
    """M = centre + (log slope - level) / slope: the rising term is slope * exp(slope (x - M)).

    So a law is told by the age about which deaths gather, M, and by how closely they do, its slope.

    Missing: nan where there is no fit or the term does not rise, and where M would be below 0 (the
             most deaths then are at birth).
    Source:  Horiuchi, Ouellette, Cheung & Robine (2013), Vienna Yearbook of Population Research 11;
             Missov, Lenart, Nemeth, Canudas-Romo & Vaupel (2015), Demographic Research 32.
    """
    at, to = fit.law.position("level"), fit.law.position("slope")
    with np.errstate(all="ignore"):
        age = mode_of(fit.level, fit.slope, fit.centre)
        g = np.zeros_like(fit.parameters)
        g[..., at] = -1 / fit.slope
        g[..., to] = (1 / fit.slope - (age - fit.centre)) / fit.slope
        there = np.real(age) >= 0
        variance = (g[..., :, None] * fit.covariance * g[..., None, :]).sum(axis=(-2, -1))
    return AdultMode(np.where(there, age, np.nan), np.where(there, np.sqrt(variance), np.nan))


def mode_of(level: Array, slope: Array, centre: float) -> Array:
    """M of a rising term, exp(level + slope (x - centre))."""
    return np.asarray(centre + (np.log(slope) - level) / slope)
