"""Of what people die in one area, sex and year: every figure that a cause of death has."""

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from engine import indicators
from engine import settings as named
from engine.ages import Array
from engine.causes import losses, rates, registry
from engine.causes.counts import CauseCounts
from engine.causes.number import estimates as by_cause
from engine.estimates import Estimate
from engine.indicator import Indicator
from engine.panel import Panel
from engine.settings import Settings
from server.results.cause_course import Course, course, wider
from server.results.causes import CAUSES, NOT_STATED, CauseChoice, Causes, Listed
from server.results.holdings import Holdings, NotInEdition, holdings
from server.results.loading import Beside, Found, assembled, needed
from server.results.of_one import OfOne
from server.results.questions import CausesQuestion, PopulationYear
from server.results.releasing import released
from server.results.revision import Moved, life_expectancy, moved
from server.results.targets import Reached, reached
from server.sentences import names
from server.sentences.text import _
from server.store.causes import lineages
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import Cause

NUMBERS = tuple(one for one in registry.NUMBERS.values() if one.key != "gain_uniform")
RATES: tuple[Indicator, ...] = tuple(
    indicators.find(key) for key in ("cdr", "asr_esp2013", "asr75_esp2013", "yll75", "yll_ref")
)
OF_ALL = tuple(indicators.find(key) for key in ("e0", "edagger", "H", "75q0")) + RATES
PREMATURE = 75  # deaths before this age
AVOIDABLE = tuple(indicators.find(key) for key in ("asr75_esp2013", "yll75"))


@dataclass(frozen=True, slots=True)
class Avoidable:
    """Of the causes that a reader counts as avoidable, together, before 75."""

    causes: tuple[Cause, ...]  # without parts
    deaths: float
    estimates: Mapping[str, Estimate]  # no batch axes


@dataclass(frozen=True, slots=True)
class CauseFigures(OfOne):
    """One population-year by cause. Numbers of causes are [cause], in the order of `causes`."""

    question: CausesQuestion
    held: Causes  # as the address asks for them
    leaves: Causes  # the causes without parts
    deaths: rates.CauseShare
    estimates: Mapping[str, Estimate]  # by key of number or rate
    all: Mapping[str, Estimate]  # the same of all causes, no batch axes
    lost: Array  # [cause, age] years lost per death by cause and age; they add up to e-dagger
    targets: tuple[Reached, ...]
    avoidable: Avoidable | None  # of the causes that the reader counts as such
    course: Course | None  # one cause through the years
    moved: Moved | None

    @property
    def causes(self) -> tuple[Cause, ...]:
        return self.held.list

    @property
    def panel(self) -> Panel:
        return self.loaded.panel

    @property
    def readable(self) -> bool:
        """Whether years lost per death are known."""
        return bool(np.isfinite(self.all["edagger"].value))

    @property
    def each(self) -> bool:
        """Whether causes are shown each by itself: then they are many, and each is small."""
        return self.question.causes is not None and self.question.causes.level == CAUSES

    @property
    def order(self) -> tuple[int, ...]:
        """Places of the causes that somebody died of: by years lost where these are known, else by
        deaths; the most first."""
        deaths = self.deaths.deaths
        by = self.estimates["edagger"].value if self.readable else deaths
        some = [at for at in range(len(self.causes)) if deaths[at] > 0]
        return tuple(sorted(some, key=lambda at: (-float(by[at]), at)))

    @property
    def named(self) -> tuple[Cause, ...]:
        """Every cause that the page names deaths of."""
        targets = [cause for one in self.targets for cause in one.causes]
        followed = [self.course.cause] if self.course else []
        avoidable = self.avoidable.causes if self.avoidable else ()
        return (*(self.causes[at] for at in self.order), *targets, *followed, *avoidable)

    @property
    def leading(self) -> tuple[int, ...]:
        """The same without deaths of no known cause."""
        known = ("natural", "external", "undetermined")
        return tuple(at for at in self.order if self.causes[at].kind in known)


def cause_figures(session: Session, heading: Heading, question: CausesQuestion) -> CauseFigures:
    """Load it and read off every figure. NotInEdition where there are no deaths by cause."""
    collection, number = heading.collection.code, heading.edition.number
    settings, choice = named.find(question.settings), question.causes or CauseChoice()
    held = holdings(session, collection, number)
    held.require(question.of)
    if not held.causes:
        raise NotInEdition(no_causes())
    _require_listed(held, question)
    wanted = _years(held, question.of, settings)
    beside = replace(Beside.of(settings, held.areas), causes=choice)
    cells = released(session, collection, number, needed(wanted, beside), question.figures)
    listed = Listed.chosen(held.causes, held.breaks, choice)
    fine = replace(beside, causes=replace(choice, level=CAUSES))
    leaves = assembled(cells, wanted, fine, listed)
    shown = leaves if choice == fine.causes else assembled(cells, [question.of], beside, listed)
    if question.of not in shown:
        raise held.lacks(question.of, settings.years)
    loaded, own, finest = shown[question.of], shown[question.of].causes, leaves[question.of].causes
    if own is None or finest is None:
        raise NotInEdition(_not_by_cause(heading, question))
    panel = loaded.panel
    made = CauseFigures(
        heading=heading,
        holdings=held,
        question=question,
        settings=settings,
        loaded=loaded,
        held=own,
        leaves=finest,
        deaths=rates.deaths_and_shares(own.counts, settings),
        estimates=_estimates(panel, own, settings),
        all=indicators.estimates(OF_ALL, panel, settings),
        lost=losses.years_lost(panel, own.counts, settings),
        targets=reached(panel, finest.counts, finest.list, settings),
        avoidable=_avoidable(panel, finest, held, question, settings),
        course=None,
        moved=_moved(session, heading, question, beside, settings),
    )
    return replace(made, course=_course(made, leaves))


