"""Deaths given to other causes than they were counted under: the sum at each age stays."""

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array

ROUNDING = 1e-3  # deaths at an age that are the rounding of shares, not deaths of no stated cause
Bools = NDArray[np.bool_]


def completed(deaths: Array, total: Array) -> Array:
    """The causes, and as a last row the deaths of no stated cause: all less their sum.

    Counts that were shared out are rounded, each by itself: what they then lack or exceed all
    deaths by is shared among them.

    Shape:   deaths [..., cause, age], total [..., age] -> [..., cause + 1, age].
    Missing: a cause without a number has no deaths; nan in total, nan in every cause.
    >>> completed(np.array([[2.0, np.nan], [1.0, 4.0]]), np.array([5.0, 4.0]))
    array([[2., 0.],
           [1., 4.],
           [2., 0.]])
    """
    known = np.nan_to_num(deaths)
    together = known.sum(axis=-2)
    whole = (together > 0) & (total - together < ROUNDING)
    with np.errstate(divide="ignore", invalid="ignore"):
        known = known * np.where(whole, total / together, 1.0)[..., None, :]
    left = np.where(whole, 0.0, total - together)
    gap = np.isnan(total)[..., None, :]
    return np.where(gap, np.nan, np.concatenate([known, left[..., None, :]], axis=-2))


def spread(deaths: Array, source: Bools, over: Bools) -> Array:
    """The deaths of the causes `source` given to the causes `over`, at each age in proportion to
    the deaths of these. Where nobody died of one of these, they stay.

    Shape:   deaths [..., cause, age]; source, over [..., cause], which broadcast.
    Missing: nan in, nan out.
    >>> causes = np.array([[30.0, 0.0], [10.0, 0.0], [4.0, 1.0]])
    >>> spread(causes, np.array([False, False, True]), np.array([True, True, False]))
    array([[33.,  0.],
           [11.,  0.],
           [ 0.,  1.]])
    """
    source, over = source[..., None], over[..., None]
    given = np.where(source, deaths, 0.0).sum(axis=-2, keepdims=True)
    taking = np.where(over, deaths, 0.0).sum(axis=-2, keepdims=True)
    with np.errstate(divide="ignore", invalid="ignore"):
        raised = deaths * np.where(taking > 0, 1.0 + given / taking, 1.0)
    kept = np.where(source & (taking > 0), 0.0, deaths)
    return np.where(over, raised, kept)


def comparable(deaths: Array, ratios: Array) -> Array:
    """Deaths as a later coding would have counted them, all deaths at each age staying the same.

    A cause with a stated comparability ratio (counts after over counts before) is multiplied by it.
    What it gains is taken from the causes without one, what it loses is given to them, in
    proportion to their deaths. Where they have none, or not enough, those with a ratio share all.

    Shape:   deaths [..., cause, age]; ratios [..., cause], nan where none is stated.
    Missing: nan in, nan out.
    >>> comparable(np.array([[50.0], [20.0], [30.0]]), np.array([1.2, np.nan, np.nan]))
    array([[60.],
           [16.],
           [24.]])
    """
    stated = np.isfinite(ratios)[..., None]
    changed = np.where(stated, deaths * ratios[..., None], 0.0)
    total = deaths.sum(axis=-2, keepdims=True)
    of_changed = changed.sum(axis=-2, keepdims=True)
    of_others = np.where(stated, 0.0, deaths).sum(axis=-2, keepdims=True)
    room = np.maximum(total - of_changed, 0.0)
    full = (of_changed > total) | (of_others == 0)
    with np.errstate(divide="ignore", invalid="ignore"):
        others = deaths * np.where(of_others > 0, room / of_others, 1.0)
        fitted = changed * np.where(full & (of_changed > 0), total / of_changed, 1.0)
    return np.where(stated, fitted, others)
