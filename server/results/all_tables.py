"""Every life table of an edition at once: a job over the whole collection."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from engine import bulk, indicators
from engine import settings as named
from engine.ages import AgeGrid
from engine.estimates import Reason
from engine.panel import Panel
from engine.tables import LifeTable
from server.results.holdings import holdings
from server.results.loading import Beside, Found, load
from server.results.questions import PopulationYear
from server.store.connect import Session


@dataclass(frozen=True, slots=True)
class Made:
    """The tables of the population-years on one grid, [population-year, age]."""

    of: tuple[PopulationYear, ...]
    status: tuple[str, ...]
    table: LifeTable
    readable: tuple[bool, ...]  # whether life expectancy at birth may be given
    version: str  # of the engine that made them


def all_tables(session: Session, collection: str, number: int, settings: str) -> Iterator[Made]:
    """All areas, sexes and years, grid by grid, each in the order of its codes."""
    chosen, held = named.find(settings), holdings(session, collection, number)
    loaded = load(session, collection, number, held.status, Beside.of(chosen, held.areas))
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
            made.version,
        )


def _by_grid(
    held: dict[PopulationYear, str], loaded: Found
) -> Iterator[tuple[PopulationYear, ...]]:
    grids: dict[AgeGrid, list[PopulationYear]] = {}
    for one in sorted(held):
        if one in loaded:
            grids.setdefault(loaded[one].panel.grid, []).append(one)
    return (tuple(ones) for ones in grids.values())
