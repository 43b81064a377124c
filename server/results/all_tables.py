"""Every life table of an edition at once: a job over the whole collection."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine import bulk, indicators
from engine import settings as named
from engine.ages import AgeGrid
from engine.estimates import Reason
from engine.panel import Panel
from engine.tables import LifeTable
from server.results.holdings import holdings
from server.results.loading import Beside, Found, Loaded, load
from server.results.questions import PopulationYear
from server.store.connect import Session


@dataclass(frozen=True, slots=True)
class Made:
    """The tables of the population-years on one grid, [population-year, age]."""

    of: tuple[PopulationYear, ...]
    status: tuple[str, ...]
    table: LifeTable
    readable: tuple[bool, ...]  # whether life expectancy at birth may be given
    withheld: NDArray[np.bool_]  # [population-year, age]: the deaths are
    protected: tuple[bool, ...]  # something it rests on is withheld
    version: str  # of the engine that made them


def all_tables(
    session: Session,
    collection: str,
    number: int,
    settings: str,
    *,
    figures: str = "released",
) -> Iterator[Made]:
    """All areas, sexes and years, grid by grid, each in the order of its codes."""
    chosen, held = named.find(settings), holdings(session, collection, number)
    beside = Beside.of(chosen, held.areas)
    loaded = load(session, collection, number, held.status, beside, figures=figures)
    expectancy = indicators.find("e0")
    for ones in _by_grid(held.status, loaded):
        panel = Panel.stack([loaded[one].panel for one in ones])
        made = bulk.tables(panel, chosen)
        reasons = indicators.estimate(expectancy, panel, chosen).reason
        yield Made(
            ones,
            tuple(loaded[one].status for one in ones),
            made.table,
            tuple(bool(one) for one in np.isin(reasons, (Reason.NONE, Reason.NO_DEATHS))),
            np.stack([_withheld(loaded[one], made.table.grid) for one in ones]),
            tuple(loaded[one].protected for one in ones),
            made.version,
        )


def _withheld(of: Loaded, grid: AgeGrid) -> NDArray[np.bool_]:
    """On the ages of the table; single ages that a law spreads the open group over are none."""
    own = of.withheld_on(of.panel.grid)
    counted = len(own) if len(grid) == len(own) else len(own) - 1
    return np.append(own[:counted], np.zeros(len(grid) - counted, np.bool_))


def _by_grid(
    held: dict[PopulationYear, str], loaded: Found
) -> Iterator[tuple[PopulationYear, ...]]:
    grids: dict[AgeGrid, list[PopulationYear]] = {}
    for one in sorted(held):
        if one in loaded:
            grids.setdefault(loaded[one].panel.grid, []).append(one)
    return (tuple(ones) for ones in grids.values())
