"""What is measured, against what, and the goal."""

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from engine import bulk
from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.compiled import tables as kernel
from engine.compiled.rules import rules
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.smoothing import Basis
from engine.streams import generator
from tests.benchmarks import naive
from tests.benchmarks.sides import Measured, Side, measure
from tests.factories import codes, gompertz_panel

PLAIN = SETTINGS["almanac-1"]
SINGLE = AgeGrid(tuple(range(111)))
ABRIDGED = AgeGrid((0, 1, *range(5, 86, 5)))
MAKERS: tuple[bulk.Maker, ...] = ("compiled", "numpy")


@dataclass(frozen=True, slots=True)
class Result:
    """`ratio` is the time of `what` over that of `over`, or, with a goal of at least so much, the
    other way round."""

    what: str
    over: str
    ratio: float
    must: str
    stretch: str
    spread: float
    void: bool
    note: str = ""


def populations(grid: AgeGrid, count: int, *, people: float = 2e6, seed: int = 1) -> Panel:
    """Of 500 different populations, over and over."""
    slopes = np.linspace(0.085, 0.11, min(count, 500))
    level = 0.1 / np.exp(86 * slopes)
    panel = gompertz_panel(grid, seed=seed, slope=slopes, level=level, people=people)
    many = -(-count // len(slopes))
    return panel.over(lambda array: np.tile(array, (many, 1))[:count])


def tables_111() -> list[Result]:
    return _tables(SINGLE, 100_000, 20_000, ("<= 4", "<= 2.5"), ("<= 10", "<= 8"))


def tables_19() -> list[Result]:
    return _tables(ABRIDGED, 200_000, 20_000, ("<= 7", "<= 4"), None)


def _tables(
    grid: AgeGrid,
    rows: int,
    fewer: int,
    fast: tuple[str, str],
    plain: tuple[str, str] | None,
) -> list[Result]:
    ages, panel = len(grid), populations(grid, rows)
    sides, found = {"limit": _limit(panel), "compiled": _compiled(panel)}, []
    over = f"one read and six writes, {ages} ages"
    what = "tables and eight numbers, compiled"
    found.append(_less(measure(sides), "compiled", "limit", what, over, fast))
    part = panel[:fewer]
    sides = {"limit": sides["limit"]}
    columns = {name: np.zeros((fewer, ages)) for name in bulk.COLUMNS}
    numbers = {key: np.zeros(fewer) for key in bulk.NUMBERS}
    sides["numpy"] = Side(lambda: bulk.fill(part, PLAIN, columns, numbers), fewer)
    what = "the same, numpy in blocks"
    found.append(_less(measure(sides), "numpy", "limit", what, over, plain or ("", "")))
    return found


def _limit(panel: Panel) -> Side:
    mx = panel.deaths / panel.exposure
    room = [np.zeros_like(mx) for _ in range(6)]
    return Side(lambda: naive.one_read_six_writes(mx, *room), len(mx))


def _compiled(panel: Panel) -> Side:
    """Into columns that are there already, like the limit's."""
    rows = len(panel.deaths)
    given = (panel.deaths, panel.exposure, panel.infant_weight, panel.infant_ratio)
    found = kernel.Columns(*(np.zeros(panel.deaths.shape) for _ in kernel.Columns._fields))
    numbers, chain = np.zeros((rows, len(kernel.NUMBERS))), rules(panel.grid, PLAIN)
    return Side(lambda: kernel.fill(chain, *given, found, numbers), rows)


def loops() -> list[Result]:
    panel = populations(SINGLE, 20_000)
    few = gompertz_panel(SINGLE, slope=np.linspace(0.085, 0.11, 20))
    mx = few.deaths / few.exposure
    rows, table = mx.tolist(), naive.frame(SINGLE, mx)
    ages, widths = [float(start) for start in SINGLE.starts], SINGLE.widths.tolist()
    measured = measure(
        {
            "groups": Side(lambda: naive.tables_by_groups(table), len(rows)),
            "lists": Side(
                lambda: [naive.table_in_lists(ages, widths, row) for row in rows], len(rows)
            ),
            "compiled": _compiled(panel),
        }
    )
    what, groups = "tables and eight numbers, compiled", "groupby.apply loop, 111 ages"
    return [
        _more(measured, "compiled", "groups", what, groups, (">= 1000", "")),
        _more(measured, "compiled", "lists", what, "bare lists, 111 ages", (">= 80", "")),
    ]


def simulation() -> list[Result]:
    panel, draws = populations(SINGLE, 12, people=200_000), 1000
    names = codes(panel)
    rng = generator("benchmark", "raw")

    def raw() -> None:
        for deaths in panel.deaths:
            rng.poisson(deaths, (draws, len(deaths)))

    measured = measure(
        {
            "raw": Side(raw),
            "compiled": Side(
                lambda: bulk.simulated(panel, PLAIN, names, draws=draws, purpose="benchmark")
            ),
        }
    )
    what = "simulated deaths to e0, compiled"
    goal = ("<= 0.35", "<= 0.2")
    return [_less(measured, "compiled", "raw", what, "numpy's Poisson numbers alone", goal)]


def differences() -> list[Result]:
    """All sides explain the same number, e0 by the same rules."""
    slopes = np.linspace(0.085, 0.1, 2_000)
    this = gompertz_panel(SINGLE, slope=slopes, level=0.1 / np.exp(86 * slopes))
    that = this[::-1]
    fewer = this[:500], that[:500]
    n = SINGLE.widths[:-1]
    start, end = ((one.deaths / one.exposure)[0] for one in (that, this))
    note = _errors(this, that, naive.by_perturbation(n, start, end))
    measured = measure(
        {
            "naive": Side(lambda: naive.by_perturbation(n, start, end)),
            "numpy": Side(lambda: bulk.contributions(*fewer, PLAIN, by="numpy"), 500),
            "compiled": Side(lambda: bulk.contributions(this, that, PLAIN, by="compiled"), 2_000),
        }
    )
    what = "a difference explained, compiled"
    over = "perturbing each rate at 20 points, 111 ages"
    found = [
        _more(measured, "compiled", "naive", what, over, (">= 12000", "")),
        _more(measured, "numpy", "naive", "the same, numpy", over, (">= 2000", "")),
    ]
    return [replace(one, note=note) for one in found]


def _errors(this: Panel, that: Panel, plain: Array) -> str:
    """The first pair is the one that lies furthest apart and the one that the plain way explains:
    what its parts leave of the difference, and what ours leave of any."""
    n, pair = SINGLE.widths[:-1], (this[:1], that[:1])
    mine = [naive.expectancy(n, (one.deaths / one.exposure)[0]) for one in pair]
    theirs = [float(run(one, PLAIN).table.ex[0, 0]) for one in pair]
    if not np.allclose(mine, theirs, rtol=0, atol=1e-9):
        raise RuntimeError(f"the sides differ in what e0 is: {mine} and {theirs}")
    left = abs(mine[0] - mine[1] - plain.sum())
    ours = max(
        float(np.abs(bulk.contributions(this, that, PLAIN, by=by).contributions.remainder).max())
        for by in MAKERS
    )
    if ours > left:
        raise RuntimeError(f"ours leave {ours:.1e} years unexplained, the plain way {left:.1e}")
    return f"years left unexplained: ours {ours:.0e} at most, the plain way {left:.0e}"


def curves() -> list[Result]:
    panel, inside = populations(SINGLE, 100, people=200_000), slice(10, 100)
    ages = SINGLE.mids[inside]
    deaths, exposure = (part[:, inside].copy() for part in (panel.deaths, panel.exposure))
    basis = Basis(10, 100, 18)
    measured = measure(
        {
            "dense": Side(lambda: naive.cold_dense(basis, ages, deaths[0], exposure[0])),
            "numpy": Side(
                lambda: bulk.curves(basis, ages, deaths, exposure, by="numpy"), len(deaths)
            ),
            "compiled": Side(
                lambda: bulk.curves(basis, ages, deaths, exposure, by="compiled"), len(deaths)
            ),
        }
    )
    over = "the same search with full matrices"
    what = "P-spline with search, compiled"
    return [
        _more(measured, "compiled", "dense", what, over, (">= 20", "")),
        _more(measured, "numpy", "dense", "the same, numpy", over, ("", "")),
    ]


def _less(
    measured: Measured, ours: str, theirs: str, what: str, over: str, goal: tuple[str, str]
) -> Result:
    return _result(measured, ours, theirs, what, over, goal, (ours, theirs))


def _more(
    measured: Measured, ours: str, theirs: str, what: str, over: str, goal: tuple[str, str]
) -> Result:
    return _result(measured, ours, theirs, what, over, goal, (theirs, ours))


def _result(
    measured: Measured,
    ours: str,
    theirs: str,
    what: str,
    over: str,
    goal: tuple[str, str],
    sides: tuple[str, str],
) -> Result:
    ratio = measured.seconds[sides[0]] / measured.seconds[sides[1]]
    spread = max(measured.spread[ours], measured.spread[theirs])
    return Result(what, over, float(f"{ratio:.4g}"), *goal, round(spread, 3), spread > 1.3)


GOALS: tuple[Callable[[], list[Result]], ...] = (
    tables_111,
    tables_19,
    loops,
    simulation,
    differences,
    curves,
)
