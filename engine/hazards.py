"""Mortality laws as sums of simple terms: hazards, their means over age groups, and derivatives.

A term is exponential in age or constant. Parameters are logarithms of rates (level, background,
infant), so that no rate is negative, and plain slopes per year of age (slope, decline). A rate of
0 has no logarithm: it stands as minus infinity, and its term vanishes.
"""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array

NEAR = 0.1  # below it the series of sinh(u) / u and its slopes are the better numbers
THINNEST = 3.0  # logarithm of the most that person-years may thin out within a group


@dataclass(frozen=True, slots=True)
class Term:
    """exp(level + direction * slope * (age - origin)): rising from the centre of the fitted ages,
    falling from birth; or exp(level) below the age `until`, where direction is 0."""

    names: tuple[str, ...]
    direction: int = 0
    until: float = np.inf


@dataclass(frozen=True, slots=True)
class Law:
    """A sum of terms, h; `saturates`: the hazard is h / (1 + h), else h itself."""

    key: str
    label: str
    terms: tuple[Term, ...]
    saturates: bool = False

    @property
    def names(self) -> tuple[str, ...]:
        """Of the parameters, in the order of their axis."""
        return tuple(name for term in self.terms for name in term.names)

    @property
    def bounded(self) -> dict[int, Term]:
        """The terms that may be 0 at best, by the position of their level."""
        first = [self.position(term.names[0]) for term in self.terms]
        return {j: term for j, term in zip(first, self.terms, strict=True) if not term.direction}

    def position(self, name: str) -> int:
        """Of a parameter; ValueError where the law has none of this name."""
        if name not in self.names:
            raise ValueError(f"{self.label} has no {name}; it has {', '.join(self.names)}")
        return self.names.index(name)

    def hazard(self, ages: Array, parameters: Array, centre: float) -> Array:
        """The hazard at ages [k] from parameters [..., parameter]: [..., k]."""
        return local(self, points(ages, centre), parameters).mu


RISING = Term(("level", "slope"), direction=1)
FALLING = Term(("infant", "decline"), direction=-1)
BACKGROUND = Term(("background",))
FIRST_YEAR = Term(("infant",), until=1.0)

GOMPERTZ = Law("gompertz", "Gompertz", (RISING,))
KANNISTO = Law("kannisto", "Kannisto", (RISING,), saturates=True)
MAKEHAM = Law("makeham", "Gompertz-Makeham", (RISING, BACKGROUND))
MAKEHAM_INFANT = Law(
    "makeham_infant", "Gompertz-Makeham with infants", (RISING, BACKGROUND, FIRST_YEAR)
)
SILER = Law("siler", "Siler", (RISING, BACKGROUND, FALLING))
LAWS = {law.key: law for law in (GOMPERTZ, KANNISTO, MAKEHAM, MAKEHAM_INFANT, SILER)}


@dataclass(frozen=True, slots=True)
class Groups:
    """Where the rates stand that a law is set against."""

    middles: Array  # [age]
    widths: Array  # [age]; 0: the hazard at the middle, not a mean over the group
    thinning: Array  # [..., age], fall per year of age of the logarithm of person-years
    centre: float  # age from which the rising term is reckoned


def points(ages: Array, centre: float) -> Groups:
    """Single ages, for the hazard itself."""
    return Groups(ages, np.zeros_like(ages), np.zeros_like(ages), centre)


def grouped(middles: Array, widths: Array, exposure: Array, centre: float) -> Groups:
    """Groups over which the terms are averaged, people thinning out within each as person-years
    per year of age do from the group below to the one above; evenly where one of them has none."""
    with np.errstate(all="ignore"):
        logs = np.log(np.real(exposure) / widths)
        fall = -np.diff(logs, axis=-1) / np.diff(middles)
        across = -(logs[..., 2:] - logs[..., :-2]) / (middles[2:] - middles[:-2])
        rate = np.concatenate([fall[..., :1], across, fall[..., -1:]], axis=-1)
        rate = np.clip(np.where(np.isfinite(rate), rate, 0.0) * widths, -THINNEST, THINNEST)
    return Groups(middles, widths, rate / widths, centre)


