"""Mortality laws fitted by Poisson likelihood, many populations at once.

A law is a sum of terms, each exponential in age or constant (engine/hazards.py):

    Gompertz (1825)               exp(level + slope (x - centre))
    Gompertz-Makeham (1860)       ... + background
    Gompertz-Makeham, infants     ... + background + an excess in the first year of life
    Siler (1979)                  ... + background + exp(infant - decline x)
    Kannisto                      h / (1 + h), h as in Gompertz

Each population is fitted for itself: a result does not depend on what else is in the batch.
"""

from dataclasses import dataclass, replace

import numpy as np
from scipy.special import gammaln, xlogy

from engine.ages import Array
from engine.hazards import (
    GOMPERTZ,
    KANNISTO,
    LAWS,
    MAKEHAM,
    MAKEHAM_INFANT,
    SILER,
    Groups,
    Law,
    grouped,
    local,
    points,
    share,
)
from engine.likelihood import Flags, Rows, Top, climb, information, solve, total

__all__ = [
    "GOMPERTZ",
    "KANNISTO",
    "LAWS",
    "LEAST_AGES",
    "MAKEHAM",
    "MAKEHAM_INFANT",
    "SILER",
    "Fit",
    "Law",
    "fit",
]

LEAST_AGES = 3
MIDDLE_AGE = 40.0  # from here the rising term stands nearly alone: where its search begins


@dataclass(frozen=True, slots=True)
class Fit:
    """A fitted law; parameters are nan where none could be fitted.

    `at_bound` marks a rate held at 0 (the background, or the excess of the first year), whose
    parameter is minus infinity: the likelihood falls as it leaves 0. It counts as known in the
    variances of the others.
    """

    law: Law
    groups: Groups
    deaths: Array  # [..., age]
    exposure: Array
    parameters: Array  # [..., parameter], in the order of law.names
    at_bound: Flags  # [..., parameter]

    @property
    def converged(self) -> Flags:
        """Whether a maximum was found, [...]."""
        return np.asarray(~np.isnan(np.real(self.parameters)).any(axis=-1))

    @property
    def level(self) -> Array:
        return self.parameters[..., self.law.position("level")]

    @property
    def slope(self) -> Array:
        return self.parameters[..., self.law.position("slope")]

    @property
    def centre(self) -> float:
        """The age at which exp(level) is the rising term's hazard."""
        return self.groups.centre

    def hazard(self, ages: Array) -> Array:
        """The law at any ages: [k] -> [..., k]."""
        return self.law.hazard(ages, self.parameters, self.centre)

    @property
    def rates(self) -> Array:
        """The law's rate of each fitted group, [..., age]."""
        with np.errstate(all="ignore"):
            return local(self.law, self.groups, self.parameters).mu

    @property
    def information(self) -> Array:
        """Minus the second derivative of the log likelihood, [..., parameter, parameter]; of one at
        its bound, that of the unit matrix."""
        with np.errstate(all="ignore"):
            here = local(self.law, self.groups, self.parameters)
            return information(here, self.deaths, self.exposure, self.at_bound)

    @property
    def covariance(self) -> Array:
        """Of the parameters, [..., parameter, parameter]: the inverse of the information observed;
        0 for one at its bound."""
        found = self.information
        free = ~(self.at_bound[..., None] | self.at_bound[..., None, :])
        with np.errstate(all="ignore"):
            columns = [solve(found, unit).values for unit in np.eye(len(self.law.names))]
            return np.where(free, np.stack(columns, axis=-1), 0.0)

    @property
    def se(self) -> Array:
        """Standard errors of the parameters, [..., parameter]; nan for one at its bound."""
        with np.errstate(all="ignore"):
            variances = np.diagonal(self.covariance, axis1=-2, axis2=-1)
            return np.where(self.at_bound, np.nan, np.sqrt(variances))

    @property
    def residuals(self) -> Array:
        """Deviance residuals, [..., age]: their squares add up to the deviance. 0 where a group has
        neither deaths nor person-years."""
        with np.errstate(all="ignore"):
            expected = self.exposure * self.rates
            parts = xlogy(self.deaths, self.deaths / expected) - (self.deaths - expected)
            size = np.sqrt(2 * np.maximum(parts, 0.0))
            signed = np.where(self.deaths < expected, -size, size)
            return np.where((self.exposure == 0) & self.converged[..., None], 0.0, signed)

    @property
    def deviance(self) -> Array:
        """Twice the log likelihood lost against rates of their own for all groups, [...]."""
        return total(self.residuals**2)

    @property
    def aic(self) -> Array:
        """Akaike's criterion, -2 log likelihood + 2 parameters; one at its bound is not counted.

        Source: Akaike (1974), IEEE Transactions on Automatic Control 19, 716-723.
        """
        with np.errstate(all="ignore"):
            expected = self.exposure * self.rates
            logs = xlogy(self.deaths, expected) - expected - gammaln(self.deaths + 1)
            free = np.sum(~self.at_bound, axis=-1)
            return np.asarray(2 * free - 2 * total(logs))

    def pull(self, ages: Array, g: Array) -> Array:
        """Gradient in the rates at the fitted groups, exposure held, from that in hazard(ages)."""
        with np.errstate(all="ignore"):
            here = local(self.law, points(ages, self.centre), self.parameters)
            by_parameter = [total(g * here.mu * part) for part in here.relative]
            return self.pull_parameters(np.stack(by_parameter, axis=-1))

    def pull_parameters(self, g: Array) -> Array:
        """The same from the gradient in the parameters, [..., parameter] -> [..., age]."""
        return np.asarray(self.exposure * self.per_death(g))

    def per_death(self, g: Array) -> Array:
        """What one death more in each fitted group moves, [..., age], from the gradient in the
        parameters, [..., parameter]; 0 where there are no person-years.

        By the implicit function theorem: the score is 0 at the fit, so d parameters =
        information^-1 d score. One at its bound passes nothing on.
        """
        with np.errstate(all="ignore"):
            here = local(self.law, self.groups, self.parameters)
            matrix = information(here, self.deaths, self.exposure, self.at_bound)
            to = solve(matrix, np.where(self.at_bound, 0.0, g)).values
            moved = sum(to[..., j, None] * part for j, part in enumerate(here.relative))
            return np.where(self.exposure == 0, 0.0, moved)


