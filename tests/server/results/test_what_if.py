"""What-if from an edition: sexes, causes and benchmarks find their cells."""

from collections.abc import Iterator
from dataclasses import replace
from urllib.parse import parse_qsl

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine.ages import AgeGrid
from engine.indicators import find, values
from engine.panel import Panel
from engine.settings import find as settings
from server.results.causes import CauseChoice
from server.results.keys import BadValue, PopulationYear
from server.results.what_if import Findings, what_if_of
from server.results.what_if_question import WhatIfQuestion
from server.store.connect import Session, make_engine, sessions
from server.store.heading import heading
from server.store.records import Cause
from tests.factories import GRIDS, edition, gompertz_panel

FIVE = GRIDS["abridged"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])
LIST = (
    Cause("body", "Of the body"),
    Cause("heart", "Heart", "body"),
    Cause("lungs", "Lungs", "body"),
    Cause("own-hand", "Suicide", kind="external", care="suicide"),
)
SHARES = {"heart": 0.5, "lungs": 0.3, "own-hand": 0.2}
ALMANAC = settings("almanac-1")
PANELS = {
    f"{area}.{sex}.2014": gompertz_panel(sex=sex, seed=seed, people=2e6, level=level)
    for seed, (area, level) in enumerate((("north", 2e-5), ("south", 2.8e-5)))
    for sex in "fm"
}


def dealt(panel: Panel, seed: int) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(seed)
    counts = rng.multinomial(panel.deaths.astype(int), list(SHARES.values()))
    return {code: counts[:, at].astype(float) for at, code in enumerate(SHARES)}


@pytest.fixture(scope="module")
def isle(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Session]:
    """North and south of the isle, by cause in edition 2; the cape, which ends at 85, without."""
    from server.store.migrating import migrate

    url = f"sqlite:///{tmp_path_factory.mktemp('what-if') / 'ebbline.db'}"
    migrate(url)
    engine = make_engine(url)
    with sessions(engine)() as session:
        cape = {f"cape.{sex}.2014": PANELS[f"north.{sex}.2014"].regroup(SHORT) for sex in "fm"}
        parents = {"north": "isle", "south": "isle"}
        edition(session, PANELS | cape, parents=parents)
        by_cause = {name: dealt(panel, at) for at, (name, panel) in enumerate(PANELS.items())}
        edition(session, PANELS, parents=parents, causes=LIST, by_cause=by_cause)
        yield session
    engine.dispose()


def asked(session: Session, query: str, number: int = 1) -> Findings:
    question = WhatIfQuestion.parse(parse_qsl(query, keep_blank_values=True))
    known = heading(session, "isle", number)
    question = replace(question, causes=CauseChoice.spelled(question.causes, held=known.causes))
    return what_if_of(session, known, question)


def e0(panel: Panel) -> float:
    return float(values([find("e0")], panel, ALMANAC)["e0"])


def test_a_percentage_moves_the_chosen_ages_alone(isle: Session) -> None:
    found = asked(isle, "at=north.f.2014&by=-20&from=30&to=59")
    panel = PANELS["north.f.2014"]
    starts = np.array(FIVE.starts)
    inside = (starts >= 30) & (starts <= 59)
    lower = replace(panel, deaths=np.where(inside, 0.8, 1.0) * panel.deaths)
    assert_allclose(found.changed.numbers.then["e0"].value, e0(lower), rtol=1e-12)
    assert_allclose(found.changed.numbers.fewer[0], panel.deaths - lower.deaths)


def test_of_persons_one_sex_can_be_changed(isle: Session) -> None:
    found = asked(isle, "at=north.p.2014&by=-50&from=0&to=0&sex=m")
    women, men = PANELS["north.f.2014"], PANELS["north.m.2014"]
    fewer = np.where(np.arange(len(FIVE)) == 0, 0.5, 1.0)
    apart = Panel.persons(women, replace(men, deaths=fewer * men.deaths))
    assert_allclose(float(found.changed.numbers.then["e0"].value), e0(apart), rtol=1e-12)
    assert found.changed.own.parts.sexes == ("f", "m")


def test_a_cause_is_a_part_of_each_sex(isle: Session) -> None:
    found = asked(isle, "at=north.p.2014&by=-100&cause=body&sex=m", 2)
    counts = dealt(PANELS["north.m.2014"], 1)
    gone = counts["heart"] + counts["lungs"]
    assert [one.code for one in found.changed.own.causes] == ["body", "own-hand"]
    assert_allclose(found.changed.numbers.fewer.sum(axis=0), gone)
    whole = asked(isle, "at=north.p.2014&by=-100&cause=body", 2)
    both = gone + sum(dealt(PANELS["north.f.2014"], 0)[code] for code in ("heart", "lungs"))
    assert_allclose(whole.changed.numbers.fewer.sum(axis=0), both)


