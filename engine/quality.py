"""Indices of how well ages and sexes are stated, and how complete registered deaths are."""

from dataclasses import dataclass

import numpy as np

from engine.ages import AgeGrid, Array

ROUND = 5  # ages that end in 0 or 5 are those people name when they do not know theirs
ENOUGH_PEOPLE = 100_000  # women and men, from which the accuracy index is told: common practice
FIVES = AgeGrid(tuple(range(0, 76, 5)))


def whipple(grid: AgeGrid, people: Array) -> Array:
    """Whipple's index: people of 25, 30, ..., 60 over a fifth of all from 23 to 62, times 100.

    100 says that ages ending in 0 and 5 are as frequent as others, 500 that there are no others.

    Shape:   people [..., age] -> [...].
    Missing: nan where the groups from 23 to 62 are not single years, or nobody is in them.
    Source:  Shryock & Siegel (1971), The Methods and Materials of Demography, ch. 8.
    >>> float(whipple(AgeGrid(tuple(range(100))), np.ones(100)))
    100.0
    """
    counts = _single(grid, people, 23, 63)
    with np.errstate(all="ignore"):
        index: Array = 500 * counts[..., 2::5].sum(axis=-1) / counts.sum(axis=-1)
    return index


def myers(grid: AgeGrid, people: Array) -> Array:
    """Myers' blended index: half the sum over the ten last digits of how far the blended share of
    each is from 10 %, in per cent.

    Ages from 10 are summed by their last digit, and again from 20; the first sums get the weights 1
    to 10, the second 9 to 0, so that no digit leads because people die. 0 says that no digit is
    liked better, 90 that all ages end in the same.

    Shape:   people [..., age] -> [...]. The ages run to 99, or to 89 or 79 where single years end
             sooner; a group open at 99, 89 or 79 stands for that age.
    Missing: nan where the groups from 10 to 79 are not single years, or nobody is in them.
    Source:  Myers (1940), Transactions of the Actuarial Society of America 41, 395-415; Shryock &
             Siegel (1971), The Methods and Materials of Demography, ch. 8.
    >>> round(float(myers(AgeGrid(tuple(range(100))), np.ones(100))), 9)
    0.0
    """
    last = next((top for top in (99, 89, 79) if _is_single(grid, 10, top)), None)
    if last is None:
        return np.full(people.shape[:-1], np.nan)
    counts = people[..., grid.position(10) : grid.position(last) + 1]
    by_digit = counts.reshape(*counts.shape[:-1], -1, 10)
    first = by_digit[..., :-1, :].sum(axis=-2)
    second = by_digit[..., 1:, :].sum(axis=-2)
    digits = np.arange(10)
    blended = first * (digits + 1) + second * (9 - digits)
    with np.errstate(all="ignore"):
        shares = 100 * blended / blended.sum(axis=-1, keepdims=True)
    off: Array = np.abs(shares - 10).sum(axis=-1) / 2
    return off


@dataclass(frozen=True, slots=True)
class Accuracy:
    """The United Nations age-sex accuracy index and its parts. Under 20 the census figures are
    called accurate, to 40 inaccurate, above highly inaccurate."""

    index: Array  # 3 sexes + women + men
    sexes: Array  # mean change of the sex ratio (per cent) from one age group to the next
    women: Array  # mean distance of the age ratios from 100
    men: Array


def age_sex_accuracy(grid: AgeGrid, women: Array, men: Array) -> Accuracy:
    """The United Nations age-sex accuracy index: three times the mean absolute difference of
    successive sex ratios (0-4 to 65-69), plus for each sex the mean absolute deviation from 100 of
    the age ratios (5-9 to 65-69): a group over the mean of its two neighbours, times 100.

    Waves of births and wars raise it too, and chance does where there are few people.

    Shape:   women, men [..., age] -> [...].
    Missing: nan where the groups cannot be summed into fives up to 75, or one of them is empty.
    Source:  United Nations (1952), Accuracy tests for census age distributions tabulated in
             five-year and ten-year groups, Population Bulletin 2, 59-79.
    """
    if not set(FIVES.starts) <= set(grid.starts):
        gaps = np.full(np.broadcast_shapes(women.shape, men.shape)[:-1], np.nan)
        return Accuracy(gaps, gaps, gaps, gaps)
    female, male = (grid.regroup(one, FIVES)[..., :15] for one in (women, men))
    with np.errstate(all="ignore"):
        ratios = 100 * male[..., :14] / female[..., :14]
        sexes = np.abs(np.diff(ratios, axis=-1)).mean(axis=-1)
        women_off, men_off = (
            np.abs(200 * one[..., 1:14] / (one[..., :13] + one[..., 2:]) - 100).mean(axis=-1)
            for one in (female, male)
        )
    index = 3 * sexes + women_off + men_off
    index = np.where(np.isfinite(index), index, np.nan)
    return Accuracy(index, sexes, women_off, men_off)


AGES_BALANCED = range(30, 70, 5)  # over these ages people enter and leave mostly by age and death


def growth_balance(grid: AgeGrid, first: Array, last: Array, deaths: Array, years: Array) -> Array:
    """Share of deaths that were registered, by the general growth balance.

    At each age a, those who reach it less the growth of all who are a and older is their death
    rate; where deaths are registered in part only, the registered rate must be stretched to fit.
    Entry rate less growth rate is a line in the registered rate with slope 1 / share; both vary
    about it, so the slope is the ratio of their standard deviations over the ages 30 to 65.
    It holds where few move in or out; where many do, it tells of them.

    Shape:   first, last (people at two moments), deaths between them [..., age]; years between
             [...] -> [...].
    Missing: nan where the groups are not fives (or finer) to 75, or somebody is missing in one.
    Source:  Hill (1987), Asian and Pacific Population Forum 1(3), 8-13 and 23-24.
    """
    shape = np.broadcast_shapes(first.shape, last.shape, deaths.shape)[:-1]
    if not set(FIVES.starts) <= set(grid.starts):
        return np.full(shape, np.nan)
    before, after, died = (grid.regroup(one, FIVES) for one in (first, last, deaths))
    ages = np.array([FIVES.position(age) for age in AGES_BALANCED])
    with np.errstate(all="ignore"):
        older = np.sqrt(_from(before)[..., ages] * _from(after)[..., ages])
        entering = np.sqrt(before[..., ages - 1] * after[..., ages]) / 5
        growth = np.log(_from(after)[..., ages] / _from(before)[..., ages]) / years[..., None]
        rate = _from(died)[..., ages] / years[..., None] / older
        share: Array = rate.std(axis=-1) / (entering / older - growth).std(axis=-1)
    return np.where(np.isfinite(share), share, np.nan)


def _from(counts: Array) -> Array:
    """Counts at each age and over, [..., age]."""
    return np.cumsum(counts[..., ::-1], axis=-1)[..., ::-1]


def _is_single(grid: AgeGrid, first: int, last: int) -> bool:
    return set(range(first, last + 1)) <= set(grid.starts)


def _single(grid: AgeGrid, counts: Array, first: int, end: int) -> Array:
    """Counts at the single years from `first` up to, not with, `end`; nan where there are none."""
    if not _is_single(grid, first, end):
        return np.full((*counts.shape[:-1], end - first), np.nan)
    at = grid.position(first)
    return counts[..., at : at + end - first]
