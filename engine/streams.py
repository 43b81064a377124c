"""Chance, keyed by purpose and codes, never by order, split, worker or database id."""

import hashlib
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array


def generator(purpose: str, *codes: str) -> np.random.Generator:
    """The stream of one purpose and one population, the same wherever and whenever it is asked for.

    Its seed is the SHA-256 of the purpose and the codes, each with its length before it, so that
    ('ab', 'c') and ('a', 'bc') are different streams.
    """
    parts = [part.encode() for part in (purpose, *codes)]
    digest = hashlib.sha256(b"".join(b"%d:%b" % (len(part), part) for part in parts)).digest()
    seed = np.random.SeedSequence(int.from_bytes(digest, "big"))
    return np.random.Generator(np.random.PCG64DXSM(seed))


def poisson_draws(deaths: Array, streams: NDArray[np.str_], draws: int, purpose: str) -> Array:
    """Deaths as chance might have had them: each cell Poisson with the observed count as its mean.

    Shape:   deaths [..., age], streams [...] (one code a population) -> [draw, ..., age].
    Missing: nan in, nan out.
    Raises:  ValueError where the streams do not match the populations, or a count is negative.
    Source:  Brillinger (1986), The natural variability of vital rates, Biometrics 42, section 3.
    >>> poisson_draws(np.array([4.0, 9.0]), np.array("atoll.f.2001"), 2, "example").shape
    (2, 2)
    """
    streams = np.asarray(streams)
    if streams.shape != deaths.shape[:-1]:
        raise ValueError(
            f"streams have shape {streams.shape} but the populations {deaths.shape[:-1]}; "
            "give one code for each population"
        )
    counts = deaths.reshape(streams.size, deaths.shape[-1])
    known = np.isfinite(counts)
    drawn = np.empty((draws, *counts.shape))
    # one generator a population is what a keyed stream is; nothing but drawing happens in this loop
    for row, code in enumerate(streams.ravel().tolist()):
        mean = np.where(known[row], counts[row], 0.0)
        drawn[:, row] = generator(purpose, code).poisson(mean, (draws, len(mean)))
    return np.where(known, drawn, np.nan).reshape(draws, *deaths.shape)


def normal_draws(streams: NDArray[np.str_], draws: int, purpose: str) -> Array:
    """Standard normal numbers, one a population and draw: streams [...] -> [draw, ...].

    >>> normal_draws(np.array(["atoll.f.2001", "atoll.m.2001"]), 3, "example").shape
    (3, 2)
    """
    streams = np.asarray(streams)
    drawn = np.empty((draws, streams.size))
    for row, code in enumerate(streams.ravel().tolist()):
        drawn[:, row] = generator(purpose, code).standard_normal(draws)
    return drawn.reshape(draws, *streams.shape)


class PairDraws(NamedTuple):
    """Simulated deaths of two populations, each [draw, ..., age]."""

    this: Array
    that: Array


def pair_draws(
    this: Array,
    that: Array,
    shared: Array,
    streams: tuple[NDArray[np.str_], NDArray[np.str_]],
    draws: int,
    purpose: str,
) -> PairDraws:
    """Deaths of two populations that may overlap, as chance might have had them.

    Deaths counted in both are drawn once, from a stream of the pair whatever its order; those of
    one side only from that side's own stream.

    Shape:   this, that, shared [..., age], streams of this and of that [...].
    Missing, raises: as `poisson_draws`.
    """
    names = tuple(np.asarray(side) for side in streams)
    pairs = np.array(
        ["\n".join(sorted(pair)) for pair in zip(*(side.ravel() for side in names), strict=True)],
        dtype=np.str_,
    ).reshape(names[0].shape)
    in_both = poisson_draws(shared, pairs, draws, "deaths in both")
    return PairDraws(
        *(
            in_both + poisson_draws(np.maximum(deaths - shared, 0.0), codes, draws, purpose)
            for deaths, codes in zip((this, that), names, strict=True)
        )
    )
