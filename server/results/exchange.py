"""How many deaths fewer, at each age and of each cause, make life expectancy a month longer."""

from dataclasses import dataclass, replace
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from engine import indicators
from engine import settings as named
from engine.chain import Chain, run
from engine.estimates import Estimate
from engine.sensitivity import ONE_MONTH, Avoidable, deaths_to_avoid
from engine.whatif_reach import Reach, uniform
from server.results.causes import CauseChoice
from server.results.holdings import holdings
from server.results.loading import Beside, load
from server.results.of_one import OfOne
from server.results.parted import Parted, hidden, parted
from server.results.revision import Moved, life_expectancy, moved
from server.results.with_causes import CausesOfOne
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True)
class ExchangeQuestion(CausesOfOne):
    """How many deaths fewer make a month of life expectancy? One area, sex and year."""

    view: ClassVar[str] = "exchange"


@dataclass(frozen=True, slots=True)
class Exchange(OfOne):
    """Deaths for a month of life expectancy, of one population-year."""

    question: ExchangeQuestion
    chain: Chain
    e0: Estimate
    avoidable: Avoidable  # by age alone: of whichever cause
    own: Parted  # by cause, where there are some
    everywhere: Reach  # the factor on all death rates that makes a month
    by_cause: Reach  # and on those of each cause, [cause]
    moved: Moved | None

    @property
    def readable(self) -> bool:
        """Whether there is a life expectancy to speak of."""
        return bool(np.isfinite(self.e0.value))

    @property
    def withheld(self) -> NDArray[np.bool_]:
        """Groups whose deaths are withheld, [age]."""
        return self.loaded.withheld_on(self.own.panel.grid)

    @property
    def hidden(self) -> NDArray[np.bool_]:
        """The same of each cause, [cause, age]."""
        return hidden(self.loaded, self.own.panel.grid, causes=bool(self.own.causes))


def exchange(session: Session, heading: Heading, question: ExchangeQuestion) -> Exchange:
    """Load it and work everything out. NotInEdition."""
    collection, number = heading.collection.code, heading.edition.number
    settings, e0 = named.find(question.settings), indicators.find("e0")
    held = holdings(session, collection, number)
    held.require(question.of)
    choice = CauseChoice.spelled(question.causes, held=heading.causes)
    beside = replace(Beside.of(settings, held.areas), causes=choice)
    found = load(session, collection, number, [question.of], beside, figures=question.figures)
    if question.of not in found:
        raise held.lacks(question.of, settings.years)
    loaded = found[question.of]
    own = parted(question.of, found, loaded.panel.grid, causes=loaded.causes is not None)
    chain = run(own.panel, settings)
    month = np.array(ONE_MONTH)
    each = np.eye(own.parts.deaths.shape[-2], dtype=bool)[..., None]
    cells = np.broadcast_to(each, (*each.shape[:2], len(own.panel.grid)))

    def reach(which: NDArray[np.bool_]) -> Reach:
        return uniform(e0, own.panel, own.parts, which, month, settings, from_now=True)

    return Exchange(
        heading,
        held,
        question,
        settings,
        loaded,
        chain,
        indicators.estimate(e0, own.panel, settings),
        deaths_to_avoid(e0, chain),
        own,
        reach(np.ones(cells.shape[1:], bool)),
        reach(cells),
        moved(
            session,
            heading,
            [question.of],
            beside,
            life_expectancy(question.of, settings),
            figures=question.figures,
        ),
    )
