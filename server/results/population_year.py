"""All that is read off one area, sex and year, and off the change from the year before."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine import ageing, indicators, sensitivity
from engine import settings as named
from engine.ages import Array
from engine.chain import Chain, run
from engine.estimates import Estimate, Reason
from engine.settings import Settings, span
from server.results import models
from server.results.estimating import COMPARED, EVERY, differences, estimates, stream
from server.results.holdings import holdings
from server.results.loading import Beside, Found, Loaded, load
from server.results.of_one import OfOne
from server.results.protecting import all_protected, protected
from server.results.questions import PopulationYear, PopulationYearQuestion
from server.results.revision import Moved, moved
from server.sentences import names
from server.store.connect import Session
from server.store.heading import Heading

NO_TABLE = (Reason.TOO_FEW_PERSON_YEARS, Reason.NO_POPULATION, Reason.NOT_AVAILABLE)


@dataclass(frozen=True, slots=True)
class Before:
    """The year before, and what changed since."""

    of: PopulationYear
    loaded: Loaded
    period: str  # the year, or the years added up
    estimates: dict[str, Estimate]
    change: dict[str, Estimate]  # the year asked for less the one before, on the grid they share;
    # not of ratios to a whole, of which two do not compare


@dataclass(frozen=True, slots=True)
class Findings(OfOne):
    """One population-year, read in every way."""

    question: PopulationYearQuestion
    chain: Chain
    estimates: dict[str, Estimate]
    before: Before | None  # None where the edition lacks the year before
    rises: ageing.Rises
    gain: Array  # years of life expectancy at birth for 1 % lower rates, by age of the table
    elasticity: Array  # % of life expectancy for 1 % of each death rate, years lived as they are
    by_survival: Array  # years of life expectancy per unit of the chance to survive each group
    avoidable: sensitivity.Avoidable  # deaths to avoid for a month of life expectancy at birth
    implied: models.Implied | None  # None where the area is part of no larger one
    moved: Moved | None

    @property
    def withheld(self) -> NDArray[np.bool_]:
        """Groups of the counts whose deaths are withheld, [age]."""
        return self.loaded.withheld_on(self.loaded.panel.grid)

    @property
    def withheld_of_table(self) -> NDArray[np.bool_]:
        """The same on the ages of the table, of which a law's are none."""
        grid, held = self.chain.table.grid, self.loaded.panel.grid
        own = len(held) - 1 if self.chain.modelled else len(held)
        return np.append(self.withheld[:own], np.zeros(len(grid) - own, np.bool_))

    @property
    def readable(self) -> bool:
        """Whether a life table may be read at all: enough people, and a rate at every age."""
        return int(self.estimates["e0"].reason) not in NO_TABLE

    @property
    def gainful(self) -> bool:
        """Whether it is known what lower death rates would add."""
        return self.readable and bool(np.isfinite(self.gain).all() and self.gain.any())


def population_year(
    session: Session, heading: Heading, question: PopulationYearQuestion
) -> Findings:
    """Load it and the year before, and read off every indicator. NotInEdition."""
    collection, number = heading.collection.code, heading.edition.number
    settings = named.find(question.settings)
    held = holdings(session, collection, number)
    held.require(question.of)
    previous = held.previous(question.of, settings.years)
    wanted = [question.of, *([previous] if previous else [])]
    beside = Beside.of(settings, held.areas)
    loaded = load(session, collection, number, wanted, beside, figures=question.figures)
    if question.of not in loaded:
        raise held.lacks(question.of, settings.years)
    panel = loaded[question.of].panel
    chain = run(panel, settings)
    return Findings(
        heading=heading,
        holdings=held,
        question=question,
        settings=settings,
        loaded=loaded[question.of],
        chain=chain,
        estimates=all_protected(
            estimates(EVERY, panel, settings, stream(collection, question.of)), loaded[question.of]
        ),
        before=_before(collection, question.of, previous, loaded, settings),
        rises=ageing.rises(panel, level=settings.level),
        gain=sensitivity.gain_per_percent(indicators.find("e0"), chain),
        elasticity=sensitivity.elasticity(indicators.find("e0"), chain),
        by_survival=sensitivity.by_survival(indicators.find("e0"), chain),
        avoidable=sensitivity.deaths_to_avoid(indicators.find("e0"), chain),
        implied=models.implied(panel, settings),
        moved=moved(
            session,
            heading,
            [question.of],
            beside,
            lambda newer: _life_expectancy(newer.get(question.of), settings),
            figures=question.figures,
        ),
    )


def _before(
    collection: str,
    of: PopulationYear,
    previous: PopulationYear | None,
    loaded: Found,
    settings: Settings,
) -> Before | None:
    if previous is None or previous not in loaded:
        return None
    this, that = loaded[of].panel, loaded[previous].panel
    grid = this.grid.common(that.grid)
    return Before(
        previous,
        loaded[previous],
        names.years(span(previous.period, settings.years)),
        all_protected(
            estimates(EVERY, that, settings, stream(collection, previous)), loaded[previous]
        ),
        all_protected(
            differences(
                COMPARED,
                this.regroup(grid),
                that.regroup(grid),
                settings,
                (stream(collection, of), stream(collection, previous)),
            ),
            loaded[of],
            loaded[previous],
        ),
    )


def _life_expectancy(loaded: Loaded | None, settings: Settings) -> float:
    if loaded is None:
        return np.nan
    estimate = indicators.estimate(indicators.find("e0"), loaded.panel, settings)
    return float(protected("e0", estimate, loaded).value)


def finite(estimate: Estimate) -> bool:
    """Whether there is a value to print."""
    return bool(np.isfinite(estimate.value))
