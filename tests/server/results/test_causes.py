"""Deaths by cause beside panels: every choice adds up, and moves what it says."""

from collections.abc import Callable, Mapping
from contextlib import AbstractContextManager
from dataclasses import replace
from itertools import product

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal
from sqlalchemy.orm import Session

from engine.ages import AgeGrid
from engine.causes.reassigned import spread
from server.results.causes import NOT_STATED, CauseChoice, Causes, Listed
from server.results.keys import BadValue, Keys, PopulationYear
from server.results.loading import Beside, Loaded, Shared, assembled, load
from server.store.records import Break, Cause, Key, Vector
from tests.factories import edition, gompertz_panel

Counting = Callable[[], AbstractContextManager[list[str]]]
LIST = (
    Cause("body", "Of the body"),
    Cause("heart", "Heart", "body"),
    Cause("lungs", "Lungs", "body"),
    Cause("vague", "Vague", kind="ill_defined"),
    Cause("signs", "Signs", "vague", kind="ill_defined"),
    Cause("open", "Still open", "vague", kind="pending"),
    Cause("falls", "Falls", kind="external"),
    Cause("intent", "Intent not known", kind="undetermined"),
)
LEAVES = ("heart", "lungs", "signs", "open", "falls", "intent")
GRID, COARSE = AgeGrid((0, 1, 5, 10)), AgeGrid((0, 5, 10))
CHOICES = [CauseChoice(*values) for values in product(*CauseChoice.VALUES.values())]
GROUPS = CauseChoice()
CODING = (
    Break("", "2003", "coding", "heart", ratio=1.25, ratio_error=0.05),
    Break("a", "2002", "coding", "lungs", ratio=0.5, ratio_error=0.1),
    Break("b", "2003", "coding", "falls", ratio=2.0, ratio_error=0.1),
)
Counts = Mapping[str, np.ndarray]


def counts(seed: int, *lacking: str, most: int = 30) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(seed)
    return {code: rng.integers(0, most, 4).astype(float) for code in LEAVES if code not in lacking}


def cells(
    where: str,
    causes: Counts,
    *,
    unstated: float = 0.0,
    status: str = "final",
    grid: AgeGrid = GRID,
) -> dict[Key, Vector]:
    place = where.split(".")
    total = sum(causes.values(), start=np.full(4, unstated))
    people = {Key(*place, "person_years"): 1000.0 + total, Key(*place, "deaths"): total}
    found = {key: Vector(status, GRID, values) for key, values in people.items()}
    return found | {
        Key(*place, "deaths", code): Vector(status, grid, GRID.regroup(values, grid))
        for code, values in causes.items()
    }


def of(
    held: Mapping[Key, Vector], where: str, choice: CauseChoice = GROUPS, years: int = 1
) -> Loaded:
    one = PopulationYear.parse(where)
    beside = Beside(years, causes=choice)
    return assembled(dict(held), [one], beside, Listed(LIST, CODING))[one]


def causes_of(held: Mapping[Key, Vector], where: str, **choice: str) -> Causes:
    found = of(held, where, CauseChoice(**choice)).causes
    assert found is not None
    return found


def ages(found: Causes, code: str) -> list[float]:
    at = [cause.code for cause in found.list].index(code)
    return found.counts.deaths[at].tolist()


def test_groups_are_the_tops_of_the_list_and_the_sums_of_their_causes() -> None:
    held, own = cells("a.f.2004", counts(1)), counts(1)
    groups, causes = causes_of(held, "a.f.2004"), causes_of(held, "a.f.2004", level="causes")
    assert [cause.code for cause in groups.list] == ["body", "vague", "falls", "intent"]
    assert [cause.code for cause in causes.list] == list(LEAVES)
    assert ages(groups, "body") == (own["heart"] + own["lungs"]).tolist()
    assert ages(groups, "vague") == (own["signs"] + own["open"]).tolist()
    assert [ages(causes, code) for code in LEAVES] == [own[code].tolist() for code in LEAVES]
    assert causes.counts.counted is None


