"""Where closing the gap to a benchmark adds most: one area among those beside it."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import reduce
from typing import ClassVar, Self
from urllib.parse import urlencode

import numpy as np
from numpy.typing import NDArray

from engine import gaps, indicators
from engine import settings as named
from engine.ages import AgeGrid, Array
from engine.chain import gradient, run
from engine.estimates import Estimate
from engine.panel import Panel
from engine.settings import Settings
from engine.whatif import Benchmark, Change, Parts
from engine.whatif_numbers import WhatIf, what_if
from server.results.benchmark import Chosen, choose
from server.results.causes import CauseChoice
from server.results.holdings import Holdings, holdings
from server.results.keys import CAUSE_KEYS, Items, Keys, PopulationYear
from server.results.loading import Beside, Found, Loaded, load
from server.results.of_one import OfOne
from server.results.parted import have_causes, hidden, parts_of
from server.results.revision import Moved, life_expectancy, moved
from server.results.with_causes import CausesOfOne
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import Cause

LEAST = ("20000", "100000", "500000")  # person-years an area of the benchmark has at least
READ = ("e0", "H")


@dataclass(frozen=True, slots=True)
class GapsQuestion(CausesOfOne):
    """Where would closing the gap to a benchmark add most? One area, sex and year."""

    view: ClassVar[str] = "gaps"

    least: str = LEAST[1]

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(items, populations=("of",), once=("least", *CAUSE_KEYS, "figures", "settings"))
        return cls(
            keys.population("of"),
            keys.figures(),
            keys.settings(),
            keys.causes(),
            keys.choice("least", keys.one("least", LEAST[1]), LEAST),
        )

    def canonical(self) -> str:
        pairs = [("of", self.of.code), ("least", self.least)]
        pairs += self.causes.pairs if self.causes else []
        return urlencode([*pairs, ("figures", self.figures), ("settings", self.settings)])


@dataclass(frozen=True, slots=True)
class Closed:
    """Each gap of the area, [cause, age], beside what chance alone would show."""

    panel: Panel
    parts: Parts  # [cause, age]
    causes: tuple[Cause, ...]  # empty: all causes are one
    benchmark: gaps.Counted
    numbers: WhatIf  # of each cell, [cause * age]
    together: WhatIf  # all gaps closed at once
    excess: Array  # [cause, age], per person-year
    clear: NDArray[np.bool_]  # [cause, age]
    first: Array  # [cause, age], chance of being among the first five
    alike: gaps.Alike
    compared: int  # areas whose cells are judged together
    hidden: NDArray[np.bool_]  # [cause, age], where deaths here or of the benchmark are withheld


@dataclass(frozen=True, slots=True)
class Gaps(OfOne):
    """All that a page of gaps says."""

    question: GapsQuestion
    e0: Estimate
    chosen: Chosen
    protected: tuple[Loaded, ...]  # the area and those of the benchmark
    closed: Closed | None  # None where there is no benchmark, or no life expectancy
    moved: Moved | None

    @property
    def own_benchmark(self) -> bool:
        """Whether the area is one of the benchmark's."""
        return self.of.area in self.chosen.members


def gaps_of(session: Session, heading: Heading, question: GapsQuestion) -> Gaps:
    """Choose the benchmark on other years, load the year, close each gap. NotInEdition."""
    collection, number = heading.collection.code, heading.edition.number
    settings = named.find(question.settings)
    held = holdings(session, collection, number)
    held.require(question.of)
    choice = CauseChoice.spelled(question.causes, held=heading.causes)
    beside = replace(Beside.of(settings, held.areas), causes=choice)
    wholes = {area.parent for area in held.areas}
    around = [area.code for area in held.areas if area.code not in wholes]
    asked = dict.fromkeys((question.of, *(replace(question.of, area=area) for area in around)))
    wanted = [one for one in asked if held.all_of(one, settings.years)]
    found = load(session, collection, number, wanted, beside, figures=question.figures)
    if question.of not in found:
        raise held.lacks(question.of, settings.years)
    chosen = choose(
        session,
        heading,
        held,
        question.of,
        settings,
        float(question.least),
        question.figures,
        ages=found[question.of].panel.grid.fives,
    )
    e0 = indicators.find("e0")
    members = [replace(question.of, area=area) for area in chosen.members]
    estimate = indicators.estimate(e0, found[question.of].panel, settings)
    whole = members and all(one in found for one in members) and np.isfinite(estimate.value)
    return Gaps(
        heading,
        held,
        question,
        settings,
        found[question.of],
        estimate,
        chosen,
        tuple(found[one] for one in dict.fromkeys([question.of, *members]) if one in found),
        _closed(collection, question, found, held, chosen, settings) if whole else None,
        moved(
            session,
            heading,
            [question.of],
            beside,
            life_expectancy(question.of, settings),
            figures=question.figures,
        ),
    )


