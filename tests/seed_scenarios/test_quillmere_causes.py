"""The stories of the second collection are found by the product itself, through its results."""

import shutil
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
from sqlalchemy.orm import Session

from seed_scenarios import demonstration, quillmere, quillmere_causes
from seed_scenarios.quillmere_causes_counts import GAINED, LOST, MAINLAND, RECODED
from server.actions.rebuild_editions import rebuild_editions
from server.results.cause_parts import CauseParts
from server.results.causes import CauseChoice
from server.results.comparison import comparison
from server.results.loading import Beside, Loaded, load
from server.results.questions import ComparisonQuestion, PopulationYear
from server.store import areas, editions
from server.store.heading import heading
from tests.conftest import DEMONSTRATED, opened

CODE = quillmere_causes.CODE
FINE = CauseChoice("causes")
AFTER_CLOSING = {"overdose", "suicide", "liver-alcohol"}
OF_HEAT = {"heart-attack", "circulatory-other", "stroke", "lungs-chronic", "pneumonia"}


@pytest.fixture(scope="module")
def island(demonstration: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Session]:
    with opened(shutil.copytree(demonstration, tmp_path_factory.mktemp("causes") / "data")) as one:
        yield one


def explained(session: Session, this: str, that: str, **choices: str) -> tuple[CauseParts, float]:
    """Contributions to the difference in life expectancy by cause, and the difference."""
    sides = (PopulationYear.parse(one) for one in (this, that))
    question = ComparisonQuestion(*sides, causes=CauseChoice("causes", **choices))
    found = comparison(session, heading(session, CODE, 1), question).explained
    assert found.causes is not None
    return found.causes, found.contributions["e0"].difference


def by_code(parts: CauseParts) -> dict[str, float]:
    return dict(zip((one.code for one in parts.list), parts.by_cause.tolist(), strict=True))


def held(session: Session, *of: str, choice: CauseChoice = FINE) -> list[Loaded]:
    asked = [PopulationYear.parse(one) for one in of]
    found = load(session, CODE, 1, asked, Beside(causes=choice), figures="full")
    return [found[one] for one in asked]


def deaths(one: Loaded, code: str) -> float:
    assert one.causes is not None
    at = [cause.code for cause in one.causes.list].index(code)
    return float(one.causes.counts.deaths[at].sum())


def share(one: Loaded, code: str) -> float:
    return deaths(one, code) / float(one.panel.deaths.sum())


def test_the_deaths_are_those_of_the_first_collection(island: Session) -> None:
    regions = [region.code for region in MAINLAND]
    asked = [f"{code}.{sex}.2010" for code in regions for sex in "fmp"]
    first = load(
        island, quillmere.CODE, 3, [PopulationYear.parse(one) for one in asked], figures="full"
    )
    for one, here in zip(asked, held(island, *asked), strict=True):
        there = first[PopulationYear.parse(one)].panel
        assert here.causes is not None
        np.testing.assert_array_equal(here.panel.deaths, there.deaths)
        np.testing.assert_array_equal(here.panel.exposure, there.exposure)
        np.testing.assert_array_equal(here.causes.counts.deaths.sum(axis=0), here.panel.deaths)
    listed = {area.code: area.parent for area in areas.listing(island, CODE, 1)}
    assert listed == {**dict.fromkeys(regions, "mainland"), "mainland": ""}


def test_the_mainland_is_the_sum_of_its_regions_cause_by_cause(island: Session) -> None:
    (whole,) = held(island, "mainland.m.2015")
    parts = held(island, *(f"{region.code}.m.2015" for region in MAINLAND))
    assert whole.causes is not None
    for cause in whole.causes.list:
        assert deaths(whole, cause.code) == sum(deaths(part, cause.code) for part in parts)


@pytest.mark.parametrize("against", ["northlade.m.2017", "mainland.m.2017"])
def test_the_gap_of_the_men_of_tollbay_is_of_three_causes(island: Session, against: str) -> None:
    parts, difference = explained(island, "tollbay.m.2017", against)
    assert difference < -0.5
    worst = sorted(by_code(parts).items(), key=lambda item: item[1])[:3]
    assert {code for code, _ in worst} == AFTER_CLOSING
    beyond_chance = {
        one.code for one, high in zip(parts.list, parts.cause_high, strict=True) if high < 0
    }
    assert beyond_chance >= AFTER_CLOSING
    assert sum(value for _, value in worst) == pytest.approx(difference, rel=0.35)
    assert parts.by_group.sum() + parts.remainder == pytest.approx(parts.difference, abs=1e-9)


