"""The rest of an area: the whole without one of its parts, count for count."""

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from engine.ages import AgeGrid, Array
from engine.causes.counts import CauseCounts
from engine.panel import Panel
from engine.settings import Settings
from server.results.causes import Causes
from server.results.holdings import Holdings
from server.results.loading import Found, Loaded, overlap
from server.results.parted import hidden
from server.results.questions import OVERLAPS, ComparisonQuestion, PopulationYear

SHORT = 1e-6  # persons or deaths by which a whole may fall short of its part: rounding


@dataclass(frozen=True, slots=True)
class Rest:
    """A whole without one of its areas, of one sex and year (or of the years added up)."""

    whole: PopulationYear
    without: str  # code of the area left out

    @property
    def part(self) -> PopulationYear:
        return replace(self.whole, area=self.without)

    @property
    def code(self) -> str:
        """What its draws are keyed by."""
        return f"{self.whole.code}/without/{self.without}"

    @property
    def needed(self) -> tuple[PopulationYear, ...]:
        """What it is worked out from: of persons also women and men, who give the infants' mix."""
        sexes = ("f", "m") if self.whole.sex == "p" else ()
        both = (self.whole, self.part)
        return (*both, *(replace(one, sex=sex) for one in both for sex in sexes))


def rests(
    question: ComparisonQuestion, held: Holdings, settings: Settings
) -> dict[PopulationYear, Rest]:
    """The side that gives way to its rest, where the one compared lies in the other and the address
    asks for it; nothing where not."""
    if question.overlap == OVERLAPS[0] or question.this.area == question.that.area:
        return {}
    both = overlap(question.this, question.that, held.areas, settings.years)
    if both is None or question.this.sex != question.that.sex:
        return {}
    whole = question.that if both.area == question.this.area else question.this
    return {whole: Rest(whole, both.area)}


def rest(of: Rest, found: Found) -> Loaded | None:
    """Worked out from what was loaded. None where the whole counts fewer than its part, as one that
    was delivered as such may, or where either is not held.

    A group in which either side's deaths are withheld is withheld here too: what stands in for
    them is all that is subtracted.
    """
    own = _less(found.get(of.whole), found.get(of.part))
    if own is None or of.whole.sex != "p":
        return own
    women, men = (
        _less(found.get(replace(of.whole, sex=sex)), found.get(replace(of.part, sex=sex)))
        for sex in ("f", "m")
    )
    if women is None or men is None:
        return own
    mix = Panel.persons(women.panel, men.panel)
    panel = replace(own.panel, infant_weight=mix.infant_weight, infant_ratio=mix.infant_ratio)
    return replace(own, panel=panel, protected=own.protected or women.protected or men.protected)


def _less(whole: Loaded | None, part: Loaded | None) -> Loaded | None:
    if whole is None or part is None:
        return None
    grid = whole.panel.grid.common(part.panel.grid)
    more, fewer = whole.panel.regroup(grid), part.panel.regroup(grid)
    stand_in = whole.protected or part.protected
    deaths = _difference(more.deaths, fewer.deaths, stand_in)
    exposure = _difference(more.exposure, fewer.exposure, stand_in)
    if deaths is None or exposure is None:
        return None
    beside: dict[str, Any] = {"whole": replace(more, whole=None, standard=None)}
    if more.counted is not None or fewer.counted is not None:
        beside["counted"] = np.maximum(more.counts - fewer.counts, 0.0)
    births = np.maximum(more.births - fewer.births, 0.0)
    panel = replace(more, deaths=deaths, exposure=exposure, births=births, **beside)
    gone = whole.withheld_on(grid) | part.withheld_on(grid)
    return replace(
        whole,
        panel=panel,
        status="provisional" if "provisional" in (whole.status, part.status) else "final",
        withheld=frozenset(start for start, hid in zip(grid.starts, gone, strict=True) if hid),
        protected=stand_in,
        births_withheld=whole.births_withheld | part.births_withheld,
        estimated=whole.estimated or part.estimated,
        causes=_causes(whole, part, panel),
    )


def _difference(more: Array, fewer: Array, stand_in: bool) -> Array | None:
    """None where it would be below nothing; where numbers stand in for withheld ones, nothing."""
    left = more - fewer
    if not stand_in and np.any(left < -SHORT):
        return None
    return np.maximum(left, 0.0)


def _causes(whole: Loaded, part: Loaded, panel: Panel) -> Causes | None:
    """Causes of what is left. Deaths that were moved from one cause to others may leave a little
    less than nothing of one: then the others of the age give way, as all add up to its deaths."""
    if whole.causes is None or part.causes is None:
        return None
    more = whole.causes.counts.regroup(whole.panel.grid, panel.grid)
    fewer = part.causes.counts.regroup(part.panel.grid, panel.grid)
    deaths = np.maximum(more.deaths - fewer.deaths, 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        fits = np.where(deaths.sum(axis=-2) > 0, panel.deaths / deaths.sum(axis=-2), 1.0)
    counted = None
    if more.counted is not None or fewer.counted is not None:
        counted = np.maximum(more.counts - fewer.counts, 0.0)
    hid = hidden(whole, panel.grid, causes=True) | hidden(part, panel.grid, causes=True)
    return replace(
        whole.causes,
        counts=CauseCounts(deaths * fits, counted),
        shifts=_shifts(whole, part, panel.grid),
        withheld=hid if hid.any() else None,
    )


def _shifts(whole: Loaded, part: Loaded, grid: AgeGrid) -> Array | None:
    """What the ratios, which are those of both, move in what is left."""
    found = [
        one.panel.grid.regroup(one.causes.shifts, grid)
        for one in (whole, part)
        if one.causes is not None and one.causes.shifts is not None
    ]
    return found[0] - found[1] if len(found) == 2 else None