@given(
    choice=st.sampled_from(CHOICES),
    seed=st.integers(0, 2**16),
    lacking=st.sets(st.sampled_from(LEAVES), max_size=5),
    unstated=st.integers(0, 3),
    years=st.sampled_from((1, 2)),
    grid=st.sampled_from((GRID, COARSE)),
    status=st.sampled_from(("final", "provisional")),
)
def test_causes_add_up_to_all_deaths_at_every_age(
    choice: CauseChoice,
    seed: int,
    lacking: set[str],
    unstated: int,
    years: int,
    grid: AgeGrid,
    status: str,
) -> None:
    held: dict[Key, Vector] = {}
    for at, where in enumerate(("a.f.2001", "a.m.2001", "a.f.2002", "a.m.2002")):
        own = counts(seed + at, *lacking, most=6)
        held |= cells(where, own, unstated=unstated, grid=grid, status=status)
    for where in ("a.f.2002", "a.p.2002"):
        found = of(held, where, choice, years)
        assert found.causes is not None
        assert found.panel.grid == grid
        summed = found.causes.counts.deaths.sum(axis=-2)
        assert_allclose(summed, found.panel.deaths, rtol=1e-12)
        assert (found.causes.list[-1] == NOT_STATED) == (unstated > 0)
        if found.causes.counts.counted is not None:
            assert_allclose(found.causes.counts.counted.sum(axis=-2), found.panel.deaths)


def test_what_is_not_said_of_a_cause_is_a_row_of_its_own_and_never_spread() -> None:
    held = cells("a.f.2004", counts(2), unstated=3.0)
    for choice in (CauseChoice(), CauseChoice("causes", "spread", "spread", "applied")):
        found = of(held, "a.f.2004", choice).causes
        assert found is not None
        assert found.list[-1] == NOT_STATED
        assert found.counts.deaths[-1].tolist() == [3.0] * 4
    assert found.of_kind["not-stated"] == 12.0


def test_all_population_years_of_one_question_have_the_same_rows() -> None:
    held = cells("a.f.2004", counts(2), unstated=3.0) | cells("a.f.2005", counts(3))
    asked = [PopulationYear("a", "f", period) for period in ("2004", "2005")]
    found = assembled(held, asked, Beside(causes=CauseChoice()), Listed(LIST))
    several = [found[one].causes for one in asked]
    assert several[0] is not None
    assert several[1] is not None
    assert several[0].list == several[1].list
    assert several[1].counts.deaths[-1].tolist() == [0.0] * 4


def test_ill_defined_deaths_go_to_natural_causes_and_are_counted_where_they_were() -> None:
    own = counts(4)
    found = causes_of(cells("a.f.2004", own), "a.f.2004", level="causes", ill_defined="spread")
    vague = own["signs"] + own["open"]
    whole = own["heart"] + own["lungs"]
    assert_allclose(ages(found, "heart"), own["heart"] * (1 + vague / whole))
    assert ages(found, "signs") == ages(found, "open") == [0.0] * 4
    assert ages(found, "falls") == own["falls"].tolist()
    assert found.counts.counted is not None
    assert_array_equal(found.counts.counted, np.stack([own[code] for code in LEAVES]))


def test_what_is_pending_waits_while_a_year_is_provisional() -> None:
    own = counts(5)
    held = cells("a.f.2004", own, status="provisional") | cells("a.f.2003", counts(6))
    found = causes_of(held, "a.f.2004", level="causes", ill_defined="spread")
    assert ages(found, "open") == own["open"].tolist()
    assert ages(found, "signs") == [0.0] * 4
    pooled = of(held, "a.f.2004", CauseChoice("causes", "spread"), 2).causes
    assert pooled is not None
    assert ages(pooled, "open") == own["open"].tolist()  # those of the final year are spread


def test_undetermined_intent_has_a_choice_of_its_own() -> None:
    own = counts(7)
    found = causes_of(cells("a.f.2004", own), "a.f.2004", level="causes", undetermined="spread")
    assert_allclose(ages(found, "falls"), own["falls"] + own["intent"])
    assert ages(found, "signs") == own["signs"].tolist()


def test_persons_are_spread_within_each_sex() -> None:
    women, men = counts(8), counts(9)
    held = cells("a.f.2004", women) | cells("a.m.2004", men)
    together = {code: women[code] + men[code] for code in LEAVES}
    persons = cells("a.p.2004", together)
    choice = CauseChoice("causes", "spread", "spread")
    by_sex = [of(held, f"a.{sex}.2004", choice).causes for sex in "fm"]
    for stored in (held, held | persons):
        found = of(stored, "a.p.2004", choice).causes
        assert found is not None
        expected = sum(one.counts.deaths for one in by_sex if one)
        assert_allclose(found.counts.deaths, expected)
    plain = {key: cell for key, cell in persons.items() if not key.cause}
    assert of(held | plain, "a.p.2004", choice).causes is None
    alone = of(persons, "a.p.2004", choice).causes
    assert alone is not None
    natural, vague = np.isin(LEAVES, ("heart", "lungs")), np.isin(LEAVES, ("signs", "open"))
    deaths = np.stack(list(together.values()))
    expected = spread(deaths, vague, natural)
    expected = spread(expected, np.isin(LEAVES, ("intent",)), np.isin(LEAVES, ("falls",)))
    assert_allclose(alone.counts.deaths, expected)


