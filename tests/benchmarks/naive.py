"""The plain ways that the engine is measured against; slow on purpose."""

import math

import numba
import numpy as np
import pandas as pd

from engine.ages import AgeGrid, Array
from engine.banded import roughness
from engine.smoothing import ORDER, PENALTIES, Basis


@numba.njit
def one_read_six_writes(
    m: Array, a: Array, b: Array, c: Array, d: Array, e: Array, f: Array
) -> None:
    """What the memory allows: a column read and six written."""
    for i in range(m.shape[0]):
        for k in range(m.shape[1]):
            v = m[i, k]
            a[i, k], b[i, k], c[i, k] = v, v * 2, v * 3
            d[i, k], e[i, k], f[i, k] = v + 1, v + 2, v - 1


def table_in_lists(ages: list[float], n: list[float], m: list[float]) -> list[list[float]]:
    """A life table with eight numbers in plain Python, women by Andreev and Kingkade."""
    count, last = len(m), len(m) - 1
    a = [width / 2 for width in n]
    if m[0] < 0.01724:
        a[0] = 0.14903 - 2.05527 * m[0]
    else:
        a[0] = 0.04667 + 3.88089 * m[0] if m[0] < 0.06891 else 0.31411
    a = [min(a[x], 1 / m[x]) if m[x] else a[x] for x in range(last)] + [1 / m[last]]
    q = [n[x] * m[x] / (1 + (n[x] - a[x]) * m[x]) for x in range(last)] + [1.0]
    reach = [1.0]
    for x in range(last):
        reach.append(reach[x] * (1 - q[x]))
    d = [reach[x] * q[x] for x in range(count)]
    lived = [n[x] * reach[x + 1] + a[x] * d[x] for x in range(last)] + [reach[last] * a[last]]
    total, above = 0.0, [0.0] * count
    for x in range(last, -1, -1):
        total += lived[x]
        above[x] = total
    e = [above[x] / reach[x] if reach[x] else math.nan for x in range(count)]
    lost, both, squares = d[last] * e[last], reach[last] ** 2 * a[last] / 2, 0.0
    for x in range(last):
        lost += d[x] * (e[x + 1] + (1 - a[x] / n[x]) * (e[x] - e[x + 1]))
        both += reach[x] ** 2 * a[x] + reach[x + 1] ** 2 * (n[x] - a[x])
        squares += d[x] * (ages[x] + a[x] - e[0]) ** 2
    squares += d[last] * ((ages[last] + a[last] - e[0]) ** 2 + a[last] ** 2)
    group = sum(part > 0.5 for part in reach) - 1
    median = ages[group] + n[group] * (reach[group] - 0.5) / d[group]
    adult = [x for x in range(last) if ages[x] >= 10]
    mode = ages[max(adult, key=lambda x: d[x] / n[x])]
    e65 = e[ages.index(65.0)]
    numbers = [e[0], e65, median, mode, lost, lost / e[0], 1 - both / e[0], math.sqrt(squares)]
    return [m, a, q, reach, d, lived, above, e, numbers]


def frame(grid: AgeGrid, mx: Array) -> pd.DataFrame:
    rows, ages = mx.shape
    return pd.DataFrame(
        {
            "population": np.repeat(np.arange(rows), ages),
            "age": np.tile(np.array(grid.starts, float), rows),
            "n": np.tile(grid.widths, rows),
            "mx": mx.ravel(),
        }
    )


def tables_by_groups(table: pd.DataFrame) -> pd.DataFrame:
    """The analyst's way: a function applied to each group of a data frame."""

    def one(group: pd.DataFrame) -> pd.DataFrame:
        parts = table_in_lists(group["age"].tolist(), group["n"].tolist(), group["mx"].tolist())
        group = group.copy()
        for name, column in zip(
            ("mx", "ax", "qx", "lx", "dx", "Lx", "Tx", "ex"), parts, strict=False
        ):
            group[name] = column
        for k, value in enumerate(parts[8]):
            group[f"number {k}"] = value
        return group

    columns = ["population", "age", "n", "mx"]
    return table.groupby("population", group_keys=False)[columns].apply(one)


def expectancy(n: Array, m: Array) -> float:
    """e0 of one table of women as an analyst writes it: the first year by Andreev and Kingkade,
    half the width in the other closed groups, no more deaths than enter, 1 / m in the open one."""
    a = n / 2
    if m[0] < 0.01724:
        a[0] = 0.14903 - 2.05527 * m[0]
    else:
        a[0] = 0.04667 + 3.88089 * m[0] if m[0] < 0.06891 else 0.31411
    closed = m[:-1]
    a = np.minimum(a, 1 / closed)
    q = n * closed / (1 + (n - a) * closed)
    reach = np.concatenate([[1.0], np.cumprod(1 - q)])
    lived = n * reach[1:] + a * (reach[:-1] * q)
    return float(lived.sum() + reach[-1] / m[-1])


def by_perturbation(n: Array, start: Array, end: Array, points: int = 20) -> Array:
    """Contributions by moving each rate up and down at each of some points of the line."""
    step, found = (end - start) / points, np.zeros(len(start))
    for point in range(points):
        middle = start + step * (point + 0.5)
        for x in range(len(start)):
            up, down = middle.copy(), middle.copy()
            up[x] += step[x] / 2
            down[x] -= step[x] / 2
            found[x] += expectancy(n, up) - expectancy(n, down)
    return found


def cold_dense(basis: Basis, ages: Array, deaths: Array, exposure: Array) -> tuple[float, Array]:
    """A P-spline with each penalty from the same start, with full matrices; the best by BIC."""
    design, bands = basis.at(ages), roughness(basis.size, ORDER)
    full = np.zeros((len(ages), basis.size))
    for x, first in enumerate(design.first):
        full[x, first : first + 4] = design.local[x]
    rough = sum(np.diag(band[: basis.size - d], d) for d, band in enumerate(bands))
    rough = rough + np.triu(rough, 1).T
    logs = np.log((deaths + 0.5) / (exposure + 0.5 * exposure.sum() / deaths.sum()))
    weight = exposure * np.exp(logs)
    begin = np.linalg.solve(full.T @ (full * weight[:, None]) + rough, full.T @ (weight * logs))
    best = (math.inf, begin, 0.0)
    for penalty in PENALTIES:
        now = begin
        for _ in range(60):
            eta = full @ now
            fitted = exposure * np.exp(eta)
            gram = full.T @ (full * fitted[:, None])
            right = full.T @ (deaths - fitted + fitted * eta)
            new = np.linalg.solve(gram + penalty * rough, right)
            moved, now = np.abs(new - now).max(), new
            if moved <= 1e-7:
                break
        fitted = exposure * np.exp(full @ now)
        gram = full.T @ (full * fitted[:, None])
        dimension = np.trace(np.linalg.solve(gram + penalty * rough, gram))
        ratio = np.where(deaths > 0, deaths / fitted, 1.0)
        deviance = 2 * (deaths * np.log(ratio) - deaths + fitted).sum()
        best = min(
            best, (deviance + math.log(len(ages)) * dimension, now, penalty), key=lambda b: b[0]
        )
    return best[2], best[1]
