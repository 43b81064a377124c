"""A difference parted among what brought it about, each replaced one after the other."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise, permutations

State = frozenset[str]  # the parts that are already as they are now


@dataclass(frozen=True, slots=True)
class Shares:
    amounts: dict[str, float]  # of each part; they add up to the difference
    orders: int  # orders of replacing that could be followed to the end
    all_orders: int


def states(parts: Sequence[str]) -> tuple[State, ...]:
    """Every set of parts that may be replaced: none first, all last."""
    found: list[State] = [frozenset()]
    for part in parts:
        found += [state | {part} for state in found]
    return tuple(found)


def shares(values: Mapping[State, float], parts: Sequence[str]) -> Shares | None:
    """What each part moves the value by, replaced from then to now, the mean over all orders of
    replacing them: with two parts both directions, with more the value of Shapley.

    A state whose value is nan cannot be passed; orders that would pass it are left out, so the
    shares still add up. None where no order is left.
    Source: Shapley (1953), A value for n-person games; Das Gupta (1993), Standardization and
            Decomposition of Rates, US Bureau of the Census (averages over orders).
    >>> both, one, other = frozenset("ab"), frozenset("a"), frozenset("b")
    >>> shares({frozenset(): 1.0, one: 3.0, other: 2.0, both: 6.0}, "ab").amounts
    {'a': 3.0, 'b': 2.0}
    """
    steps: dict[str, list[float]] = {part: [] for part in parts}
    count = 0
    for order in permutations(parts):
        path = [frozenset(order[:length]) for length in range(len(order) + 1)]
        if not all(math.isfinite(values[state]) for state in path):
            continue
        count += 1
        for part, (before, after) in zip(order, pairwise(path), strict=True):
            steps[part].append(values[after] - values[before])
    if not count:
        return None
    amounts = {part: math.fsum(moves) / count for part, moves in steps.items()}
    return Shares(amounts, count, math.factorial(len(parts)))
