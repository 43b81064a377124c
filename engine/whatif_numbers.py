"""Every indicator at changed death rates, by exact recomputation and to first order, with what
chance in the deaths leaves of the change."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from engine.ages import Array
from engine.chain import Chain, Tally, gradient, run
from engine.chance import Chance, astray, chances, limits, told
from engine.estimates import Estimate, Reason
from engine.indicator import Indicator
from engine.panel import Panel
from engine.reasons import judge
from engine.settings import Settings
from engine.simulation import drawn, persons, simulated
from engine.streams import poisson_draws
from engine.uncertainty import CHANCE, Codes, estimates
from engine.whatif import Change, Parts, changed, in_order, years_left

OTHERS = "deaths of the benchmark"  # purposes of streams
BOTH = "deaths in both"


@dataclass(frozen=True, slots=True)
class WhatIf:
    """Numbers at the death rates there are and at the changed ones."""

    now: dict[str, Estimate]
    then: dict[str, Estimate]  # without an interval of their own
    change: dict[str, Estimate]  # then less now
    first_order: dict[str, Array]  # the same by the gradient at the rates there are; else nan
    fewer: Array  # [..., part, age], deaths fewer among the person-years there were
    years: Array  # [..., part, age], years that those would have had left


@dataclass(frozen=True, slots=True)
class _Two:
    """The chains now and then, of deaths as they are: a weight is one of a death."""

    parts: Parts
    change: Change
    now: Chain
    then: Chain


def what_if(
    indicators: Sequence[Indicator],
    panel: Panel,
    parts: Parts,
    change: Change,
    settings: Settings,
    *,
    streams: Codes | None = None,
) -> WhatIf:
    """Each indicator now, at the changed rates, and the change, by key.

    The whole chain is run anew: the first-year rules, the open group and a fitted law follow. The
    first-order estimate is the gradient times the change of each rate. Chance moves a number now
    and then alike, since the same deaths stand behind both: one death more moves the change by what
    it does then, times the factor of its part, less what it does now; where a benchmark's rate
    stands, deaths of the benchmark move it, and those of both once. Numbers that jump are read off
    the same simulated deaths now and then, for which `streams` are needed.

    Shape:   panel [..., age]; batches broadcast -> [...]. streams as the batch of all.
    Missing: nan with its reason where a number may not be read now, or would not be then.
    Source:  as `engine.uncertainty.estimates`.
    """
    two = _Two(
        parts,
        change,
        run(replace(panel, counted=None), settings),
        run(changed(panel, parts, change), settings),
    )
    batch = two.then.panel.batch_shape
    codes = None if streams is None else np.broadcast_to(streams, batch)
    now = estimates(indicators, panel, settings, streams=streams)
    then = {one.key: _then(one, two) for one in indicators}
    moves = {key: _less(then[key], now[key]) for key in then}
    moves |= _smooth(indicators, moves, panel, two, settings)
    if codes is not None:
        moves |= _simulated(indicators, moves, panel, two, settings, codes)
    fewer = parts.deaths - change.deaths(parts)
    left = years_left(two.now)[..., None, :]
    first = {one.key: first_order(one, two.now, two.then) for one in indicators}
    with np.errstate(invalid="ignore"):
        years = np.where(fewer == 0, 0.0, fewer * left)
    return WhatIf(now, then, moves, first, fewer, years)


def first_order(one: Indicator, now: Chain, then: Chain) -> Array:
    """What the gradient at the rates there are makes of their change, [...]; nan for numbers that
    have none."""
    if not one.smooth or isinstance(one.partials(now), Tally):
        return np.full(then.panel.batch_shape, np.nan)
    step = then.rates.mx - now.rates.mx
    with np.errstate(all="ignore"):
        slopes = gradient(one, now)
        return np.asarray(np.where(step == 0, 0.0, slopes * step).sum(axis=-1))


def _then(one: Indicator, two: _Two) -> Estimate:
    with np.errstate(all="ignore"):
        value = one.value(two.then)
    reason = judge(one.needs, two.then, value)
    # a rate borrowed for want of deaths is another population's: no deaths avoided bring it
    lent = two.then.borrowed & ~two.now.borrowed
    reason = np.where(lent & (reason == 0), np.uint8(Reason.NO_DEATHS_IN_OPEN_GROUP), reason)
    return Estimate.bare(value, reason.astype(np.uint8), Reason.NOT_SIMULATED)


def _less(then: Estimate, now: Estimate) -> Estimate:
    value = then.value - now.value
    missing = np.where(np.isfinite(now.value), then.reason, now.reason)
    return Estimate.bare(
        value, np.where(np.isfinite(value), np.uint8(0), missing), Reason.NOT_SIMULATED
    )


def _smooth(
    indicators: Sequence[Indicator],
    moves: dict[str, Estimate],
    panel: Panel,
    two: _Two,
    settings: Settings,
) -> dict[str, Estimate]:
    own, later = chances(indicators, two.now), chances(indicators, two.then)
    out = _astray(indicators, panel, two, settings)
    found = {}
    for place, one in enumerate(one for one in indicators if told(one)):
        bare, tally = moves[one.key], one.unit.limits == "count"
        weigh = _of_tally if tally else _of_deaths
        chance = replace(weigh(two, own[one.key], later[one.key]), astray=out[place])
        low, high = limits(
            one.unit.limits, bare.value, chance, settings.level, apart=True, rates="gamma"
        )
        found[one.key] = bare.within(low, high, chance.se, Reason.OFTEN_LOST)
    return found


def _of_deaths(two: _Two, now: Chance, then: Chance) -> Chance:
    """Counts of this population only, of the benchmark only, and of both."""
    parts, change = two.parts, two.change
    lent = change.lent()
    here, there = now.weights[..., None, :], then.weights[..., None, :]
    kept = there * np.where(lent, 0.0, change.factor)
    own = parts.worth * (kept - here)
    if change.benchmark is None:
        return _flat([own], [parts.counts])
    other, shared = change.benchmark.parts, change.benchmark.shared
    with np.errstate(all="ignore"):
        scaled = change.factor * parts.exposure / other.exposure
    lending = other.worth * np.where(lent, there * scaled, 0.0)
    alone = parts.counts - shared, other.counts - shared
    # where all are counted in both, no death could be of one alone
    single = (
        np.where((shared > 0) & (count <= 0), 0.0, weight)
        for weight, count in zip((own, lending), alone, strict=True)
    )
    return _flat([*single, own + lending], [*alone, shared])


def _flat(weights: list[Array], counts: list[Array]) -> Chance:
    """[..., part, age] side by side as [..., count]."""
    shape = np.broadcast_shapes(*(one.shape for one in (*weights, *counts)))
    wide = shape[:-2]

    def row(arrays: list[Array]) -> Array:
        flat = (np.broadcast_to(one, shape).reshape(*wide, -1) for one in arrays)
        return np.concatenate(list(flat), axis=-1)

    return Chance(row(weights), np.maximum(row(counts), 0.0), np.zeros(wide))


def _of_tally(two: _Two, now: Chance, then: Chance) -> Chance:
    """A count over births moves as its own count does."""
    with np.errstate(all="ignore"):
        times = np.where(now.counts > 0, then.counts / now.counts, 1.0)
    weights, counts = np.broadcast_arrays((times - 1) * now.weights, now.counts)
    return Chance(weights, counts, np.zeros(weights.shape[:-1]))


def _astray(
    indicators: Sequence[Indicator], panel: Panel, two: _Two, settings: Settings
) -> list[Array]:
    """Standard deviation of each change that is owed to persons counted wrongly, now and then
    alike."""
    smooth = [one for one in indicators if told(one)]

    def values(other: Panel) -> Array:
        times = (other.exposure / panel.exposure)[..., None, :]
        parts = replace(two.parts, exposure=two.parts.exposure * times)
        chains = run(other, settings), run(changed(other, parts, two.change), settings)
        return np.stack([one.value(chains[1]) - one.value(chains[0]) for one in smooth])

    if not smooth:
        return []
    out = astray(values, replace(panel, counted=None), settings=settings)
    shape = (len(smooth), *two.then.panel.batch_shape)
    return list(np.broadcast_to(out, shape))


def _simulated(
    indicators: Sequence[Indicator],
    moves: dict[str, Estimate],
    panel: Panel,
    two: _Two,
    settings: Settings,
    streams: Codes,
) -> dict[str, Estimate]:
    """Limits of what jumps, off the same draws now and then."""
    batch = two.then.panel.batch_shape
    rows = _Rows.of(panel, two, streams, batch)

    def draw(stepped: Sequence[Indicator], where: slice) -> dict[str, Array]:
        return rows.some(where).values(stepped, settings)

    return simulated(indicators, moves, draw, settings)


@dataclass(frozen=True, slots=True)
class _Rows:
    """Populations in a row, each with its parts and its change."""

    panel: Panel
    parts: Parts
    change: Change
    streams: Codes

    @classmethod
    def of(cls, panel: Panel, two: _Two, streams: Codes, batch: tuple[int, ...]) -> "_Rows":
        count = math.prod(batch)

        def row(array: Array) -> Array:
            wide = np.broadcast_to(array, (*batch, array.shape[-1]))
            return wide.reshape(count, array.shape[-1])

        def cells(array: Any) -> Any:
            wide = np.broadcast_to(array, (*batch, *array.shape[-2:]))
            return wide.reshape(count, *array.shape[-2:])

        return cls(panel.over(row), two.parts.over(cells), two.change.over(cells), streams.ravel())

    def some(self, where: slice) -> "_Rows":
        def cut(array: Any) -> Any:
            return array[where]

        return _Rows(
            self.panel[where], self.parts.over(cut), self.change.over(cut), self.streams[where]
        )

    def values(self, indicators: Sequence[Indicator], settings: Settings) -> dict[str, Array]:
        """Then less now of simulated deaths, by key: [draw, row]."""
        drawn_parts, change = self._drawn(settings)
        observed = changed(self.panel, self.parts, self.change)
        deaths = in_order(drawn_parts.deaths)
        moved = changed(replace(self.panel, deaths=deaths, counted=None), drawn_parts, change)
        now = drawn(indicators, self.panel, deaths, settings, self.streams)
        then = drawn(indicators, observed, moved.deaths, settings, self.streams)
        return {key: then[key] - now[key] for key in then}

    def _drawn(self, settings: Settings) -> tuple[Parts, Change]:
        """Deaths as chance might have had them, those of both populations once."""
        draws, lender, shape = settings.draws, self.change.benchmark, self.parts.counts.shape

        def counted(counts: Array, purpose: str) -> Array:
            flat = np.maximum(counts, 0.0).reshape(len(counts), -1)
            return poisson_draws(flat, self.streams, draws, purpose).reshape(draws, *shape)

        both = np.zeros(1) if lender is None else counted(lender.shared, BOTH)
        alone = self.parts.counts - (0 if lender is None else lender.shared)
        own = (counted(alone, CHANCE) + both) * self.parts.worth
        times = persons(self.panel, self.streams, draws, settings) / self.panel.exposure
        lived = self.parts.exposure * np.where(np.isfinite(times), times, 1.0)[..., None, :]
        parts = replace(self.parts, deaths=own, exposure=lived)
        if lender is None:
            return parts, self.change
        other = (counted(lender.parts.counts - lender.shared, OTHERS) + both) * lender.parts.worth
        moved = replace(lender, parts=replace(lender.parts, deaths=other))
        return parts, replace(self.change, benchmark=moved)
