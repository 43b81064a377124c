"""One cause of death through the years: its standardised rate, cut where its coding changed."""

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from scipy.special import ndtri

from engine import indicators
from engine.ages import AgeGrid, Array
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
from server.store.causes import lineages
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
    held: Holdings, of: PopulationYear, cause: Cause, leaves: Found, settings: Settings
) -> Course | None:
    """None where fewer than two years hold the cause. `leaves` are the years by the causes that
    have no parts; one that has some is their sum."""
    lineage = lineages(held.causes)
    known = sorted(
        (
            (one.period, loaded, loaded.causes, places)
            for one, loaded in leaves.items()
            if isinstance(one, PopulationYear) and loaded.causes is not None
            for places in [_places(loaded.causes, cause, lineage)]
            if places
        ),
        key=lambda item: item[0],
    )
    if len(known) < 2:
        return None
    own = [_alone(loaded, causes, places) for _period, loaded, causes, places in known]
    estimate, level = _rates(own, settings), settings.level
    for ratio in range(max(len(causes.ratios) for _p, _l, causes, _places in known)):
        beside = [_alone(loaded, causes, places, ratio) for _p, loaded, causes, places in known]
        estimate = wider(estimate, _rates(beside, settings).value - estimate.value, level)
    breaks = _breaks(held, of, cause)
    applied = {one for _p, _l, causes, _places in known for one in causes.ratios}
    return Course(
        cause,
        tuple(item[0] for item in known),
        estimate,
        tuple(float(panel.deaths.sum()) for panel in own),
        tuple(loaded.status for _period, loaded, _causes, _places in known),
        tuple(one for one in breaks if one.kind != "shock" and one not in applied),
        tuple(one for one in breaks if one in applied),
        tuple(one for one in breaks if one.kind == "shock"),
    )


def _places(causes: Causes, cause: Cause, lineage: Mapping[str, tuple[str, ...]]) -> list[int]:
    return [
        at for at, one in enumerate(causes.list) if cause.code in lineage.get(one.code, (one.code,))
    ]


def _alone(loaded: Loaded, causes: Causes, places: list[int], higher: int | None = None) -> Panel:
    """The people, and the deaths of this cause; or as one of the ratios, a standard error higher,
    would have them."""
    counts = causes.counts
    if higher is not None and causes.shifts is not None:
        moved = np.maximum(counts.deaths + causes.shifts[higher], 0.0)
        counts = replace(counts, deaths=moved)
    own = counts.over(lambda array: array[places].sum(axis=0))
    return replace(loaded.panel, deaths=own.deaths, counted=own.counted, whole=None, standard=None)


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
    lineage = lineages(held.causes)
    family = {code for code, above in lineage.items() if cause.code in above}
    family |= {cause.code, *lineage.get(cause.code, ())}
    return tuple(
        one
        for one in held.breaks
        if one.area in ("", of.area) and (not one.cause or one.cause in family)
    )


def wider(one: Estimate, error: Array, level: float) -> Estimate:
    """With one more standard error, independent of chance in deaths. What chance alone leaves above
    0, as it does rates, stays so."""
    out = np.nan_to_num(error)
    far = float(ndtri((1 + level) / 2)) * out
    low = one.value - np.hypot(one.value - one.low, far)
    return replace(
        one,
        low=np.where(one.low >= 0, np.maximum(low, 0.0), low),
        high=one.value + np.hypot(one.high - one.value, far),
        se=np.hypot(one.se, out),
    )


def newest(estimate: Estimate) -> int:
    """The place of the last year that has a figure; -1 where none has."""
    known = np.flatnonzero(np.isfinite(estimate.value))
    return int(known[-1]) if len(known) else -1