# ---- comparability ------------------------------------------------------------------------------


def test_ratios_make_earlier_years_comparable() -> None:
    own = counts(10)
    choice = CauseChoice("causes", ratios="applied")
    held: dict[Key, Vector] = {}
    for year in (2001, 2002, 2003):
        held |= cells(f"a.f.{year}", own) | cells(f"b.f.{year}", own)

    def times(where: str) -> dict[str, float]:
        found = of(held, where, choice).causes
        assert found is not None
        return {code: ages(found, code)[3] / own[code][3] for code in ("heart", "lungs", "falls")}

    assert times("a.f.2003") == {"heart": 1.0, "lungs": 1.0, "falls": 1.0}
    assert_allclose([times("a.f.2002")[one] for one in ("heart", "lungs")], [1.25, times_others()])
    first = times("a.f.2001")
    assert_allclose([first["heart"], first["lungs"]], [1.25, 0.5])
    assert times("b.f.2002")["falls"] == pytest.approx(2.0)


def times_others() -> float:
    """What is left of the causes without a ratio in 2002, at the last age."""
    own = counts(10)
    others = sum(own[code][3] for code in LEAVES if code != "heart")
    return float((others - 0.25 * own["heart"][3]) / others)


def test_a_ratio_of_a_group_is_that_of_each_of_its_causes_and_of_another_list_is_none() -> None:
    own = counts(11)
    said = tuple(Break("", "2003", "coding", of, ratio=0.5) for of in ("body", "I20-I25"))
    one = PopulationYear("a", "f", "2001")
    beside = Beside(causes=CauseChoice("causes", ratios="applied"))
    found = assembled(cells("a.f.2001", own), [one], beside, Listed(LIST, said))[one].causes
    assert found is not None
    assert found.ratios == said[:1]
    for code in ("heart", "lungs"):
        assert_allclose(ages(found, code), 0.5 * own[code])
    middle = (Cause("all", "All"), *(replace(one, parent=one.parent or "all") for one in LIST))
    deep = assembled(cells("a.f.2001", own), [one], beside, Listed(middle, said))[one].causes
    assert deep is not None
    assert_array_equal(deep.counts.deaths, found.counts.deaths)


def test_the_error_of_a_ratio_is_what_a_higher_one_moves() -> None:
    own = counts(12)
    held = cells("a.f.2001", own) | cells("a.f.2002", own)
    found = of(held, "a.f.2002", CauseChoice("causes", ratios="applied"), 2).causes
    assert found is not None
    assert found.ratios == CODING
    assert found.shifts is not None
    assert found.shifts.shape == (3, len(LEAVES), 4)
    assert_allclose(found.shifts.sum(axis=-2), 0.0, atol=1e-12)
    assert_allclose(found.shifts[0, 0], 2 * 0.05 * own["heart"], atol=1e-12)  # both years
    assert_allclose(found.shifts[1, 1], 0.1 * own["lungs"], atol=1e-12)  # the earlier one
    assert_array_equal(found.shifts[2], 0.0)  # of another area


# ---- where there are none -----------------------------------------------------------------------


def test_without_causes_in_every_year_there_are_none() -> None:
    plain = {key: cell for key, cell in cells("a.f.2001", counts(1)).items() if not key.cause}
    held = plain | cells("a.f.2002", counts(2))
    assert of(held, "a.f.2002").causes is not None
    assert of(held, "a.f.2001").causes is None
    pooled = of(held, "a.f.2002", years=2)
    assert pooled.causes is None
    assert pooled.panel.grid == GRID


def test_deaths_as_counted_are_those_of_the_cause() -> None:
    own = counts(3)
    held = cells("a.f.2001", own)
    for key in [key for key in held if key.measure == "deaths"]:
        counted = replace(held[key], values=held[key].values - 0.25)
        held[key._replace(measure="counted_deaths")] = counted
    found = of(held, "a.f.2001", CauseChoice("causes"))
    assert found.causes is not None
    assert found.causes.counts.counted is not None
    assert_allclose(found.causes.counts.counted[0], own["heart"] - 0.25)
    assert_allclose(found.causes.counts.deaths[0], own["heart"])


