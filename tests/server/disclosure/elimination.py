"""What equations fix, by elimination: knows nothing of the networks that masks are made with."""

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array

PRIME = 2_147_483_629  # below 2**31: products of two remainders fit 64 bits
Bools = NDArray[np.bool_]


def determined(matrix: csr_array, hidden: Bools) -> Bools:
    """Which of the withheld unknowns the equations fix: exactly, by elimination modulo a prime (an
    unknown fixed by whole-number equations is fixed modulo all but few primes). Both [unknown]."""
    found = np.zeros(len(hidden), bool)
    columns = np.flatnonzero(hidden)
    part = matrix[:, columns]
    part = part[np.diff(part.indptr) > 0]
    dense = part.toarray().astype(np.int64) % PRIME
    reduced, pivots = _reduced(dense)
    free = np.setdiff1d(np.arange(len(columns)), pivots)
    # in reduced form an unknown is fixed where its row has no free unknown beside it
    fixed = ~reduced[: len(pivots)][:, free].any(axis=1)
    found[columns[np.array(pivots, int)[fixed]]] = True
    return found


def _reduced(matrix: NDArray[np.int64]) -> tuple[NDArray[np.int64], list[int]]:
    """Reduced row echelon form modulo PRIME, and its pivot columns."""
    done = 0
    pivots: list[int] = []
    for column in range(matrix.shape[1]):
        below = np.flatnonzero(matrix[done:, column])
        if not len(below):
            continue
        row = done + int(below[0])
        matrix[[done, row]] = matrix[[row, done]]
        matrix[done] = matrix[done] * pow(int(matrix[done, column]), -1, PRIME) % PRIME
        others = np.flatnonzero(matrix[:, column])
        others = others[others != done]
        matrix[others] = (matrix[others] - np.outer(matrix[others, column], matrix[done])) % PRIME
        pivots.append(column)
        done += 1
        if done == len(matrix):
            break
    return matrix, pivots
