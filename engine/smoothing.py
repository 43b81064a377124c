"""Smooth curves of death rates over age: Poisson regression on B-splines with a roughness penalty.

Source: Eilers & Marx (1996), Flexible smoothing with B-splines and penalties, Statistical Science
11; Currie, Durban & Eilers (2004), Statistical Modelling 4 (Poisson deaths given person-years).
Arrays inside this file are [age or coefficient, row], so that every step is one operation over all
rows; a row never learns of its neighbours, and its result does not depend on them.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from engine.ages import Array
from engine.banded import added, inner, inverse, log_determinant, roughness, solve, total

Places = NDArray[np.intp]

PENALTIES = 10.0 ** np.arange(-1.0, 6.5, 0.5)  # from the nearly unsmoothed to a straight line
ORDER = 2  # of the differences that are penalised
STEPS = 60  # of Fisher scoring; rows that settle leave earlier, 4 to 8 are usual
SETTLED = 1e-7  # a step so short is the last: the next would be about its square
NEAR = 1e-4  # the same while penalties are compared


@dataclass(frozen=True, slots=True)
class Design:
    """The splines at some ages: at each, the first of the four that are not 0, and the four."""

    size: int
    first: Places  # [point]
    local: Array  # [point, 4]
    layers: Places  # [layer, segment], a point between two knots, or -1 where there is none further

    def along(self, coefficients: Array) -> Array:
        """The curve at the ages: [coefficient, row] -> [point, row]."""
        value: Array = self.local[:, 0, None] * coefficients[self.first]
        for i in (1, 2, 3):
            value += self.local[:, i, None] * coefficients[self.first + i]
        return value

    def back(self, values: Array) -> Array:
        """sum_x B_x v_x: [point, row] -> [coefficient, row]."""
        found = np.zeros((self.size, values.shape[1]), values.dtype)
        segments = self._by_segment(self.local, values)
        for i in range(4):
            found[i : i + len(segments)] += segments[:, i]
        return found

    def gram(self, weight: Array) -> Array:
        """Diagonals of sum_x w_x B_x B_x': [point, row] -> [4, coefficient, row]."""
        bands = np.zeros((4, self.size, weight.shape[1]), weight.dtype)
        left, right = np.triu_indices(4)
        segments = self._by_segment(self.local[:, left] * self.local[:, right], weight)
        for pair, (i, j) in enumerate(zip(left, right, strict=True)):
            bands[j - i, i : i + len(segments)] += segments[:, pair]
        return bands

    def _by_segment(self, factors: Array, values: Array) -> Array:
        """Factors times values, summed over the points between two knots: [point, k] and [point,
        row] -> [segment, k, row]. One point of every segment at a time: few steps, each large."""
        factors = np.vstack([factors, np.zeros_like(factors[:1])])  # for segments without a point
        found = np.zeros((self.size - 3, factors.shape[1], values.shape[1]), values.dtype)
        for points in self.layers:
            found += factors[points][:, :, None] * values[points][:, None, :]
        return found

    def form(self, bands: Array) -> Array:
        """B_x' A B_x: [4, coefficient, row] -> [point, row]."""
        found = np.zeros((len(self.first), bands.shape[2]))
        for d in range(4):
            for i in range(4 - d):
                weight = self.local[:, i] * self.local[:, i + d] * (1 if d == 0 else 2)
                found += weight[:, None] * bands[d, self.first + i]
        return found


