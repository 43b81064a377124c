"""One life table as a bent copy of another: the relational logit of survivors.

With Y(x) = 1/2 log((1 - l(x)) / l(x)), a table is read as Y = alpha + beta Ys, Ys that of a
standard. Alpha is the level (above 0: fewer survive to every age), beta the shape (above 1: deaths
lie closer together than in the standard, hence fewer at young ages and more at old ones).

Source: Brass (1971), On the scale of mortality, in Biological Aspects of Demography, 69-110.
Arrays inside this file are [age, row].
"""

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit

from engine.ages import Array
from engine.banded import solve, total
from engine.chain import Chain

STEPS = 100
LONGEST_STEP = 0.5  # of alpha and beta at once; keeps Fisher's steps from running away
SETTLED = 1e-10
LEAST_GROUPS = 2


@dataclass(frozen=True, slots=True)
class Relation:
    """Level and shape of each population against its standard, [...].

    The errors hold chance in deaths only; the standard is taken as known. A deviance far above its
    freedom says that no level and shape make the standard into this table.
    """

    alpha: Array
    beta: Array
    alpha_error: Array
    beta_error: Array
    deviance: Array
    freedom: Array  # age groups less two
    standard: Array  # [..., age], survivors of the standard

    @property
    def lx(self) -> Array:
        """Survivors of the table that the relation implies, [..., age]."""
        with np.errstate(all="ignore"):
            logits = _logits(self.standard)
            bent = self.alpha[..., None] + self.beta[..., None] * logits
        return np.asarray(expit(-2 * bent))


@dataclass(frozen=True, slots=True)
class Shift:
    """Level and shape of one population less those of another, with standard errors, [...]."""

    alpha: Array
    beta: Array
    alpha_error: Array
    beta_error: Array


def relate(chain: Chain, standard: Array) -> Relation:
    """Level and shape of the populations of a chain against survivors of a standard.

    The closed groups of the panel count, with the chain's own ax: of those who entered a group,
    (person-years + (n - ax) deaths) / n, so many died. `standard` [..., age] holds survivors at the
    starts of the panel's groups, as a table on its grid does.

    Missing, source: as `relate_counts`.
    """
    closed = len(chain.panel.grid) - 1
    width, ax = chain.panel.grid.widths[:closed], chain.table.ax[..., :closed]
    exposure = chain.rates.exposure[..., :closed]
    deaths = chain.rates.mx[..., :closed] * exposure
    return relate_counts(deaths, (exposure + (width - ax) * deaths) / width, standard)


def relate_counts(deaths: Array, entered: Array, standard: Array) -> Relation:
    """The alpha and beta of greatest binomial likelihood, deaths among those who entered.

    So each group has the weight of its deaths, and one without deaths does no harm.

    Shape:   deaths, entered [..., group], standard [..., group + 1] broadcasts -> [...].
    Missing: nan where a count is nan, where nobody died, or where fewer than two groups tell (those
             in which somebody of the standard dies and somebody survives, and where somebody
             entered); where no likelihood is greatest.
    Raises:  ValueError where the standard has not one age more than the groups.
    Source:  Brass (1971), as above (the relation); McCullagh & Nelder (1989), Generalized Linear
             Models, chapters 2 and 4 (the likelihood, its errors and deviance).
    """
    deaths, entered = np.broadcast_arrays(deaths, entered)
    if standard.shape[-1] != deaths.shape[-1] + 1:
        raise ValueError(
            f"the standard has {standard.shape[-1]} ages but there are {deaths.shape[-1]} groups; "
            "give its survivors at the start of each group and at the end of the last"
        )
    batch = deaths.shape[:-1]
    survivors = np.array(np.broadcast_to(standard, (*batch, standard.shape[-1])))
    with np.errstate(all="ignore"):
        rows = _rows_of(deaths, entered, survivors)
        at = _climbed(rows)
        errors, deviance = _errors(rows, at), rows.deviance(at)
    freedom = rows.known.sum(axis=0) - 2.0
    columns = (column.reshape(batch) for column in (*at, *errors, deviance, freedom))
    alpha, beta, alpha_error, beta_error, deviance, freedom = columns
    return Relation(alpha, beta, alpha_error, beta_error, deviance, freedom, survivors)


