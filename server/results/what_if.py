"""One population-year at other death rates: every indicator, and the change that meets a target."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine import indicators
from engine import settings as named
from engine.ages import AgeGrid, Array
from engine.estimates import Estimate
from engine.settings import Settings, span
from engine.whatif import Benchmark, Change, Parts, factor
from engine.whatif_numbers import WhatIf, what_if
from engine.whatif_reach import Reach, uniform
from server.results.causes import CauseChoice
from server.results.estimating import EVERY, stream
from server.results.holdings import Holdings, holdings
from server.results.keys import BadValue, PopulationYear
from server.results.loading import Beside, Found, Loaded, Shared, load, overlap
from server.results.parted import (
    Parted,
    by_sex,
    have_causes,
    members,
    parted,
    parts_of,
    shared_grid,
    wanted,
)
from server.results.protecting import all_protected, fixed, withheld_in
from server.results.revision import Moved, moved
from server.results.what_if_question import EVERYBODY, WhatIfQuestion, Where
from server.sentences import names
from server.sentences.names import listed
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading

Cells = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Changed:
    """A population-year at other death rates."""

    own: Parted
    change: Change
    chosen: Cells  # [part, age], all that the question names
    numbers: WhatIf
    reach: Reach | None  # None where no target is asked, or none can be: `no_reach`
    no_reach: str


@dataclass(frozen=True, slots=True)
class Findings:
    """All that a what-if page says."""

    heading: Heading
    holdings: Holdings
    question: WhatIfQuestion
    settings: Settings
    loaded: Loaded
    toward: Loaded | None
    overlap: bool  # deaths counted in both
    changed: Changed
    moved: Moved | None

    @property
    def at(self) -> PopulationYear:
        return self.question.at

    @property
    def name(self) -> str:
        return self.holdings.name(self.at.area)

    @property
    def period(self) -> str:
        """The year, or the years added up."""
        return names.years(span(self.at.period, self.settings.years))

    def years_of(self, one: PopulationYear) -> str:
        """The year, or the years added up, of another population-year."""
        return names.years(span(one.period, self.settings.years))

    def withheld_on(self, grid: AgeGrid) -> Cells:
        """Groups of a grid in which deaths are withheld, of this or of the benchmark."""
        return withheld_in(grid, *self.sides)

    @property
    def grid(self) -> AgeGrid:
        return self.changed.own.panel.grid

    @property
    def anything(self) -> bool:
        """Whether any rate is changed."""
        return bool(self.question.changes or self.question.toward)

    @property
    def headline(self) -> Estimate:
        """What the page says first."""
        return _headline(self.question, self.changed)

    @property
    def sides(self) -> tuple[Loaded, ...]:
        return (self.loaded, *([self.toward] if self.toward else []))


def what_if_of(session: Session, heading: Heading, question: WhatIfQuestion) -> Findings:
    """Load it and the benchmark, and work everything out anew. NotInEdition, BadValue."""
    collection, number = heading.collection.code, heading.edition.number
    settings = named.find(question.settings)
    held = holdings(session, collection, number)
    asked = [question.at, *([question.toward] if question.toward else [])]
    for one in asked:
        held.require(one)
    choice = CauseChoice.spelled(question.causes, held=heading.causes)
    beside = replace(Beside.of(settings, held.areas, indicators.find(question.of)), causes=choice)
    needed = wanted(question.at, question.toward, held, settings.years)
    found = load(session, collection, number, needed, beside, figures=question.figures)
    for one in asked:
        if one not in found:
            raise held.lacks(one, settings.years)
    keys = tuple(dict.fromkeys((*EVERY, question.of)))
    changed = _changed(collection, question, found, held, settings, keys)

    def headline(newer: Found) -> float:
        if not set(asked) <= newer.keys():
            return np.nan
        try:
            there = _changed(collection, question, newer, held, settings, (question.of,))
        except BadValue:  # its ages or causes are others
            return np.nan
        lender = newer[question.toward] if question.toward else None
        there = _protected(there, newer[question.at], lender)
        return float(_headline(question, there).value)

    toward = found[question.toward] if question.toward else None
    return Findings(
        heading,
        held,
        question,
        settings,
        found[question.at],
        toward,
        toward is not None and any(isinstance(one, Shared) for one in needed),
        _protected(changed, found[question.at], toward),
        moved(session, heading, needed, beside, headline, figures=question.figures),
    )


def _headline(question: WhatIfQuestion, changed: Changed) -> Estimate:
    """The change of the indicator asked for; where nothing is changed, the indicator."""
    numbers = changed.numbers
    anything = question.changes or question.toward
    return (numbers.change if anything else numbers.now)[question.of]


def _changed(
    collection: str,
    question: WhatIfQuestion,
    found: Found,
    held: Holdings,
    settings: Settings,
    keys: Sequence[str],
) -> Changed:
    both = [question.at, *([question.toward] if question.toward else [])]
    needed = [*both, *(one for of in both for one in members(of))]
    causes = have_causes(found, needed)
    grid = shared_grid(found, found)
    own = parted(question.at, found, grid, causes=causes)
    _require_known(question, own)
    change, chosen = _change(question, found, held, own, settings, causes=causes)
    every = [indicators.find(key) for key in keys]
    numbers = what_if(
        every, own.panel, own.parts, change, settings, streams=stream(collection, question.at)
    )
    reach, why = _reach(question, own, chosen, settings)
    return Changed(own, change, chosen, numbers, reach, why)


def _change(
    question: WhatIfQuestion,
    found: Found,
    held: Holdings,
    own: Parted,
    settings: Settings,
    *,
    causes: bool,
) -> tuple[Change, Cells]:
    """The changed rates, and the cells that the question names at all."""
    cells = [_cells(own, row.where, row.sex) for row in question.rows]
    percents = np.array([row.percent or 0.0 for row in question.rows])
    none = np.zeros((0, *own.parts.deaths.shape), np.bool_)
    times = factor(percents, np.stack(cells) if cells else none)
    chosen = np.any(cells, axis=0) if cells else np.zeros(times.shape, np.bool_)
    if question.toward is None:
        whole = chosen if cells else np.ones(times.shape, np.bool_)
        return Change(times), whole
    where = _cells(own, question.toward_where, EVERYBODY)
    lender = _benchmark(question.at, question.toward, found, held, own, settings, causes=causes)
    return Change(times, Benchmark(lender[0], where, lender[1])), chosen | where


def _benchmark(
    at: PopulationYear,
    toward: PopulationYear,
    found: Found,
    held: Holdings,
    own: Parted,
    settings: Settings,
    *,
    causes: bool,
) -> tuple[Parts, Array]:
    """The parts of the benchmark that lend to each of the own, and the counts that both share."""
    grid, whose = own.panel.grid, by_sex(at, found)
    theirs = by_sex(toward, found)
    lenders = theirs if len(whose) == len(theirs) else (toward,) * len(whose)
    parts = [parts_of(found[one], grid, causes=causes) for one in lenders]
    shared = []
    for mine, lender, lent in zip(whose, lenders, parts, strict=True):
        both = overlap(mine, lender, held.areas, settings.years)
        if both is None or both not in found:
            shared.append(np.zeros(lent.counts.shape))
            continue
        counted = parts_of(found[both], grid, causes=causes and found[both].causes is not None)
        ours = parts_of(found[mine], grid, causes=causes)
        shared.append(np.minimum(counted.counts, np.minimum(ours.counts, lent.counts)))
    return Parts.together(parts), np.concatenate(shared, axis=-2)


def _cells(own: Parted, where: Where, sex: str) -> Cells:
    """[part, age]"""
    grid = own.panel.grid
    starts = np.array(grid.starts)
    end = int(where.last) if where.last else np.inf
    ages = (starts >= int(where.first)) & (starts <= end)
    codes = np.array([one.code for one in own.causes] or [""])
    causes = np.isin(codes, [where.cause]) | (where.cause == "")
    several = len(own.parts.sexes) // len(codes)
    of_sex = np.array([one == sex or sex == EVERYBODY for one in own.parts.sexes])
    return np.asarray((np.tile(causes, several) & of_sex)[:, None] & ages)


def _require_known(question: WhatIfQuestion, own: Parted) -> None:
    """Refuse ages that are no groups', causes that are not listed and sexes not held apart."""
    lent = [question.toward_where] if question.toward else []
    for where in (*(row.where for row in question.rows), *lent):
        _require_ages(where, own.panel.grid)
    known = [one.code for one in own.causes]
    for code in question.named:
        if code not in known:
            raise BadValue(_no_cause(code, known))
    apart = set(own.parts.sexes) - {""}
    for row in question.rows:
        if row.sex != EVERYBODY and row.sex not in apart:
            raise BadValue(
                _(
                    "The rates of women and men cannot be changed apart here: {code} is not held as"
                    " women and men together. Leave “sex” empty.",
                    code=question.at.code,
                )
            )


