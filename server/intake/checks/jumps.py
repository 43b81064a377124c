"""Checks of counts against the past and the future of their own area and sex."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from scipy.special import betainc, gammainc, gammaincc

from engine.ages import Array
from server.intake.cells import Flags, Ints
from server.intake.checks.check import Check
from server.intake.courses import Course, counterpart, courses, neighbours, runs
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value

NEIGHBOURS = (-2, -1, 1, 2)  # years looked at for the local level, as far as the series has them
AIM = 1e-4  # areas, sexes and years flagged by chance alone
SPREAD = 1.35  # chance of the median of four counts beside the chance of the count itself
MIDDLE = 0.4549  # median of a chi-square number with one degree of freedom
LEAST = (3.5, 4.5)  # standard deviations below, above; within, no tail is as thin as the aim
ONE_AGE = 0.7  # of what all ages are off by: then that age is named, not all together
STEP = 2_000  # lines looked at together


@dataclass(frozen=True, slots=True)
class Limit:
    """Shares of the local level within which nothing is said, whatever chance allows: real years
    differ by as much."""

    together: float
    at_an_age: float


LIMITS = {"deaths": Limit(0.15, 0.30), "person_years": Limit(0.10, 0.25)}


def local_level(values: Array, place: Ints) -> Array:
    """What the years around let expect, [line, column]: their median; where that lies between two
    of them, what is nearest to the count itself. nan where fewer than two are there."""
    found = list(neighbours(place, NEIGHBOURS))
    full = np.logical_and.reduce([near for _, near in found])
    level = np.full(values.shape, np.nan)
    if full.any():  # of most lines the four lines around are the four years around
        first, second, third, fourth = values[:-4], values[1:-3], values[3:-1], values[4:]
        low = np.maximum(np.minimum(first, second), np.minimum(third, fourth))
        high = np.minimum(np.maximum(first, second), np.maximum(third, fourth))
        level[2:-2] = _between(values[2:-2], low, high)
    rest = np.flatnonzero(~full)
    if len(rest):
        around = np.stack(
            [np.where(near[rest, None], values[other[rest]], np.nan) for other, near in found]
        )
        around.sort(axis=0)  # nan last
        count = np.sum(~np.isnan(around), axis=0)
        low, high = (
            np.take_along_axis(around, at[None], axis=0)[0]
            for at in (np.maximum(count - 1, 0) // 2, np.minimum(count // 2, len(around) - 1))
        )
        level[rest] = np.where(count >= 2, _between(values[rest], low, high), np.nan)
    return level


def _between(values: Array, one: Array, other: Array) -> Array:
    """What is nearest to the values between two."""
    low, high = np.minimum(one, other), np.maximum(one, other)
    return np.asarray(np.minimum(np.maximum(values, low), high))


def tail(count: Array, level: Array, dispersion: Array) -> Array:
    """Chance of a count as far off as this or further on its side, twice: negative binomial with
    mean `level` and variance `dispersion` times it; Poisson where the dispersion is 1."""
    level = np.maximum(level, 0.5)
    size = level / np.maximum(dispersion - 1, 1e-9)
    over, poisson = count > level, dispersion <= 1 + 1e-6
    with np.errstate(all="ignore"):
        above = np.where(
            poisson,
            gammainc(np.maximum(count, 1e-9), level),
            betainc(np.maximum(count, 1e-9), size, 1 - 1 / dispersion),
        )
        below = np.where(
            poisson, gammaincc(count + 1, level), betainc(size, count + 1, 1 / dispersion)
        )
    return np.asarray(2 * np.where(over, above, below))


def _limits(measure: str, columns: int) -> Array:
    limit = LIMITS[measure]
    return np.array([limit.together, *[limit.at_an_age] * (columns - 1)])


def _odd(course: Course, level: Array) -> Ints:
    """Lines handed in with a count that even a Poisson law would hardly let be so far off."""
    off = course.values - level
    share = _limits(course.block.measure, off.shape[-1]) * level
    deviation = np.sqrt(level + 1)
    far = (off > share) & (off > LEAST[1] * deviation)
    far |= (off < -share) & (off < -LEAST[0] * deviation)
    return np.flatnonzero(far.any(axis=-1) & (course.own >= 0))


def _dispersion(values: Array, place: Ints, lines: Ints) -> Array:
    """Variance over mean of the counts of each line's area and sex, [line, column]: from what its
    other years differ by from one to the next. Of a column itself and of all ages of the area, the
    greater, and at least 1."""
    first, end = (of[lines] for of in runs(place))
    span = first[:, None] + np.arange(int((end - first).max()))
    inside = (span < end[:, None]) & (span != lines[:, None])
    order = np.argsort(~inside, axis=-1, kind="stable")  # the year itself is taken out
    years = np.take_along_axis(np.minimum(span, len(place) - 1), order, axis=-1)
    known = np.take_along_axis(inside, order, axis=-1)
    counts = np.where(known[..., None], values[years], np.nan)
    apart = place[years][:, 1:] - place[years][:, :-1]
    steps = counts[:, 1:] - counts[:, :-1]
    with np.errstate(all="ignore"):
        ratio = steps * steps / (counts[:, 1:] + counts[:, :-1])
    ratio[~(known[:, 1:] & (apart <= 2))] = np.nan
    own = _median(ratio) / MIDDLE
    ages = ratio[..., 1:]
    area = _median(ages.reshape(len(lines), -1, 1)) / MIDDLE
    return np.maximum(np.fmax(own, area), 1.0)


def _median(ratio: Array) -> Array:
    """Median over the second axis, gaps left out; 1 where there are only gaps."""
    ordered = np.sort(ratio, axis=1)
    count = np.sum(~np.isnan(ordered), axis=1)
    at = np.maximum(count - 1, 0) // 2
    middle = np.take_along_axis(ordered, at[:, None], axis=1)[:, 0]
    return np.where(count > 0, middle, MIDDLE)


@dataclass(frozen=True, slots=True)
class Jumps:
    """Counts of some lines that are out of line with the years around them."""

    lines: Ints  # of the course
    failing: Flags  # [line, column]
    level: Array  # [line, column]
    spread: Array  # [line, column], one standard deviation


def _jumps(course: Course, level: Array, lines: Ints, ledger: Ledger) -> Jumps:
    measure, values = course.block.measure, course.values[lines]
    expected = level[lines]
    dispersion = _dispersion(course.values, course.place, lines)
    share = _limits(measure, values.shape[-1])
    with np.errstate(invalid="ignore"):
        failing = np.abs(values - expected) > share * expected
    failing &= tail(values, expected, SPREAD * dispersion) < AIM / values.shape[-1]
    if failing.any():
        excuse = _by_population if measure == "deaths" else _by_cohort
        failing &= ~excuse(course, lines, share, ledger)
    return Jumps(lines, failing, expected, np.sqrt(SPREAD * dispersion * (expected + 1)))


def _by_population(course: Course, lines: Ints, share: Array, ledger: Ledger) -> Flags:
    """Deaths that only follow their population, which itself is in line: as many a head as in the
    years around."""
    first, end = (of[lines] for of in runs(course.place))
    every = np.unique(np.concatenate([np.arange(a, b) for a, b in zip(first, end, strict=True)]))
    people = counterpart(course, ledger, every)
    at, place = np.searchsorted(every, lines), course.place[every]
    with np.errstate(all="ignore"):
        usual = local_level(people, place)[at]
        rate = local_level(course.values[every] / people, place)[at] * people[at]
        jumped = np.abs(people[at] - usual) > _limits("person_years", people.shape[-1]) * usual
        near = np.abs(course.values[lines] - rate) <= share * rate
    return np.asarray(near & ~jumped)


def _by_cohort(course: Course, lines: Ints, share: Array, ledger: Ledger) -> Flags:
    """Single years of age that were as many a year younger, or will be a year older: a large or
    small year of birth that grows old."""
    grid, place, values = course.block.grid, course.place, course.values
    single = np.append(False, grid.widths == 1)  # all ages together are not
    near = np.zeros((len(lines), values.shape[-1]), bool)
    for step in (-1, 1):
        other = np.clip(lines + step, 0, len(place) - 1)
        cohort = np.roll(values[other], -step, axis=-1)
        both = single & np.roll(single, -step)
        beside = place[other] - place[lines] == step
        with np.errstate(invalid="ignore"):
            alike = np.abs(values[lines] - cohort) <= share * cohort
        near |= alike & both & beside[:, None]
    return near


def _found(measure: str, ledger: Ledger) -> Iterator[Fault]:
    """One fault for each area, sex and year: at all ages together, or at the worst age."""
    for course in courses(ledger, measure):
        with np.errstate(invalid="ignore"):
            level = local_level(course.values, course.place)
            odd = _odd(course, level)
        for start in range(0, len(odd), STEP):
            yield from _faults(
                course, _jumps(course, level, odd[start : start + STEP], ledger), ledger
            )


def _faults(course: Course, jumps: Jumps, ledger: Ledger) -> Iterator[Fault]:
    values = course.values[jumps.lines]
    apart = np.abs(values - jumps.level)
    off = np.where(jumps.failing, apart / jumps.spread, -1.0)
    worst = 1 + off[:, 1:].argmax(axis=-1, keepdims=True)
    alone = np.take_along_axis(apart * jumps.failing, worst, axis=-1)[:, 0] >= ONE_AGE * apart[:, 0]
    off[:, 0] = np.where(jumps.failing[:, 0] & ~alone, np.inf, -1.0)
    for at in np.flatnonzero(jumps.failing.any(axis=-1)).tolist():
        column = int(off[at].argmax())
        line = int(course.own[jumps.lines[at]])
        found: dict[str, Value] = {
            "age": course.labels[column],
            "found": float(values[at, column]),
            "usual": float(round(jumps.level[at, column])),
            "spread": float(round(jumps.spread[at, column])),
        }
        block = course.block
        rows = block.row[line, max(column - 1, 0)]
        yield block.fault(rows, ledger.named(int(block.place[line])) | found)


SOURCE = (
    "McCullagh & Nelder (1989), Generalized Linear Models, ch. 6: negative binomial counts, their "
    "dispersion taken from the data. The shares are Ebbline's own, as is the aim: of 10,000 areas, "
    "sexes and years one is flagged by chance."
)
REMEDY = "Compare with the source. If it is right, say so in the note."

CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="jump_of_deaths",
        severity="warning",
        meaning="Deaths are far from those of the two years before and the two after: by more "
        "than 15 % at all ages together or 30 % in an age group, and by more than this area's own "
        "years usually differ. Deaths that only follow their population are left alone.",
        why="A number mistyped, a file cut short or deaths counted twice show first as a year "
        "that stands out. Real shocks do too: then the note says which.",
        found="{found} in {area}, {sex} {year}, age {age}",
        expected="about {usual}, give or take {spread}, as in the years around it",
        remedy=REMEDY,
        source=SOURCE,
        find=lambda ledger: _found("deaths", ledger),
    ),
    Check(
        key="jump_of_population",
        severity="warning",
        meaning="The population is far from that of the two years before and the two after: by "
        "more than 10 % at all ages together or 25 % in an age group, and by more than this "
        "area's own years usually differ. Years of birth that grow old are left alone.",
        why="Populations change slowly, so a leap is a boundary, another source or an error of "
        "the file.",
        found="{found} in {area}, {sex} {year}, age {age}",
        expected="about {usual}, give or take {spread}, as in the years around it",
        remedy=REMEDY,
        source=SOURCE,
        find=lambda ledger: _found("person_years", ledger),
    ),
)