def fit(
    law: Law, ages: Array, deaths: Array, exposure: Array, *, widths: Array | None = None
) -> Fit:
    """The law of greatest Poisson likelihood, deaths ~ Poisson(exposure * rate of the group).

    With `widths` a group's rate is the law's mean over the group, in closed form, over people who
    thin out within it as person-years do from the group below to the one above. Taken as even, in
    five-year groups slopes read 1.4 % too low and modes 0.15 of a year too high; so taken, 0.05 %
    and 0.004. (Of Kannisto's law h is averaged, which makes its rate up to 0.2 % too high.) Without
    widths the rate is the hazard at `ages`: good for old ages in single years, and not for the
    first year of life, in which it falls steeply.

    The best background may be 0, which has no logarithm, and so may be the excess of the first year
    where no infant died: the rate is then held at 0 and marked.

    Shape:   ages, widths [age] (middles of closed groups); deaths, exposure [..., age].
    Missing: nan where a count is nan, where fewer ages have person-years than the law has
             parameters (three at least), where there are no deaths, and where the likelihood has
             no maximum; of a law of several terms also where its rates do not rise in age or,
             with Siler, fall from birth. Deaths at an age without person-years are not counted.
    Source:  Siler (1979), Ecology 60, 750-757; Thatcher, Kannisto & Vaupel (1998), The Force of
             Mortality at Ages 80 to 120; Brillinger (1986), Biometrics 42 (Poisson deaths).
    """
    deaths, exposure = np.broadcast_arrays(deaths, exposure)
    deaths = np.where(exposure == 0, 0.0 * deaths, deaths)
    centre = float(ages.mean()) if len(ages) else 0.0
    groups = points(ages, centre) if widths is None else grouped(ages, widths, exposure, centre)
    thinning = np.broadcast_to(groups.thinning, deaths.shape)
    rows = Rows(law, replace(groups, thinning=_flat(thinning)), _flat(deaths), _flat(exposure))
    with np.errstate(all="ignore"):
        top = _best(rows)
    shape = (*deaths.shape[:-1], len(law.names))
    return Fit(
        law, groups, deaths, exposure, top.parameters.reshape(shape), top.held.reshape(shape)
    )