def _closed(
    collection: str,
    question: GapsQuestion,
    found: Found,
    held: Holdings,
    chosen: Chosen,
    settings: Settings,
) -> Closed:
    of = question.of
    members = [replace(of, area=area) for area in chosen.members]
    grid = reduce(AgeGrid.common, (found[one].panel.grid for one in (of, *members))).fives
    others = [replace(of, area=area) for area in chosen.candidates]
    fine = [
        one
        for one in others
        if one in found and set(grid.starts) <= set(found[one].panel.grid.starts)
    ]
    everyone = list(dict.fromkeys((of, *members, *fine)))
    causes = have_causes(found, everyone)
    counted = {one: _counted(found[one], grid, causes=causes) for one in everyone}
    benchmark = reduce(gaps.Counted.plus, (counted[one] for one in members))
    inside = {area: _inside(held, area, chosen.members) for area in {one.area for one in everyone}}
    sides = _side_by_side(everyone, counted, benchmark, inside)
    own = _one(sides, everyone.index(of))
    listed = found[of].causes if causes else None
    panel = found[of].panel.regroup(grid)
    parts = parts_of(found[of], grid, causes=causes)
    chain = run(panel, settings)
    slopes = gradient(indicators.find("e0"), chain)
    rates = reduce(gaps.Counted.plus, (counted[one] for one in fine or [of])).rates
    codes = np.array(
        [f"{collection}/{of.code}", f"{collection}/benchmark of {of.sex}.{of.period}",
         f"{collection}/{of.code} in the benchmark"]
    )  # fmt: skip
    above = gaps.excess(own.own, own.benchmark)
    each, together = (
        _closing(panel, parts, own, above, where, settings) for where in (_each(above), above > 0)
    )
    clear = gaps.clear(gaps.by_chance(sides), settings.level)[everyone.index(of)]
    return Closed(
        panel,
        parts,
        () if listed is None else listed.list,
        benchmark,
        each,
        together,
        above,
        clear & (above > 0),
        gaps.among_first(own, slopes, codes),
        gaps.alike(own, rates, slopes, codes),
        len(everyone),
        np.any([hidden(found[one], grid, causes=causes) for one in (of, *members)], axis=0),
    )


def _counted(loaded: Loaded, grid: AgeGrid, *, causes: bool) -> gaps.Counted:
    """Deaths by cause, those in which chance is, and person-years."""
    parts = parts_of(loaded, grid, causes=causes)
    return gaps.Counted(parts.deaths, parts.exposure[0], parts.counts)


def _inside(held: Holdings, area: str, members: Sequence[str]) -> tuple[str, ...]:
    """The benchmark's areas that are the area, or lie in it."""
    parents = {one.code: one.parent for one in held.areas}

    def lies(one: str) -> bool:
        while one and one != area:
            one = parents.get(one, "")
        return one == area

    return tuple(one for one in members if lies(one))


def _side_by_side(
    everyone: Sequence[PopulationYear],
    counted: dict[PopulationYear, gaps.Counted],
    benchmark: gaps.Counted,
    inside: dict[str, tuple[str, ...]],
) -> gaps.Sides:
    """All areas as one batch, each beside the benchmark."""
    none = gaps.Counted(np.zeros_like(benchmark.deaths), np.zeros_like(benchmark.exposure))

    def shared(one: PopulationYear) -> gaps.Counted:
        return reduce(
            gaps.Counted.plus, (counted[replace(one, area=area)] for area in inside[one.area]), none
        )

    def stack(several: Sequence[gaps.Counted]) -> gaps.Counted:
        return gaps.Counted(
            np.stack([one.deaths for one in several]),
            np.stack([one.exposure for one in several]),
            np.stack([one.counts for one in several]),
        )

    return gaps.Sides.of(
        stack([counted[one] for one in everyone]),
        stack([benchmark] * len(everyone)),
        stack([shared(one) for one in everyone]),
    )


def _one(sides: gaps.Sides, at: int) -> gaps.Sides:
    return gaps.Sides(
        *(
            gaps.Counted(one.deaths[at], one.exposure[at], one.counts[at])
            for one in (sides.alone, sides.others, sides.both)
        )
    )


def _each(above: Array) -> NDArray[np.bool_]:
    """Every cell alone, [cell, cause, age]; those without a gap change nothing."""
    return np.asarray(np.eye(above.size, dtype=bool).reshape(-1, *above.shape) & (above > 0))


def _closing(
    panel: Panel,
    parts: Parts,
    own: gaps.Sides,
    above: Array,
    where: NDArray[np.bool_],
    settings: Settings,
) -> WhatIf:
    """Life expectancy and H with the benchmark's rates at these cells."""
    lived = np.broadcast_to(own.benchmark.exposure, above.shape)
    lender = Parts(own.benchmark.deaths, own.benchmark.counts, lived, ("",) * len(above))
    change = Change(np.ones(above.shape), Benchmark(lender, where, own.both.counts))
    read = [indicators.find(key) for key in READ]
    return what_if(read, panel, parts, change, settings)