def shift(this: Relation, that: Relation) -> Shift:
    """How this differs from that in level and shape against one standard.

    Populations that share deaths move together; then the errors are too large.
    Raises: ValueError where the standards differ.
    """
    if not np.array_equal(this.standard, that.standard, equal_nan=True):
        raise ValueError("the standards differ; relate both populations to one and the same")
    return Shift(
        this.alpha - that.alpha,
        this.beta - that.beta,
        np.hypot(this.alpha_error, that.alpha_error),
        np.hypot(this.beta_error, that.beta_error),
    )


class _Hazard(NamedTuple):
    """Cumulated over each group, and its derivatives, [group, row]."""

    reach: Array
    alpha: Array
    beta: Array


@dataclass(frozen=True, slots=True)
class _Rows:
    """Counts of the groups that tell (elsewhere 0) and the standard's logits."""

    deaths: Array  # [group, row]
    entered: Array
    logits: Array  # [group + 1, row]
    known: NDArray[np.bool_]

    def __getitem__(self, where: NDArray[np.intp]) -> "_Rows":
        return _Rows(
            self.deaths[:, where],
            self.entered[:, where],
            self.logits[:, where],
            self.known[:, where],
        )

    def hazard(self, at: Array) -> _Hazard:
        twice = 2 * (at[0] + at[1] * self.logits)
        gone = expit(twice)
        moved = np.where(gone > 0, 2 * self.logits * gone, 0.0)  # at birth 0 times minus infinity
        parts = (np.logaddexp(0.0, twice), 2 * gone, moved)
        return _Hazard(*(np.where(self.known, np.diff(part, axis=0), 1.0) for part in parts))

    def information(self, hazard: _Hazard) -> Array:
        """Of alpha and beta, as diagonals [2, 2, row]."""
        reach, alpha, beta = hazard
        weight = self.entered / np.expm1(reach)
        a, b, c = (total(weight * part) for part in (alpha * alpha, alpha * beta, beta * beta))
        return np.stack([np.stack([a, c]), np.stack([b, np.zeros_like(b)])])

    def score(self, hazard: _Hazard) -> Array:
        """Derivative of the log likelihood, [2, row]."""
        reach, alpha, beta = hazard
        residual = self.deaths / -np.expm1(-reach) - self.entered
        return np.stack([total(residual * alpha), total(residual * beta)])

    def deviance(self, at: Array) -> Array:
        dying = -np.expm1(-self.hazard(at)[0])
        lived = self.entered - self.deaths
        died = np.where(
            self.deaths > 0, self.deaths * np.log(self.deaths / self.entered / dying), 0
        )
        stayed = np.where(lived > 0, lived * np.log(lived / self.entered / (1 - dying)), 0.0)
        return 2 * total(died + stayed)


def _rows_of(deaths: Array, entered: Array, standard: Array) -> _Rows:
    died, came, survivors = (
        np.ascontiguousarray(part.reshape(-1, part.shape[-1]).T)
        for part in (deaths, entered, standard)
    )
    known = (survivors[1:] > 0) & (survivors[1:] < survivors[:-1]) & (came > 0)
    known |= np.isnan(survivors[1:] + died + came)
    died, came = np.where(known, died, 0.0), np.where(known, came, 0.0)
    poor = (known.sum(axis=0) < LEAST_GROUPS) | ~(total(died) > 0)
    return _Rows(np.where(poor, np.nan, died), came, _logits(survivors), known)


def _climbed(rows: _Rows) -> Array:
    """Fisher's steps from the standard itself: alpha and beta, [2, row]."""
    found = np.stack([np.zeros(rows.deaths.shape[1]), np.ones(rows.deaths.shape[1])])
    left = np.arange(found.shape[1])
    for _ in range(STEPS):
        part = rows[left]
        hazard = part.hazard(found[:, left])
        step = solve(part.information(hazard), part.score(hazard))
        size = np.abs(step).max(axis=0)
        found[:, left] += step * np.minimum(1.0, LONGEST_STEP / size)
        left = left[size > SETTLED]  # nan rows stay nan
        if not left.size:
            return found
    found[:, left] = np.nan
    return found


def _errors(rows: _Rows, at: Array) -> tuple[Array, Array]:
    bands = rows.information(rows.hazard(at))
    (a, c), b = bands[0], bands[1, 0]
    return np.sqrt(c / (a * c - b * b)), np.sqrt(a / (a * c - b * b))


def _logits(lx: Array) -> Array:
    """1/2 log((1 - l) / l); minus infinity at birth."""
    return np.asarray((np.log1p(-lx) - np.log(lx)) / 2)
