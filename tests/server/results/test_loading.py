"""From an edition to panels."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import numpy as np
import pytest
from numpy.testing import assert_array_equal

from engine.ages import AgeGrid
from engine.panel import Panel
from server.results.loading import NotInEdition, holdings, load, overlap, shared_part
from server.results.questions import PopulationYear
from server.store.connect import Session
from server.store.records import Area
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
TREE = (Area("isle", "Isle"), Area("north", "North", "isle"), Area("cape", "Cape", "north"))


def of(code: str) -> PopulationYear:
    return PopulationYear.parse(code)


@pytest.fixture
def isle(session: Session) -> Session:
    """Two parts and their whole; the south ends at 85+."""
    panels = {}
    for year in ("2013", "2014"):
        for seed, sex in enumerate("fm"):
            panels[f"north.{sex}.{year}"] = gompertz_panel(sex=sex, people=3e6, seed=seed)
            panels[f"south.{sex}.{year}"] = gompertz_panel(
                FIVE, sex=sex, people=3e6, seed=seed + 9
            ).regroup(SHORT)
    edition(session, panels, parents={"north": "isle", "south": "isle"}, provisional=("2014",))
    return session


def test_an_edition_says_what_it_holds(isle: Session) -> None:
    held = holdings(isle, "isle", 1)
    assert [area.code for area in held.areas] == ["isle", "north", "south"]
    assert (held.sexes, held.periods) == (("f", "m", "p"), ("2013", "2014"))
    assert held.status[of("isle.p.2014")] == "provisional"
    assert held.status[of("north.f.2013")] == "final"
    assert held.previous(of("north.f.2014")) == of("north.f.2013")
    assert held.previous(of("north.f.2013")) is None
    assert held.name("north") == "North"


def test_what_it_does_not_hold_is_refused_with_what_it_does(isle: Session) -> None:
    held = holdings(isle, "isle", 1)
    with pytest.raises(NotInEdition, match=r"does not hold north\.f\.1950.*2013 to 2014"):
        held.require(of("north.f.1950"))
    with pytest.raises(NotInEdition, match=r"no area east\. Its areas are isle, north and south"):
        held.require_area("east")


def test_persons_are_counted_whole_and_take_the_sexes_first_year(isle: Session) -> None:
    wanted = [of(f"north.{sex}.2014") for sex in "fmp"]
    women, men, persons = (load(isle, "isle", 1, wanted)[one].panel for one in wanted)
    together = Panel.persons(women, men)
    assert_array_equal(persons.deaths, women.deaths + men.deaths)
    assert_array_equal(persons.infant_weight, together.infant_weight)
    assert_array_equal(persons.infant_ratio, together.infant_ratio)
    assert not np.allclose(persons.infant_weight, 0.5)


def test_persons_whose_sexes_are_not_known_take_the_plain_mean(session: Session) -> None:
    edition(session, {"north.p.2014": gompertz_panel(sex="p")})
    loaded = load(session, "isle", 1, [of("north.p.2014")])[of("north.p.2014")]
    assert_array_equal(loaded.panel.infant_weight, [0.5, 0.5])


@pytest.mark.parametrize("measure", ["deaths", "person_years"])
@pytest.mark.parametrize("sex", ["f", "m"])
def test_what_is_provisional_in_part_is_provisional(
    session: Session, measure: str, sex: str
) -> None:
    """Persons, who are summed from the sexes here, too."""
    stored_collection(session)
    final = cells()
    changed = cells(sexes=sex, measures=(measure,), status="provisional")
    stored_edition(session, final | changed)
    wanted = [of(f"a.{one}.2001") for one in "fmp"]
    loaded = load(session, "saltmarsh", 1, wanted)
    status = {one.sex: loaded[one].status for one in wanted}
    assert status == {"f": "final", "m": "final"} | {sex: "provisional", "p": "provisional"}


def test_a_whole_is_on_the_grid_its_parts_share(isle: Session) -> None:
    loaded = load(isle, "isle", 1, [of("isle.f.2014"), of("north.f.2014")])
    assert loaded[of("isle.f.2014")].panel.grid == SHORT
    assert loaded[of("north.f.2014")].panel.grid == FIVE


def test_what_is_not_held_is_left_out(isle: Session) -> None:
    assert load(isle, "isle", 1, [of("north.f.1950")]) == {}


def test_one_statement_however_many_are_asked(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    counts = []
    for codes in (
        ["north.f.2014"],
        [
            f"{a}.{s}.{y}"
            for a in ("north", "south", "isle")
            for s in "fmp"
            for y in ("2013", "2014")
        ],
    ):
        with count_statements() as statements:
            load(isle, "isle", 1, map(of, codes))
        counts.append(len(statements))
    assert counts == [1, 1]


@pytest.mark.parametrize(
    ("this", "that", "both"),
    [
        ("north.f.2014", "north.m.2014", None),
        ("north.f.2014", "north.f.2013", None),
        ("north.f.2014", "south.f.2014", None),
        ("north.f.2014", "north.f.2014", "north.f.2014"),
        ("north.p.2014", "north.m.2014", "north.m.2014"),
        ("cape.f.2014", "isle.f.2014", "cape.f.2014"),
        ("isle.m.2014", "cape.p.2014", "cape.m.2014"),
        ("isle.p.2014", "north.p.2014", "north.p.2014"),
    ],
)
def test_the_overlap_of_two(this: str, that: str, both: str | None) -> None:
    expected = None if both is None else of(both)
    assert overlap(of(this), of(that), TREE) == expected
    assert overlap(of(that), of(this), TREE) == expected


def test_no_more_deaths_are_shared_than_either_counts(isle: Session) -> None:
    whole, part = of("isle.f.2014"), of("north.f.2014")
    loaded = load(isle, "isle", 1, [whole, part])
    inner, outer = loaded[part].panel.regroup(SHORT), loaded[whole].panel
    assert_array_equal(shared_part(loaded[part].panel, outer, inner).deaths, inner.deaths)
    fewer = gompertz_panel(people=1_000).regroup(SHORT)
    assert_array_equal(shared_part(loaded[part].panel, fewer, inner).deaths, fewer.deaths)