@dataclass(frozen=True, slots=True)
class Basis:
    """Cubic B-splines on equally spaced knots over the ages low to high."""

    low: float
    high: float
    segments: int

    @property
    def size(self) -> int:
        return self.segments + 3

    def at(self, ages: Array) -> Design:
        place = (np.asarray(ages) - self.low) * self.segments / (self.high - self.low)
        first = np.clip(np.floor(place), 0, self.segments - 1).astype(np.intp)
        u = place - first
        values = ((1 - u) ** 3, 3 * u**3 - 6 * u**2 + 4, 3 * (u + u**2 - u**3) + 1, u**3)
        order = np.argsort(first, kind="stable")
        depth = np.arange(len(order)) - np.searchsorted(first[order], first[order])
        layers = np.full((depth.max(initial=0) + 1, self.segments), -1)
        layers[depth, first[order]] = order
        return Design(self.size, first, np.stack(values, axis=-1) / 6, layers)


@dataclass(frozen=True, slots=True)
class Curve:
    """A smooth curve of log rates for each population; nan where the fit did not settle."""

    basis: Basis
    coefficients: Array  # [..., coefficient]
    penalty: Array  # [...], weight of the roughness

    def log_rates(self, ages: Array) -> Array:
        """[point] -> [..., point]."""
        return self._shaped(self.basis.at(ages).along(_rows(self.coefficients)))

    def _shaped(self, values: Array) -> Array:
        """[point, row] -> [..., point]."""
        return values.T.reshape(*self.penalty.shape, len(values))


@dataclass(frozen=True, slots=True)
class Fit(Curve):
    """A curve with the counts it was fitted to."""

    ages: Array  # [age]
    deaths: Array  # [..., age]
    exposure: Array  # [..., age]

    def pull(self, ages: Array, g: Array) -> Array:
        """Gradient in the rates at the fitted ages, exposure and penalty held, from the gradient g
        [..., point] in the log rates at `ages` [point].

        By the implicit function theorem: the penalised score B'(D - E exp(B t)) - w P t is 0 at the
        fit, so dt = (B' diag(fitted deaths) B + w P)^-1 B' dD.
        """
        moved = solve(self._information, self.basis.at(ages).back(_rows(g)))
        return self._shaped(_rows(self.exposure) * self.basis.at(self.ages).along(moved))

    def standard_errors(self, ages: Array) -> Array:
        """Of the log rates at any ages, [point] -> [..., point]: Bayesian, (B'WB + w P)^-1.

        They hold what chance in deaths moves and, on average over age, what the smoothing bends;
        the sandwich form holds the first alone.
        Source: Wahba (1983), Journal of the Royal Statistical Society B 45, 133-150; Marra & Wood
                (2012), Scandinavian Journal of Statistics 39, 53-74.
        """
        return np.sqrt(self._shaped(self.basis.at(ages).form(inverse(self._information))))

    @property
    def dimension(self) -> Array:
        """Effective number of coefficients, trace of (B'WB + w P)^-1 B'WB: [...]."""
        rough = _penalty(self.basis.size, self.penalty.ravel())
        removed = inner(inverse(self._information), rough)
        return np.asarray(self.basis.size - removed.reshape(self.penalty.shape))

    @property
    def deviance(self) -> Array:
        """Twice the log likelihood's distance to that of the counts themselves, [...]."""
        deaths, fitted = _rows(self.deaths), self._fitted
        logs = np.log(np.where(deaths > 0, deaths / fitted, 1.0))
        return np.asarray(2 * total(deaths * logs - deaths + fitted).reshape(self.penalty.shape))

    @property
    def bic(self) -> Array:
        """Bayesian information criterion: deviance + log(ages) * effective dimension, [...]."""
        known = (self.exposure > 0).sum(axis=-1)
        return np.asarray(self.deviance + np.log(known) * self.dimension)

    @property
    def evidence(self) -> Array:
        """Minus twice the log of the likelihood of the penalty, the curve integrated out by
        Laplace's method and a constant left out, [...].

        Source: Wood (2011), Journal of the Royal Statistical Society B 73, 3-36, section 2.
        """
        size, weight, shape = self.basis.size, self.penalty, self.penalty.shape
        bent = total(np.diff(_rows(self.coefficients), ORDER, axis=0) ** 2).reshape(shape)
        volume = log_determinant(self._information).reshape(shape)
        prior = weight * bent - (size - ORDER) * np.log(weight)
        return np.asarray(self.deviance + prior + volume)

    @property
    def _fitted(self) -> Array:
        """Deaths of the curve, [age, row]."""
        logs = self.basis.at(self.ages).along(_rows(self.coefficients))
        return np.asarray(_rows(self.exposure) * np.exp(logs))

    @property
    def _information(self) -> Array:
        gram = self.basis.at(self.ages).gram(self._fitted)
        return added(gram, _penalty(self.basis.size, self.penalty.ravel()))