def test_it_lies_at_the_ages_of_work(island: Session) -> None:
    asked = ComparisonQuestion(
        PopulationYear("tollbay", "m", "2017"),
        PopulationYear("northlade", "m", "2017"),
        causes=FINE,
    )
    found = comparison(island, heading(island, CODE, 1), asked)
    parts, starts = found.explained.causes, np.array(found.groups.starts)
    assert parts is not None
    rows = [at for at, one in enumerate(parts.list) if one.code in AFTER_CLOSING]
    by_age = parts.by_group[rows].sum(axis=0)
    working = (starts >= 25) & (starts < 65)
    assert by_age[working].sum() == pytest.approx(by_age.sum(), rel=0.1)
    assert by_age.argmin() in np.flatnonzero(working)


def test_before_the_closing_and_among_women_there_is_no_such_gap(island: Session) -> None:
    for this, that in (
        ("tollbay.m.2007", "northlade.m.2007"),
        ("tollbay.f.2017", "northlade.f.2017"),
    ):
        found = by_code(explained(island, this, that)[0])
        assert abs(sum(found[code] for code in AFTER_CLOSING)) < 0.25, this


def test_the_hot_summer_took_the_old_by_heart_and_lungs(island: Session) -> None:
    parts, difference = explained(island, "elderwick.p.2018", "elderwick.p.2017")
    assert difference < -0.3
    found = by_code(parts)
    assert sum(found[code] for code in OF_HEAT) < 0.7 * difference
    assert min(found, key=lambda code: found[code]) in OF_HEAT


def test_ill_defined_causes_fade_and_the_last_year_waits(island: Session) -> None:
    first, last = held(island, "mainland.p.1999", "mainland.p.2023")
    assert share(first, "ill-defined") == pytest.approx(0.09, abs=0.006)
    assert share(last, "ill-defined") == pytest.approx(0.03, abs=0.004)
    assert (first.status, last.status) == ("final", "provisional")
    assert deaths(first, "pending") == 0 < share(last, "pending")
    spread = CauseChoice("causes", "spread")
    plain, dealt = (held(island, "mainland.p.2023", choice=choice)[0] for choice in (FINE, spread))
    assert deaths(dealt, "ill-defined") == 0
    assert deaths(dealt, "pending") == deaths(plain, "pending")  # shown, never spread
    assert deaths(dealt, "suicide") == deaths(plain, "suicide")  # they go to natural causes
    assert deaths(dealt, "stroke") > deaths(plain, "stroke")


def test_a_comparison_across_the_new_coding_says_less_once_ratios_are_applied(
    island: Session,
) -> None:
    def between(ratios: str) -> dict[str, float]:
        sides = (f"mainland.f.{RECODED}", f"mainland.f.{RECODED - 1}")
        return by_code(explained(island, *sides, ratios=ratios)[0])

    kept, applied = between("kept"), between("applied")
    assert kept[LOST] > 0 > kept[GAINED]
    for code in (LOST, GAINED):
        assert abs(applied[code]) < 0.5 * abs(kept[code])


def test_it_is_made_again_from_its_files(island: Session) -> None:
    (rebuilt,) = rebuild_editions(island, collection=CODE, by=quillmere.OFFICE)
    assert rebuilt.same


def test_what_is_there_is_not_loaded_again(session: Session) -> None:
    demonstration.build(session, now=DEMONSTRATED, there=[quillmere.CODE])
    assert [one.number for one in editions.listing(session, CODE)] == [1]
    assert demonstration.lacking([quillmere.CODE, CODE]) == ()
    assert demonstration.lacking([CODE]) == (quillmere.CODE,)
    demonstration.build(session, now=DEMONSTRATED, there=[quillmere.CODE, CODE])
    assert [one.number for one in editions.listing(session, CODE)] == [1]
