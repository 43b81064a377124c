"""From an edition to panels."""

from collections.abc import Callable
from contextlib import AbstractContextManager
from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_array_equal

from engine.ages import AgeGrid
from engine.panel import Panel
from server.results.holdings import NotInEdition, holdings
from server.results.loading import Beside, Shared, assembled, load, overlap, shared_part
from server.results.questions import PopulationYear
from server.store.connect import Session
from server.store.records import Area, Key
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
    expected = None
    if both is not None:
        shared = of(both)
        expected = Shared(shared.area, shared.sex, (shared.period,))
    assert overlap(of(this), of(that), TREE) == expected
    assert overlap(of(that), of(this), TREE) == expected


def test_no_more_deaths_are_shared_than_either_counts(isle: Session) -> None:
    whole, part = of("isle.f.2014"), of("north.f.2014")
    loaded = load(isle, "isle", 1, [whole, part])
    inner, outer = loaded[part].panel.regroup(SHORT), loaded[whole].panel
    assert_array_equal(shared_part(loaded[part].panel, outer, inner).deaths, inner.deaths)
    fewer = gompertz_panel(people=1_000).regroup(SHORT)
    assert_array_equal(shared_part(loaded[part].panel, fewer, inner).deaths, fewer.deaths)


@pytest.mark.parametrize(
    ("years", "this", "that", "both"),
    [
        (3, "2014", "2012", ("2012",)),
        (3, "2014", "2013", ("2012", "2013")),
        (3, "2014", "2011", None),
        (5, "2014", "2014", ("2010", "2011", "2012", "2013", "2014")),
    ],
)
def test_pooled_years_overlap_in_those_that_both_pool(
    years: int, this: str, that: str, both: tuple[str, ...] | None
) -> None:
    expected = None if both is None else Shared("north", "f", both)
    assert overlap(of(f"north.f.{this}"), of(f"isle.p.{that}"), TREE, years) == expected


def test_pooled_years_are_sums_and_a_year_that_is_lacking_leaves_them_out(isle: Session) -> None:
    wanted = [of(f"north.{sex}.{year}") for sex in "fmp" for year in ("2013", "2014")]
    single = load(isle, "isle", 1, wanted)
    pooled = load(isle, "isle", 1, wanted, Beside(years=2))
    assert {one.code for one in pooled} == {f"north.{sex}.2014" for sex in "fmp"}  # type: ignore[union-attr]
    for sex in "fmp":
        first, last = (single[of(f"north.{sex}.{year}")].panel for year in ("2013", "2014"))
        together = pooled[of(f"north.{sex}.2014")]
        assert_array_equal(together.panel.deaths, first.deaths + last.deaths)
        assert_array_equal(together.panel.exposure, first.exposure + last.exposure)
        assert together.status == "provisional"
    women, men = (pooled[of(f"north.{sex}.2014")].panel for sex in "fm")
    persons = pooled[of("north.p.2014")].panel
    assert_array_equal(persons.infant_weight, Panel.persons(women, men).infant_weight)
    shared = load(isle, "isle", 1, [Shared("north", "m", ("2013", "2014"))], Beside(years=5))
    assert_array_equal(next(iter(shared.values())).panel.deaths, men.deaths)


def test_the_whole_and_the_standard_stand_beside_on_the_own_grid(isle: Session) -> None:
    north, south, standard = of("north.m.2014"), of("south.m.2014"), of("north.p.2013")
    beside = Beside(parents={"north": "isle", "south": "isle"}, standard=standard)
    loaded = load(isle, "isle", 1, [north, south, of("isle.m.2014")], beside)
    whole = loaded[of("isle.m.2014")].panel
    assert whole.whole is None
    assert loaded[south].panel.whole is not None
    assert_array_equal(loaded[south].panel.whole.deaths, whole.deaths)
    assert loaded[north].panel.whole is None  # the whole ends at 85, the north at 100
    people = loaded[south].panel.standard
    assert people is not None
    plain = load(isle, "isle", 1, [standard])[standard].panel
    assert_array_equal(people.exposure, plain.regroup(SHORT).exposure)


def test_births_are_loaded_as_handed_in_and_persons_have_both_sexes(session: Session) -> None:
    women, men = (
        replace(gompertz_panel(sex=sex), births=births)
        for sex, births in (
            ("f", np.array([900.0, 4.0, 3.0])),
            ("m", np.array([1000.0, np.nan, 2.0])),
        )
    )
    edition(session, {"north.f.2014": women, "north.m.2014": men})
    loaded = load(session, "isle", 1, [of(f"north.{sex}.2014") for sex in "fmp"])
    for sex, expected in (("f", women.births), ("m", men.births)):
        assert_array_equal(loaded[of(f"north.{sex}.2014")].panel.births, expected)
    assert_array_equal(loaded[of("north.p.2014")].panel.births, [1900.0, np.nan, 5.0])


def test_deaths_as_counted_come_with_the_deaths(session: Session) -> None:
    stored_collection(session)
    handed = cells("ab", sexes="fm", years=(2000, 2001))
    women = Key("a", "f", "2001", "deaths")
    vector = handed[women]
    counted = replace(vector, values=vector.values / 2)
    handed[women._replace(measure="counted_deaths")] = counted
    stored_edition(session, handed)
    found = load(session, "saltmarsh", 1, [of("a.f.2001"), of("a.m.2001"), of("a.p.2001")])
    panel = found[of("a.f.2001")].panel
    assert_array_equal(panel.counts, vector.values / 2)
    assert_array_equal(panel.worth, np.full(4, 2.0))
    assert found[of("a.m.2001")].panel.counted is None
    men = handed[women._replace(sex="m")].values
    assert_array_equal(found[of("a.p.2001")].panel.counts, vector.values / 2 + men)
    two = Beside(years=2)
    pooled = load(session, "saltmarsh", 1, [of("a.f.2001")], two)[of("a.f.2001")].panel
    before = handed[women._replace(period="2000")].values
    assert_array_equal(pooled.counts, vector.values / 2 + before)


def test_no_more_counted_deaths_are_shared_than_either_side_has() -> None:
    side = gompertz_panel(people=1e6)
    fewer = replace(side, counted=side.deaths / 2)
    both = shared_part(side, fewer, side)
    assert_array_equal(both.counts, side.deaths / 2)
    assert_array_equal(both.deaths, side.deaths)
    assert shared_part(side, side, side).counted is None


def test_of_a_withheld_group_no_counted_deaths_are_told() -> None:
    handed = cells("a", sexes="f")
    deaths, people = handed
    hidden = replace(handed[deaths], withheld=(1,))
    known = replace(handed[deaths], values=handed[deaths].values / 2)
    counted = deaths._replace(measure="counted_deaths")
    found = assembled(
        {deaths: hidden, people: handed[people], counted: known}, [of("a.f.2001")], Beside()
    )
    told = handed[deaths].values * np.array([0.5, 1.0, 0.5, 0.5])
    assert_array_equal(found[of("a.f.2001")].panel.counts, told)