def _flat(values: Array) -> Array:
    rows = int(np.prod(values.shape[:-1]))
    return np.ascontiguousarray(values.reshape(rows, values.shape[-1]))


def _best(rows: Rows) -> Top:
    """The greatest likelihood; nan where a term was held at 0 though it rises as that leaves 0."""
    law, start = rows.law, _start(rows)
    top = climb(rows, start, np.zeros(start.shape, bool))
    found = _proper(law, top.parameters)
    spare = rows.deaths / local(law, rows.groups, found).mu - rows.exposure
    for j, term in law.bounded.items():
        rises = np.real(total(spare * share(rows.groups, term.until))) > 0
        found = np.where((rises & top.held[:, j])[:, None], np.nan, found)
    return Top(found, top.held & ~np.isnan(np.real(found)))


def _proper(law: Law, parameters: Array) -> Array:
    """nan where a law of several terms does not rise with age, or fall from birth, as it should."""
    if len(law.terms) == 1:
        return parameters
    slopes = [law.position(name) for name in ("slope", "decline") if name in law.names]
    proper = np.all(np.real(parameters[:, slopes]) > 0, axis=-1, keepdims=True)
    return np.where(proper, parameters, np.nan)


def _usable(rows: Rows) -> Flags:
    """Whether there is something to fit, [row, 1]."""
    deaths, exposure = np.real(rows.deaths), np.real(rows.exposure)
    known = np.isfinite(deaths + exposure).all(axis=-1, keepdims=True)
    least = max(LEAST_AGES, len(rows.law.names))
    enough = (exposure > 0).sum(axis=-1, keepdims=True) >= least
    return np.asarray(known & enough & (deaths > 0).any(axis=-1, keepdims=True))


def _start(rows: Rows) -> Array:
    """Where the search begins, [row, parameter]; nan where nothing can be fitted."""
    deaths, exposure = np.real(rows.deaths), np.real(rows.exposure)
    rate = total(deaths) / total(exposure)
    if rows.law.saturates:
        rate = np.minimum(rate, 0.9) / (1 - np.minimum(rate, 0.9))
    start = {"level": np.log(rate), "slope": np.full(rate.shape, 0.1)}
    if len(rows.law.terms) > 1:
        start = _start_of_terms(rows, start)
    stacked = np.stack([start[name] for name in rows.law.names], axis=-1)
    kind = np.result_type(rows.deaths, rows.exposure, float)
    return np.where(_usable(rows), stacked, np.nan).astype(kind)


def _start_of_terms(rows: Rows, rising: dict[str, Array]) -> dict[str, Array]:
    """The rising term from the ages above 40, or the upper half; the others from ages below."""
    middles = rows.groups.middles
    deaths, exposure = np.real(rows.deaths), np.real(rows.exposure)
    old = middles >= min(MIDDLE_AGE, float(np.median(middles)))
    alone = Rows(GOMPERTZ, rows.groups, np.where(old, deaths, 0.0), np.where(old, exposure, 0.0))
    begin = np.stack(list(rising.values()), axis=-1)
    found = climb(alone, begin, np.zeros(begin.shape, bool)).parameters
    level, slope = (
        np.where(found[:, 1] > 0, found[:, j], rising[name])
        for j, name in enumerate(("level", "slope"))
    )
    young = (middles > 1) & ~old
    lost, lived = (total(np.where(young, counts, 0.0)) for counts in (deaths, exposure))
    background = (lost + 0.5) / (2 * lived)
    background = np.where(np.isfinite(background), background, np.exp(rising["level"]) / 10)
    infant = np.maximum(deaths[:, 0] / exposure[:, 0] - background, background)
    return {
        "level": level,
        "slope": slope,
        "background": np.log(background),
        "infant": np.log(np.where(np.isfinite(infant), infant, background)),
        "decline": np.ones_like(level),
    }
