"""Derivatives by complex step: exact to rounding, and computed without any derivative code."""

from collections.abc import Callable

import numpy as np

STEP = 1e-30


def complex_step(value: Callable[[np.ndarray], np.ndarray], at: np.ndarray) -> np.ndarray:
    """d value / d at, one age at a time: `at` [..., age] -> [..., age]."""
    slopes = np.empty(at.shape)
    for x in range(at.shape[-1]):
        beside = at.astype(complex)
        beside[..., x] += 1j * STEP
        slopes[..., x] = value(beside).imag / STEP
    return slopes


def largest_error(found: np.ndarray, expected: np.ndarray) -> float:
    """Largest difference over the largest derivative of the same population."""
    return float(np.max(np.abs(found - expected) / np.abs(expected).max(axis=-1, keepdims=True)))