def fit(
    basis: Basis,
    ages: Array,
    deaths: Array,
    exposure: Array,
    *,
    start: Curve | None = None,
) -> Fit:
    """Penalised Poisson fit of log rates: deaths ~ Poisson(exposure * exp(curve(age))).

    The penalty is the sum of squared second differences of the coefficients; its weight is the one
    of PENALTIES with the least Bayesian information criterion. With `start`, its weight is kept and
    the fit begins from its coefficients. Complex counts keep the weight of their real parts.

    Shape:   ages [age], deaths, exposure [..., age], `start` broadcasts -> curves [...].
    Missing: nan in, nan out; an age with exposure of 0 has no weight; no deaths at all gives nan.
    """
    exposure = np.broadcast_to(exposure, deaths.shape)
    if start is None:
        tried = fit_each(basis, ages, np.real(deaths), np.real(exposure))
        with np.errstate(all="ignore"):
            score = tried.bic
        start = _taken(tried, np.argmin(np.where(np.isnan(score), np.inf, score), axis=-1))
    return _settled(ages, deaths, exposure, start)


def fit_each(basis: Basis, ages: Array, deaths: Array, exposure: Array) -> Fit:
    """The fit with each of PENALTIES, near enough to compare: [..., age] -> fits [..., penalty]."""
    begin = _first_smooth(basis, ages, deaths, exposure)[..., None, :]
    shape = (*deaths.shape[:-1], len(PENALTIES))
    deaths, exposure = (
        np.broadcast_to(counts[..., None, :], (*shape, len(ages))) for counts in (deaths, exposure)
    )
    start = Curve(basis, begin, np.broadcast_to(PENALTIES, shape))
    return _settled(ages, deaths, exposure, start, settled=NEAR)


def posterior_curves(tried: Fit, deaths: Array, noise: Array) -> Curve:
    """Curves as the counts leave them open: a draw of the penalty by its evidence, each weight of
    PENALTIES being as likely beforehand, then one of the curve by Laplace's method.

    The penalised score moves by what the simulated deaths differ from those fitted and by normal
    noise of the penalty's own size; so the curves spread by (B'WB + w P)^-1, and those of two
    populations move together by the deaths that they share.

    Shape:  tried [..., penalty] from `fit_each`, deaths [draw, ..., age] with the deaths fitted as
            their mean, noise [draw, ..., coefficient - 1] standard normal -> curves [draw, ...].
    Source: Rue, Martino & Chopin (2009), Journal of the Royal Statistical Society B 71, 319-392
            (weights on a grid of penalties); Wahba (1983), the same B 45, 133-150 (the spread).
    """
    batch, basis = deaths.shape[:-1], tried.basis
    with np.errstate(all="ignore"):
        score = tried.evidence
        likely = np.exp((np.fmin.reduce(score, axis=-1)[..., None] - score) / 2)
    reach = np.cumsum(np.where(np.isnan(likely), 0.0, likely), axis=-1)
    chance = ndtr(noise[..., :1]) * reach[..., -1:]
    picked = np.minimum((chance > reach).sum(axis=-1), len(PENALTIES) - 1)
    rows = np.arange(tried.penalty[..., 0].size).reshape(tried.penalty.shape[:-1])
    where = (rows * len(PENALTIES) + picked).ravel()
    weight = tried.penalty.reshape(-1)[where]
    residual = basis.at(tried.ages).back(_rows(deaths - tried.deaths[..., 0, :]))
    padded = np.pad(_rows(noise[..., 1:]), ((ORDER, ORDER), (0, 0)))
    with np.errstate(all="ignore"):
        right = residual + np.sqrt(weight) * np.diff(padded, ORDER, axis=0)
        moved = solve(tried._information[:, :, where], right)
    curves = _rows(tried.coefficients)[:, where] + moved
    return Curve(basis, curves.T.reshape(*batch, basis.size), weight.reshape(batch))