def _require_listed(held: Holdings, question: CausesQuestion) -> None:
    """NotInEdition where a cause is named that is not in the list."""
    codes = [one.code for one in (*held.causes, NOT_STATED)]
    unknown = [one for one in (question.cause, *question.avoidable) if one and one not in codes]
    if unknown:
        raise NotInEdition(
            _(
                "The cause list of this edition has no {unknown}. Its causes are {causes}. Choose"
                " among these.",
                unknown=names.listed(unknown),
                causes=names.listed(codes, most=60),
            )
        )


def _years(held: Holdings, of: PopulationYear, settings: Settings) -> list[PopulationYear]:
    """The one asked for, and the same area and sex in every year that the edition holds."""
    others = [replace(of, period=period) for period in held.periods]
    return [of, *(one for one in others if one != of and held.all_of(one, settings.years))]


def _estimates(panel: Panel, own: Causes, settings: Settings) -> dict[str, Estimate]:
    """Every number of every cause, its interval with the errors of the ratios applied."""

    def read(counts: CauseCounts) -> dict[str, Estimate]:
        found = by_cause(NUMBERS, panel, counts, settings)
        return found | rates.rates_by_cause(RATES, panel, counts, settings)

    found = read(own.counts)
    for shift in own.shifts if own.shifts is not None else ():
        higher = read(replace(own.counts, deaths=np.maximum(own.counts.deaths + shift, 0.0)))
        found = {
            key: wider(one, higher[key].value - one.value, settings.level)
            for key, one in found.items()
        }
    return found


def _avoidable(
    panel: Panel, finest: Causes, held: Holdings, question: CausesQuestion, settings: Settings
) -> Avoidable | None:
    """Deaths before 75 of the causes named, and of those under them, together."""
    lineage = lineages(held.causes)
    places = [
        at
        for at, one in enumerate(finest.list)
        if set(question.avoidable).intersection(lineage.get(one.code, (one.code,)))
    ]
    if not places:
        return None
    own = finest.counts.over(lambda array: array[..., places, :].sum(axis=-2, keepdims=True))
    young = np.array(panel.grid.starts) < PREMATURE
    found = rates.rates_by_cause(AVOIDABLE, panel, own, settings)
    return Avoidable(
        tuple(finest.list[at] for at in places),
        float((own.deaths * young).sum()),
        {key: one[0] for key, one in found.items()},
    )


def _course(made: CauseFigures, leaves: Found) -> Course | None:
    """Of the cause asked for, or that which costs most."""
    listed = {one.code: one for one in (*made.holdings.causes, *made.causes)}
    chosen = made.question.cause or (made.causes[made.leading[0]].code if made.leading else "")
    if chosen not in listed:
        return None
    return course(made.holdings, made.of, listed[chosen], leaves, made.settings)


def _moved(
    session: Session,
    heading: Heading,
    question: CausesQuestion,
    beside: Beside,
    settings: Settings,
) -> Moved | None:
    bare = replace(beside, causes=None)
    headline = life_expectancy(question.of, settings)
    return moved(session, heading, [question.of], bare, headline, figures=question.figures)


def no_causes() -> str:
    """What is said of an edition without causes of death."""
    return _(
        "This edition holds no deaths by cause. Causes come with a file of deaths that has a column"
        " of them."
    )


def held_by_cause(heading: Heading, held: Holdings, of: PopulationYear, figures: str) -> bool:
    """Whether there is a page of causes to link to. Under a policy causes are released of areas
    that are part of none, if at all."""
    if not held.causes or heading.policy is None or figures != "released":
        return bool(held.causes)
    return not any(area.parent for area in held.areas if area.code == of.area)


def _not_by_cause(heading: Heading, question: CausesQuestion) -> str:
    if heading.policy is not None and question.figures == "released":
        return _(
            "Under the policy of this collection deaths by cause of {code} are not released: they"
            " are of areas that are part of no other, or of none. The office sees them with"
            " figures=full.",
            code=question.of.code,
        )
    return _(
        "This edition holds no deaths by cause of {code} for all the years asked for. Choose"
        " another area, sex or year.",
        code=question.of.code,
    )
