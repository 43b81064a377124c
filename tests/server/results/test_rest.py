"""The rest of a whole: the whole count for count without the area, causes and stand-ins too."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.estimates import Reason
from engine.panel import Panel
from server.results.causes import CauseChoice, Causes
from server.results.compared import Comparison
from server.results.comparison import comparison
from server.results.loading import Beside, Loaded, load
from server.results.questions import ComparisonQuestion, PopulationYear
from server.results.rest import Rest, rest
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import GRIDS, cause_list, edition, gompertz_panel, parted

FIVE = GRIDS["abridged"]
PARTS = ("north", "south", "cape")


def panels() -> dict[str, Panel]:
    return {
        f"{area}.{sex}.{year}": gompertz_panel(
            sex=sex,
            people=8e5,
            seed=10 * place + (sex == "m") + int(year),
            level=2e-5 + 3e-6 * place,
        )
        for place, area in enumerate(PARTS)
        for sex in "fm"
        for year in ("2012", "2013", "2014")
    }


@pytest.fixture
def isle(session: Session) -> Session:
    counts = panels()
    listed = cause_list(3)
    by_cause = {
        name: dict(zip((one.code for one in listed), parted(panel, 3).deaths, strict=True))
        for name, panel in counts.items()
    }
    edition(session, counts, parents=dict.fromkeys(PARTS, "isle"), causes=listed, by_cause=by_cause)
    return session


def asked(session: Session, this: str, that: str, **choices: str) -> Comparison:
    sides = PopulationYear.parse(this), PopulationYear.parse(that)
    question = ComparisonQuestion(*sides, **{"overlap": "rest", **choices}).simplified()  # type: ignore[arg-type]
    question = replace(question, causes=CauseChoice())
    return comparison(session, heading(session, "isle", 1), question)


@pytest.mark.parametrize("sex", ["f", "p"])
def test_area_and_rest_are_the_whole(isle: Session, sex: str) -> None:
    found = asked(isle, f"north.{sex}.2014", f"isle.{sex}.2014")
    whole = asked(isle, f"north.{sex}.2014", f"isle.{sex}.2014", overlap="shared").that.panel
    assert found.kind == "rest"
    for name in ("deaths", "exposure"):
        both = getattr(found.this.panel, name) + getattr(found.that.panel, name)
        assert_allclose(both, getattr(whole, name), rtol=1e-12)
    of = found.explained.causes
    assert of is not None
    assert_allclose(of.deaths[1].sum(), found.that.panel.deaths.sum(), rtol=1e-12)


def test_the_rest_is_the_sum_of_the_other_parts(isle: Session) -> None:
    """Persons included, whose infants have a mix of their own."""
    found = asked(isle, "north.p.2014", "isle.p.2014").that.panel
    beside = Beside(parents=dict.fromkeys(PARTS, "isle"))
    wanted = [PopulationYear(area, sex, "2014") for area in ("south", "cape") for sex in "fm"]
    others = load(isle, "isle", 1, wanted, beside)
    women, men = (
        Panel.pooled([others[one].panel for one in wanted if one.sex == sex]) for sex in "fm"
    )
    expected = Panel.persons(women, men)
    for name in ("deaths", "exposure", "infant_weight", "infant_ratio"):
        assert_allclose(getattr(found, name), getattr(expected, name), rtol=1e-6)


def test_no_death_is_in_both_so_the_interval_is_that_of_two_apart(isle: Session) -> None:
    found = asked(isle, "north.f.2014", "isle.f.2014")
    assert found.overlap is None
    apart = np.hypot(*(float(side.estimates["e0"].se) for side in (found.this, found.that)))
    assert_allclose(found.difference["e0"].se, apart, rtol=1e-12)
    turned = asked(isle, "isle.f.2014", "north.f.2014")
    assert turned.this.place.rest == Rest(PopulationYear("isle", "f", "2014"), "north")
    assert_allclose(turned.difference["e0"].value, -found.difference["e0"].value)


@pytest.mark.parametrize(
    ("this", "that", "settings"),
    [
        ("north.f.2014", "isle.f.2013", "almanac-1"),
        ("north.f.2014", "isle.m.2014", "almanac-1"),
        ("north.f.2014", "south.f.2014", "almanac-1"),
        ("north.f.2014", "north.f.2014", "almanac-1"),
    ],
)
def test_there_is_a_rest_only_of_the_same_sex_and_years(
    isle: Session, this: str, that: str, settings: str
) -> None:
    assert asked(isle, this, that, settings=settings).kind == "plain"


def test_years_added_up_are_those_of_the_whole(isle: Session) -> None:
    found = asked(isle, "north.f.2014", "isle.f.2014", settings="almanac-1-3-years")
    counts = panels()
    expected = sum(
        counts[f"{area}.f.{year}"].deaths
        for area in ("south", "cape")
        for year in ("2012", "2013", "2014")
    )
    assert_allclose(found.that.panel.deaths, expected)


def test_a_whole_delivered_short_of_its_part_has_no_rest(session: Session) -> None:
    north = gompertz_panel(people=3e5, seed=1)
    short = replace(gompertz_panel(people=9e5, seed=2))
    short = replace(short, deaths=np.minimum(short.deaths, north.deaths - 1).clip(0))
    edition(
        session,
        {"north.f.2014": north, "isle.f.2014": short},
        parents={"north": "isle"},
        delivered=("isle",),
    )
    found = asked(session, "north.f.2014", "isle.f.2014")
    assert (found.kind, found.no_rest) == ("plain", True)
    assert found.overlap is not None


def test_a_whole_of_one_part_leaves_nobody(session: Session) -> None:
    edition(
        session, {"north.f.2014": gompertz_panel(people=3e5, seed=1)}, parents={"north": "isle"}
    )
    found = asked(session, "north.f.2014", "isle.f.2014")
    assert found.difference["e0"].reason == Reason.TOO_FEW_PERSON_YEARS


def loaded(panel: Panel, **more: object) -> Loaded:
    return Loaded(panel, "final", **more)  # type: ignore[arg-type]


def test_where_either_is_withheld_the_rest_is() -> None:
    """What stands in is all that is subtracted, and never leaves less than nothing."""
    whole, part = gompertz_panel(people=9e5, seed=1), gompertz_panel(people=2e5, seed=2)
    at = FIVE.position(25)
    more = np.where(np.arange(len(FIVE)) == at, whole.deaths + 3, part.deaths)
    of = Rest(PopulationYear("isle", "f", "2014"), "north")
    found = rest(
        of,
        {
            of.whole: loaded(whole, withheld=frozenset({80}), protected=True),
            of.part: loaded(replace(part, deaths=more), withheld=frozenset({25}), protected=True),
        },
    )
    assert found is not None
    assert found.withheld == {25, 80}
    assert found.protected
    assert found.panel.deaths[at] == 0
    others = np.arange(len(FIVE)) != at
    assert_array_equal(found.panel.deaths[others], (whole.deaths - part.deaths)[others])


def test_of_different_ages_the_rest_is_on_those_they_share() -> None:
    whole, part = gompertz_panel(people=9e5, seed=1), gompertz_panel(people=2e5, seed=2)
    short = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])
    of = Rest(PopulationYear("isle", "f", "2014"), "north")
    found = rest(of, {of.whole: loaded(whole), of.part: loaded(part.regroup(short))})
    assert found is not None
    assert found.panel.grid == short
    assert_allclose(found.panel.deaths.sum(), whole.deaths.sum() - part.deaths.sum())


def test_deaths_counted_of_both_are_subtracted_too() -> None:
    whole, part = gompertz_panel(people=9e5, seed=1), gompertz_panel(people=2e5, seed=2)
    counted = [replace(one, counted=np.floor(0.9 * one.deaths)) for one in (whole, part)]
    of = Rest(PopulationYear("isle", "f", "2014"), "north")
    found = rest(of, {of.whole: loaded(counted[0]), of.part: loaded(counted[1])})
    assert found is not None
    assert found.panel.counted is not None
    assert_array_equal(found.panel.counted, counted[0].counts - counted[1].counts)


def test_causes_of_the_rest_err_with_their_ratios_and_are_withheld_where_either_is() -> None:
    whole, part = gompertz_panel(people=9e5, seed=1), gompertz_panel(people=2e5, seed=2)
    short = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])
    hidden = np.zeros((2, 3, len(FIVE)), bool)
    hidden[0, 0, FIVE.position(90)] = hidden[1, 2, FIVE.position(5)] = True
    shifts = np.arange(1.0, 3 * len(FIVE) + 1).reshape(1, 3, -1)

    def side(panel: Panel, moved: Array, gone: NDArray[np.bool_]) -> Loaded:
        counts = parted(panel, 3)
        return loaded(
            panel, causes=Causes(cause_list(3), counts, shifts=moved, withheld=gone), protected=True
        )

    of = Rest(PopulationYear("isle", "f", "2014"), "north")
    coarse = side(part, 0.25 * shifts, hidden[1])
    assert coarse.causes is not None
    gone = hidden[1][:, : len(short)]
    coarse = replace(
        coarse,
        panel=part.regroup(short),
        causes=replace(
            coarse.causes,
            counts=coarse.causes.counts.regroup(FIVE, short),
            shifts=FIVE.regroup(0.25 * shifts, short),
            withheld=gone,
        ),
    )
    found = rest(of, {of.whole: side(whole, shifts, hidden[0]), of.part: coarse})
    assert found is not None
    assert found.causes is not None
    assert found.causes.shifts is not None
    assert found.causes.withheld is not None
    assert_allclose(found.causes.shifts, FIVE.regroup(0.75 * shifts, short))
    assert {(int(at), int(age)) for at, age in np.argwhere(found.causes.withheld)} == {
        (0, short.position(85)),
        (2, short.position(5)),
    }
