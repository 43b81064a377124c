"""One population-year: its figures, the change from the year before, a newer edition."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine import indicators
from engine.ageing import rises
from engine.ages import AgeGrid
from engine.chain import run
from engine.estimates import Reason
from engine.settings import find
from server.results.estimating import EVERY, USUAL, stream
from server.results.holdings import NotInEdition
from server.results.population_year import Findings, population_year
from server.results.questions import PopulationYear, PopulationYearQuestion
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import (
    GRIDS,
    cells,
    edition,
    gompertz_panel,
    stored_collection,
    stored_edition,
)

FIVE = GRIDS["abridged"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])
PLAIN = find("almanac-1")
PANELS = {
    "2012": gompertz_panel(people=3e6, seed=1, level=3e-5).regroup(SHORT),
    "2013": gompertz_panel(people=3e6, seed=2, level=2.8e-5),
    "2014": gompertz_panel(people=3e6, seed=3, level=2.6e-5),
    "2016": gompertz_panel(people=3e6, seed=4, level=2.4e-5),
}


@pytest.fixture
def isle(session: Session) -> Session:
    """The first year ends at 85+, and 2015 is missing."""
    edition(session, {f"north.f.{year}": panel for year, panel in PANELS.items()})
    return session


def asked(session: Session, year: str, number: int = 1) -> Findings:
    question = PopulationYearQuestion(PopulationYear("north", "f", year))
    return population_year(session, heading(session, "isle", number), question)


def test_figures_are_the_estimates_of_the_counts(isle: Session) -> None:
    found = asked(isle, "2014")
    assert tuple(found.estimates) == EVERY
    assert set(EVERY) == set(indicators.INDICATORS)
    codes = stream("isle", found.of)
    for key in USUAL:
        # of the counts as stored, which are rounded: a draw may differ, and with it all after it
        alone = indicators.estimate(indicators.find(key), found.loaded.panel, PLAIN, streams=codes)
        assert_allclose(found.estimates[key].value, alone.value, rtol=1e-9)
        assert_allclose(found.estimates[key].low, alone.low, rtol=1e-6)
    k = rises(PANELS["2014"], level=PLAIN.level)
    for part in ("value", "low", "high"):
        assert_allclose(getattr(found.rises, part), getattr(k, part), rtol=1e-6)
    assert found.readable
    assert found.gainful
    total = float(100 * found.gain.sum())  # e-dagger, but for the rule of the first year
    assert total == pytest.approx(float(found.estimates["edagger"].value), rel=1e-3)


def test_the_change_is_this_year_less_the_one_before(isle: Session) -> None:
    before = asked(isle, "2014").before
    assert before is not None
    assert before.of.period == "2013"
    for key in ("e0", "H", "median"):
        values = (indicators.find(key).value(run(PANELS[year], PLAIN)) for year in ("2014", "2013"))
        assert_allclose(before.change[key].value, np.subtract(*values), rtol=1e-6)
        assert before.change[key].low < before.change[key].value < before.change[key].high


def test_what_is_simulated_of_the_change_goes_by_the_codes_of_both_years(isle: Session) -> None:
    found = asked(isle, "2014")
    assert found.before is not None
    median = indicators.difference(
        indicators.find("median"),
        PANELS["2014"],
        PANELS["2013"],
        PLAIN,
        streams=(stream("isle", found.of), stream("isle", found.before.of)),
    )
    assert_allclose(found.before.change["median"].low, median.low, rtol=1e-6)
    assert_allclose(found.before.change["median"].high, median.high, rtol=1e-6)


def test_a_year_before_on_other_ages_is_compared_on_those_both_have(isle: Session) -> None:
    found = asked(isle, "2013")
    before = found.before
    assert before is not None
    assert found.estimates["H"].reason == Reason.NONE
    assert before.estimates["H"].reason == Reason.OPEN_GROUP_TOO_LARGE
    assert before.change["H"].reason == Reason.OPEN_GROUP_TOO_LARGE
    short = indicators.difference(
        indicators.find("e0"), PANELS["2013"].regroup(SHORT), PANELS["2012"], PLAIN
    )
    assert_allclose(before.change["e0"].value, short.value, rtol=1e-6)


@pytest.mark.parametrize("year", ["2012", "2016"])
def test_without_the_very_year_before_there_is_no_change(isle: Session, year: str) -> None:
    assert asked(isle, year).before is None


def test_a_newer_edition_moves_life_expectancy_by_what_it_says(isle: Session) -> None:
    assert asked(isle, "2014").moved is None
    edition(isle, {"north.f.2014": gompertz_panel(people=3e6, seed=3, level=2.5e-5)})
    here, newer = asked(isle, "2014"), asked(isle, "2014", number=2)
    assert here.moved is not None
    assert here.moved.number == 2
    assert_allclose(here.moved.value, newer.estimates["e0"].value, rtol=1e-13)
    assert newer.moved is None


def test_few_people_have_no_table(session: Session) -> None:
    edition(session, {"north.f.2014": gompertz_panel(people=4_000, seed=1)})
    found = asked(session, "2014")
    assert not found.readable
    assert not found.gainful
    assert {int(one.reason) for one in found.estimates.values()} == {Reason.TOO_FEW_PERSON_YEARS}


def test_deaths_without_person_years_are_refused(session: Session) -> None:
    stored_collection(session, "isle")
    handed = cells(("north",), years=(2014,), measures=("deaths",))
    stored_edition(session, handed, collection="isle")
    with pytest.raises(NotInEdition, match=r"does not hold north\.f\.2014, or not both"):
        asked(session, "2014")


def test_eight_statements_at_most(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    edition(isle, {"north.f.2014": PANELS["2016"]})
    with count_statements() as statements:
        asked(isle, "2014")
    assert len(statements) <= 8