def test_what_stands_in_for_a_withheld_cause_is_marked_in_every_sum() -> None:
    held = cells("a.f.2001", counts(1)) | cells("a.f.2002", counts(2), grid=COARSE)
    key = Key("a", "f", "2001", "deaths", "lungs")
    held[key] = replace(held[key], withheld=(1,))
    alone = of(held, "a.f.2001", CauseChoice("causes"))
    assert alone.causes is not None
    assert alone.causes.withheld is not None
    assert np.argwhere(alone.causes.withheld).tolist() == [[1, 1]]
    pooled = of(held, "a.f.2002", years=2)
    assert pooled.causes is not None
    assert pooled.causes.withheld is not None
    assert np.argwhere(pooled.causes.withheld).tolist() == [[0, 0]]
    assert alone.protected
    assert pooled.protected
    free = of(held, "a.f.2002")
    assert free.causes is not None
    assert free.causes.withheld is None
    assert not free.protected


# ---- from the store -----------------------------------------------------------------------------


def held_in(session: Session, *breaks: Break) -> list[PopulationYear]:
    """Two areas of five years by cause."""
    panels, by_cause = {}, {}
    for at, (area, sex, year) in enumerate(product("ab", "fm", range(2001, 2006))):
        panel = gompertz_panel(sex=sex, seed=at)
        name = f"{area}.{sex}.{year}"
        panels[name] = panel
        parts = np.random.default_rng(at).multinomial(panel.deaths.astype(int), [1 / 6] * 6)
        by_cause[name] = dict(zip(LEAVES, parts.T.astype(float), strict=True))
    edition(session, panels, causes=LIST, by_cause=by_cause, breaks=breaks)
    return [PopulationYear.parse(name) for name in panels]


def test_a_trend_by_cause_is_read_in_one_statement_beside_its_list(
    session: Session, count_statements: Counting
) -> None:
    asked = held_in(session, *CODING)
    for choice, expected in ((CauseChoice(), 2), (CauseChoice("causes", ratios="applied"), 3)):
        for several in (asked[:1], asked):
            with count_statements() as statements:
                found = load(session, "isle", 1, several, Beside(causes=choice))
            assert len(statements) == expected
            assert all(one.causes for one in found.values())
    with count_statements() as statements:
        found = load(session, "isle", 1, asked)
    assert len(statements) == 1
    assert not any(one.causes for one in found.values())


def test_one_alone_is_what_it_is_among_others(session: Session) -> None:
    asked = held_in(session, *CODING)
    beside = Beside(2, causes=CauseChoice("causes", "spread", "spread", "applied"))
    shared = Shared("a", "f", ("2003", "2004"))
    together = load(session, "isle", 1, [*asked, shared], beside)
    for one in (asked[3], asked[7], shared):
        alone = load(session, "isle", 1, [one], beside)[one].causes
        among = together[one].causes
        assert alone is not None
        assert among is not None
        assert_array_equal(alone.counts.deaths, among.counts.deaths)


def test_an_edition_without_a_list_has_no_causes(session: Session) -> None:
    edition(session, {"a.f.2001": gompertz_panel()})
    asked = PopulationYear("a", "f", "2001")
    found = load(session, "isle", 1, [asked], Beside(causes=CauseChoice()))
    assert found[asked].causes is None


# ---- the keys of an address ---------------------------------------------------------------------


def test_a_choice_is_read_from_its_keys_and_spelled_in_their_order() -> None:
    def read(**items: str) -> CauseChoice | None:
        return Keys(items.items(), once=tuple(CauseChoice.VALUES)).causes()

    assert read() is None
    assert read(ratios="applied") == CauseChoice(ratios="applied")
    for choice in CHOICES:
        assert read(**dict(choice.pairs)) == choice
    assert [key for key, _ in CauseChoice().pairs] == [
        "causes",
        "ill_defined",
        "undetermined",
        "ratios",
    ]
    with pytest.raises(BadValue, match="“causes” has the value “tops”; it can be groups, causes"):
        read(causes="tops")


def test_an_address_spells_a_choice_where_there_are_causes() -> None:
    chosen = CauseChoice("causes")
    assert CauseChoice.spelled(chosen, held=True) == chosen
    assert CauseChoice.spelled(None, held=True) == CauseChoice()
    assert CauseChoice.spelled(chosen, held=False) is None