@dataclass(frozen=True, slots=True)
class Local:
    """The law at a set of parameters, mu the rate of a group."""

    mu: Array  # [..., age]
    relative: list[Array]  # d log mu / d parameter
    parts: list[Array]  # d log h / d parameter, h the sum of the terms
    curves: dict[tuple[int, int], Array]  # d2 h / d parameters, divided by h; 0 between terms
    keep: Array  # d log mu / d log h
    twist: Array  # what parts j and k of h bend mu by beyond h's own bend

    def bend(self, j: int, k: int) -> Array:
        """d2 mu / d parameters j and k <= j, divided by mu."""
        crossed = self.twist * self.parts[j] * self.parts[k]
        return crossed + self.keep * self.curves[j, k] if (j, k) in self.curves else crossed


def local(law: Law, groups: Groups, parameters: Array) -> Local:
    """Rates of groups and their first two derivatives, [..., age], from parameters [..., k]."""
    heights: list[Array] = []  # first derivatives of h
    curves: dict[tuple[int, int], Array] = {}  # second ones; 0 between terms
    h: Array | float = 0.0
    # side by side in memory: exp of numbers that are not can differ in the last bit
    columns = [np.ascontiguousarray(parameters[..., j, None]) for j in range(len(law.names))]
    for term in law.terms:
        j = len(heights)
        level = columns[j]
        if term.direction:
            height, lean, turn = _exponential(term, groups, level, columns[j + 1])
            heights += [height, height * lean]
            curves[j + 1, j] = heights[j + 1]
            curves[j + 1, j + 1] = height * (lean * lean + turn)
        else:
            height = np.exp(level) * share(groups, term.until)
            heights.append(height)
        curves[j, j] = height
        h = h + height
    parts = [part / h for part in heights]
    keep = np.asarray(1 / (1 + h) if law.saturates else np.ones_like(h))
    mu = np.asarray(h * keep)
    twist = -2 * mu * keep if law.saturates else np.zeros_like(h)
    inside = {where: curve / h for where, curve in curves.items()}
    return Local(mu, [keep * part for part in parts], parts, inside, keep, twist)


def _exponential(term: Term, groups: Groups, level: Array, slope: Array) -> tuple[Array, ...]:
    """The mean of the term over each group, and the first and second derivative of its logarithm
    by the slope. Over a width n with people thinning at r, the mean of exp(s z) is
    exp(s middle) sinhc((s - r) n / 2) / sinhc(r n / 2), sinhc(u) = sinh(u) / u."""
    z = groups.middles - (groups.centre if term.direction > 0 else 0.0)
    half = groups.widths / 2
    of_r = _sinhc(groups.thinning * half)[0]
    logs, first, second = _sinhc((term.direction * slope - groups.thinning) * half)
    height = np.exp(np.ascontiguousarray(level + term.direction * slope * z + logs - of_r))
    return height, term.direction * (z + half * first), half * half * second


def _sinhc(u: Array) -> tuple[Array, Array, Array]:
    """log(sinh(u) / u) and its first two derivatives, even through 0."""
    near = np.abs(u) < NEAR
    v, w = np.where(near, u, 0.0), np.where(near, 1.0, u)
    w = np.where(np.real(w) < 0, -w, w)
    v2, sign = v * v, np.where(np.real(u) < 0, -1.0, 1.0)
    below = np.exp(-2 * w)
    coth = (1 + below) / (1 - below)
    logs = np.where(
        near,
        v2 * (1 / 6 - v2 * (1 / 180 - v2 * (1 / 2835 - v2 / 37800))),
        w + np.log1p(-below) - np.log(2 * w),
    )
    first = np.where(
        near, v * (1 / 3 - v2 * (1 / 45 - v2 * (2 / 945 - v2 / 4725))), sign * (coth - 1 / w)
    )
    second = np.where(
        near, 1 / 3 - v2 * (1 / 15 - v2 * (2 / 189 - v2 / 675)), 1 / (w * w) - coth * coth + 1
    )
    return logs, first, second


def share(groups: Groups, until: float) -> Array:
    """Part of each group below an age; of a point, all or nothing."""
    if np.isinf(until):
        return np.ones_like(groups.middles)
    inside = np.clip(until - (groups.middles - groups.widths / 2), 0.0, groups.widths)
    point = groups.widths == 0
    part = inside / np.where(point, 1.0, groups.widths)
    return np.where(point, groups.middles < until, part).astype(float)