def _require_ages(where: Where, grid: AgeGrid) -> None:
    ends = [str(start - 1) for start in grid.starts[1:]]
    if int(where.first) not in grid.starts or (where.last and where.last not in ends):
        raise BadValue(
            _(
                "Ages from {first} to {last} are not made up of the age groups counted here. Their"
                " first ages are {starts}; choose ages that begin at one and end before another.",
                first=where.first,
                last=where.last or _("the end"),
                starts=listed([str(start) for start in grid.starts], most=len(grid)),
            )
        )


def _no_cause(code: str, known: Sequence[str]) -> str:
    if not known:
        return _(
            "The address names the cause “{code}”, but there are no deaths by cause to be read"
            " here. Leave the cause empty.",
            code=code,
        )
    return _(
        "There is no cause “{code}” here; the causes are {known}. Choose among these, or leave the"
        " cause empty.",
        code=code,
        known=listed(list(known), most=60),
    )


def _reach(
    question: WhatIfQuestion, own: Parted, chosen: Cells, settings: Settings
) -> tuple[Reach | None, str]:
    """The uniform change that meets the target, or why there can be none."""
    if not question.target:
        return None, ""
    one = indicators.find(question.of)
    if not one.smooth:
        return None, _("This figure jumps, so that no change brings it to a stated number exactly.")
    if one.unit.limits == "count":
        return None, _("This figure counts over births and is not read off death rates.")
    target = np.array(float(question.target) / one.unit.scale)
    return uniform(one, own.panel, own.parts, chosen, target, settings), ""


def _protected(changed: Changed, own: Loaded, toward: Loaded | None) -> Changed:
    """Figures that rest on withheld counts, as they may be given."""
    sides = (own, *([toward] if toward else []))
    if not any(side.protected for side in sides):
        return changed
    numbers = changed.numbers
    first = {key: _rounded(value, key) for key, value in numbers.first_order.items()}
    return replace(
        changed,
        numbers=replace(
            numbers,
            now=all_protected(numbers.now, *sides),
            then=all_protected(numbers.then, *sides),
            change=all_protected(numbers.change, *sides),
            first_order=first,
        ),
    )


def _rounded(value: Array, key: str) -> Array:
    gap = np.full(value.shape, np.nan)
    bare = Estimate(value, gap, gap, np.zeros(value.shape, np.uint8), gap)
    return fixed(bare, indicators.find(key).unit).value