def test_causes_by_themselves_have_names_of_their_own(isle: Session) -> None:
    found = asked(isle, "at=north.f.2014&by=-100&cause=lungs&causes=causes", 2)
    assert_allclose(
        found.changed.numbers.fewer.sum(axis=0), dealt(PANELS["north.f.2014"], 0)["lungs"]
    )
    with pytest.raises(BadValue, match="the causes are body and own-hand"):
        asked(isle, "at=north.f.2014&by=-100&cause=lungs", 2)


def test_a_benchmark_lends_its_rates_by_sex_and_cause(isle: Session) -> None:
    whole = "at=south.p.2014&toward=north.p.2014"
    found = asked(isle, whole)
    lived = [PANELS[f"south.{sex}.2014"].exposure for sex in "fm"]
    theirs = [PANELS[f"north.{sex}.2014"] for sex in "fm"]
    there = sum(years * one.deaths / one.exposure for years, one in zip(lived, theirs, strict=True))
    assert_allclose(found.changed.own.panel.deaths - found.changed.numbers.fewer.sum(axis=0), there)
    by_cause = asked(
        isle, "at=south.f.2014&toward=north.f.2014&toward_cause=own-hand&toward_from=20", 2
    )
    rates = dealt(theirs[0], 0)["own-hand"] / theirs[0].exposure
    now = dealt(PANELS["south.f.2014"], 2)["own-hand"]
    fewer = np.where(np.array(FIVE.starts) >= 20, now - rates * lived[0], 0.0)
    assert_allclose(by_cause.changed.numbers.fewer.sum(axis=0), fewer, atol=1e-9)


def test_an_area_brought_to_its_whole_shares_its_deaths(isle: Session) -> None:
    found = asked(isle, "at=north.p.2014&toward=isle.p.2014")
    assert found.overlap
    lender = found.changed.change.benchmark
    assert lender is not None
    assert_array_equal(lender.shared, found.changed.own.parts.counts)
    apart = asked(isle, "at=north.p.2014&toward=south.p.2014")
    assert not apart.overlap
    assert not apart.changed.change.benchmark.shared.any()  # type: ignore[union-attr]


def test_brought_to_itself_nothing_changes_and_nothing_is_uncertain(isle: Session) -> None:
    found = asked(isle, "at=north.f.2014&toward=north.f.2014")
    change = found.changed.numbers.change["e0"]
    assert abs(change.value) < 1e-10
    assert abs(change.low) < 1e-9
    assert abs(change.high) < 1e-9


def test_a_coarser_benchmark_brings_both_to_its_ages(isle: Session) -> None:
    found = asked(isle, "at=north.f.2014&toward=cape.f.2014")
    assert found.grid == SHORT


def test_the_target_is_sought_at_the_cells_named(isle: Session) -> None:
    forward = asked(isle, "at=north.m.2014&by=-20&from=30&to=59")
    target = float(forward.changed.numbers.then["e0"].value)
    back = asked(isle, f"at=north.m.2014&by=&from=30&to=59&target={target:.6f}")
    assert back.changed.reach is not None
    assert float(back.changed.reach.factor) == pytest.approx(0.8, abs=1e-5)
    everywhere = asked(isle, f"at=north.m.2014&target={target:.6f}")
    assert everywhere.changed.chosen.all()
    assert 0.8 < float(everywhere.changed.reach.factor) < 1  # type: ignore[union-attr]


@pytest.mark.parametrize(("of", "words"), [("mode", "jumps"), ("imr", "over births")])
def test_some_figures_have_no_target(isle: Session, of: str, words: str) -> None:
    found = asked(isle, f"at=north.m.2014&of={of}&target=80")
    assert found.changed.reach is None
    assert words in found.changed.no_reach


@pytest.mark.parametrize(
    ("query", "words"),
    [
        ("at=north.f.2014&by=-20&from=31", "Ages from 31 to the end"),
        ("at=north.f.2014&by=-20&from=30&to=58", "Ages from 30 to 58"),
        ("at=north.f.2014&by=-20&cause=heart", "no deaths by cause"),
        ("at=north.f.2014&toward=south.f.2014&toward_to=33", "Ages from 0 to 33"),
    ],
)
def test_what_is_not_counted_so_is_refused(isle: Session, query: str, words: str) -> None:
    with pytest.raises(BadValue, match=words):
        asked(isle, query)


def test_a_newer_edition_is_told_by_the_change_asked_for(isle: Session) -> None:
    found = asked(isle, "at=north.f.2014&by=-20&from=30&to=59")
    assert found.moved is not None
    assert found.moved.number == 2
    assert found.moved.by(float(found.headline.value)) == pytest.approx(0.0, abs=1e-9)
    named = asked(isle, "at=north.f.2014&by=-20&cause=body", 2)
    assert named.moved is None
    of = PopulationYear.parse("north.f.2014")
    assert named.at == of
