"""One cause of death through the years: its standardised rate, cut where its coding changed."""

from dataclasses import dataclass, replace

import numpy as np

from engine import indicators
from engine.ages import AgeGrid
from engine.causes.counts import CauseCounts
from engine.causes.rates import rates_by_cause
from engine.estimates import Estimate
from engine.panel import Panel
from engine.settings import Settings
from server.results.breaks import between
from server.results.causes import Causes
from server.results.holdings import Holdings
from server.results.loading import Found, Loaded
from server.results.questions import PopulationYear
from server.store.causes import top_of
from server.store.records import Break, Cause

OF = indicators.find("asr_esp2013")


@dataclass(frozen=True, slots=True)
class Course:
    """The age-standardised rate of a cause in every year held, this area and sex."""

    cause: Cause
    periods: tuple[str, ...]
    estimate: Estimate  # [year]
    deaths: tuple[float, ...]
    status: tuple[str, ...]
    breaks: tuple[Break, ...]  # that part its years
    bridged: tuple[Break, ...]  # whose ratio made the earlier years comparable
    shocks: tuple[Break, ...]

    @property
    def cuts(self) -> tuple[int, ...]:
        """Before which years the line is broken."""
        return tuple(
            at
            for at in range(1, len(self.periods))
            if between(self.breaks, self.periods[at - 1], self.periods[at])
        )


def course(
    held: Holdings, of: PopulationYear, cause: Cause, found: Found, settings: Settings
) -> Course | None:
    """None where fewer than two years hold the cause."""
    known = [
        (one.period, loaded, loaded.causes)
        for one, loaded in found.items()
        if isinstance(one, PopulationYear)
        and loaded.causes is not None
        and any(listed.code == cause.code for listed in loaded.causes.list)
    ]
    known.sort(key=lambda item: item[0])
    if len(known) < 2:
        return None
    own = [_alone(loaded, causes, cause) for _period, loaded, causes in known]
    estimate = _rates(own, settings)
    breaks = _breaks(held, of, cause)
    applied = {one for _p, _l, causes in known for one in causes.ratios}
    return Course(
        cause,
        tuple(period for period, _loaded, _causes in known),
        estimate,
        tuple(float(panel.deaths.sum()) for panel in own),
        tuple(loaded.status for _period, loaded, _causes in known),
        tuple(one for one in breaks if one.kind != "shock" and one not in applied),
        tuple(one for one in breaks if one in applied),
        tuple(one for one in breaks if one.kind == "shock"),
    )


def _alone(loaded: Loaded, causes: Causes, cause: Cause) -> Panel:
    """The people, and the deaths of this cause."""
    at = [one.code for one in causes.list].index(cause.code)
    counted = causes.counts.counted
    return replace(
        loaded.panel,
        deaths=causes.counts.deaths[at],
        counted=None if counted is None else counted[at],
        whole=None,
        standard=None,
    )


def _rates(own: list[Panel], settings: Settings) -> Estimate:
    """[year]; years on one grid at once."""
    grids: dict[AgeGrid, list[int]] = {}
    for at, panel in enumerate(own):
        grids.setdefault(panel.grid, []).append(at)
    found: list[Estimate | None] = [None] * len(own)
    for places in grids.values():
        batch = Panel.stack([own[at] for at in places])
        wide = batch.deaths[..., None, :]
        counted = None if batch.counted is None else batch.counted[..., None, :]
        made = rates_by_cause([OF], batch, CauseCounts(wide, counted), settings)[OF.key]
        for row, at in enumerate(places):
            found[at] = made[row, 0]
    return Estimate.stack([one for one in found if one is not None])


def _breaks(held: Holdings, of: PopulationYear, cause: Cause) -> tuple[Break, ...]:
    """Those of this area and of every area: of all causes, of this one, of what it is part of, and
    of its parts."""
    top = top_of(held.causes)
    family = {one.code for one in held.causes if top[one.code] == cause.code}
    family |= {cause.code, top.get(cause.code, "")}
    return tuple(
        one
        for one in held.breaks
        if one.area in ("", of.area) and (not one.cause or one.cause in family)
    )


def newest(estimate: Estimate) -> int:
    """The place of the last year that has a figure; -1 where none has."""
    known = np.flatnonzero(np.isfinite(estimate.value))
    return int(known[-1]) if len(known) else -1