def _taken(tried: Fit, best: Places) -> Fit:
    """Of the last axis of the batch, one each."""

    def take(array: Array) -> Array:
        at = np.expand_dims(best, tuple(range(best.ndim, array.ndim)))
        return np.take_along_axis(array, at, axis=best.ndim).squeeze(best.ndim)

    parts = (tried.coefficients, tried.penalty, tried.deaths, tried.exposure)
    coefficients, penalty, deaths, exposure = (take(part) for part in parts)
    return Fit(tried.basis, coefficients, penalty, tried.ages, deaths, exposure)


def _first_smooth(basis: Basis, ages: Array, deaths: Array, exposure: Array) -> Array:
    """Coefficients of a first smooth through the crude log rates, half a death added."""
    counts, years, design = _rows(deaths), _rows(exposure), basis.at(ages)
    with np.errstate(all="ignore"):  # without deaths there is no first smooth, and no last
        overall = total(counts) / total(years)
        logs = np.log((counts + 0.5) / (years + 0.5 / overall))
        fitted = years * np.exp(logs)
        bands = added(design.gram(fitted), _penalty(basis.size, np.ones(1)))
        begin = solve(bands, design.back(fitted * logs))
    return begin.T.reshape(*deaths.shape[:-1], basis.size)


def _settled(
    ages: Array, deaths: Array, exposure: Array, start: Curve, settled: float = SETTLED
) -> Fit:
    """Fisher scoring at the penalty of `start` until each row's coefficients stand still."""
    batch, basis = deaths.shape[:-1], start.basis
    penalty = np.array(np.broadcast_to(start.penalty, batch))
    kind = np.result_type(deaths, exposure, start.coefficients)
    found = _rows(np.broadcast_to(start.coefficients, (*batch, basis.size))).astype(kind)
    counts, years, weight = _rows(deaths), _rows(exposure), penalty.ravel()
    design, left = basis.at(ages), np.arange(found.shape[1])
    with np.errstate(all="ignore"):  # rows that cannot be fitted end as nan
        for _ in range(STEPS):
            part = slice(None) if left.size == len(weight) else left  # no copy of the whole
            old = found[:, part]
            new = _step(design, counts[:, part], years[:, part], weight[part], old)
            moved = np.max(np.abs(new - old), axis=0)
            found[:, part] = new
            left = left[moved > settled]  # nan rows stay nan
            if not left.size:
                break
        if np.iscomplexobj(found):  # an imaginary part settles one step behind its real part
            found = _step(design, counts, years, weight, found)
    found[:, left] = np.nan
    return Fit(basis, found.T.reshape(*batch, basis.size), penalty, ages, deaths, exposure)


def _step(design: Design, deaths: Array, exposure: Array, weight: Array, old: Array) -> Array:
    logs = design.along(old)
    fitted = exposure * np.exp(logs)
    bands = added(design.gram(fitted), _penalty(design.size, weight))
    return solve(bands, design.back(deaths - fitted + fitted * logs))


def _penalty(size: int, weight: Array) -> Array:
    return np.asarray(roughness(size, ORDER)[:, :, None] * weight)


def _rows(array: Array) -> Array:
    """[..., age] -> [age, row], a copy in that order."""
    return np.ascontiguousarray(array.reshape(-1, array.shape[-1]).T)
