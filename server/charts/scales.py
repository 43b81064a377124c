"""Ticks at round numbers."""

import math


def ticks(low: float, high: float, most: int = 5) -> tuple[float, ...]:
    """Round numbers from `low` to `high`, at most so many.

    >>> ticks(0, 4177), ticks(-0.3, 0.8)
    ((0.0, 1000.0, 2000.0, 3000.0, 4000.0), (0.0, 0.5))
    """
    span = high - low
    if not (math.isfinite(span) and span > 0):
        raise ValueError(f"a scale from {low} to {high} has no length")
    power = 10.0 ** math.floor(math.log10(span / most))
    for step in (power, 2 * power, 5 * power, 10 * power, 20 * power):
        first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
        if last - first < most:
            return tuple(round(at * step, 12) for at in range(first, last + 1))
    raise AssertionError("twenty times a power of ten is always wide enough")


def log_ticks(low: float, high: float) -> tuple[float, ...]:
    """The powers of ten from `low` to `high`, both above 0.

    >>> log_ticks(0.03, 320)
    (0.1, 1.0, 10.0, 100.0)
    """
    first, last = math.ceil(math.log10(low) - 1e-9), math.floor(math.log10(high) + 1e-9)
    return tuple(10.0**power for power in range(first, last + 1))


RATIOS = (1.0, 0.5, 0.8, 1.25, 2.0, 0.67, 1.5, 0.9, 1.1, 0.2, 5.0, 0.1, 10.0, 0.33, 3.0)


def ratio_ticks(low: float, high: float, most: int = 5) -> tuple[float, ...]:
    """Round ratios from `low` to `high`, both above 0: 1, and those that lie far enough apart.

    >>> ratio_ticks(0.45, 1.4), ratio_ticks(0.86, 1.15)
    ((0.5, 0.8, 1.0, 1.25), (0.9, 1.0, 1.1))
    """
    apart = math.log(high / low) / (most + 1)
    found: list[float] = []
    for one in RATIOS:
        near = any(abs(math.log(one / other)) < apart for other in found)
        if low <= one <= high and not near and len(found) < most:
            found.append(one)
    return tuple(sorted(found))


def decimals(shown: tuple[float, ...], most: int = 6) -> int:
    """As many decimals as all ticks of a scale need.

    >>> decimals((-0.2, 0.0, 0.2)), decimals((0.0, 2.0))
    (1, 0)
    """
    enough = (so for so in range(most) if all(round(at, so) == at for at in shown))
    return next(enough, most)
