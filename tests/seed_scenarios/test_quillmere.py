"""The stories planted in the demonstration collection are found by the product itself."""

import datetime as dt
import itertools
import shutil
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
from sqlalchemy.orm import Session

from engine.estimates import Estimate, Reason
from seed_scenarios import quillmere
from seed_scenarios.quillmere_counts import REGIONS, WHOLE, counted
from server.actions.rebuild_editions import rebuild_editions
from server.pages import population_year
from server.results.loading import load
from server.results.questions import PopulationYear, PopulationYearQuestion, TrendQuestion
from server.results.series import series
from server.sentences.pieces import plain
from server.store import areas, editions, schedules
from server.store.heading import heading
from tests.conftest import POSTGRESQL, opened

NOW = dt.datetime(2026, 12, 1, 9, tzinfo=dt.UTC)
YEARS = range(1999, 2024)


@pytest.fixture(scope="module")
def island(demonstration: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Session]:
    with opened(shutil.copytree(demonstration, tmp_path_factory.mktemp("island") / "data")) as one:
        yield one


def trend(
    session: Session,
    area: str,
    sex: str,
    of: str = "e0",
    settings: str = "almanac-1",
    number: int = 2,
) -> Estimate:
    """One indicator of one area and sex in edition 2 or another, [year] from 1999."""
    asked = [("of", of), ("area", area), ("sex", sex), ("settings", settings), ("figures", "full")]
    question = TrendQuestion.parse([*asked, ("from", "1999"), ("to", "2023")])
    return series(session, heading(session, quillmere.CODE, number), question).estimate[0]


def in_year(figures: Estimate, year: int) -> float:
    return float(figures.value[year - 1999])


def gain(figures: Estimate, first: int, last: int) -> float:
    """From the three years that end with the first to the three that end with the last."""
    before, after = (figures.value[year - 2001 : year - 1998].mean() for year in (first, last))
    return float(after - before)


def test_three_editions_with_their_notes(island: Session) -> None:
    third, second, first = editions.listing(island, quillmere.CODE)
    assert (first.number, second.number, second.base, third.base) == (1, 2, 1, 2)
    assert first.note.startswith("First delivery")
    assert second.note == "Revision of 2021 in Northlade: deaths under inquest, left out at first."
    assert third.note == "Population from 2012 on after the census of 2021; deaths as they stood."
    assert first.basis.vintage == second.basis.vintage != third.basis.vintage


def test_the_districts_of_tollbay_are_added_up_to_what_it_has(island: Session) -> None:
    held = {area.code for area in areas.listing(island, quillmere.CODE, 1)}
    assert held == {*(region.code for region in REGIONS), WHOLE.code}
    asked = [PopulationYear("tollbay", sex, str(year)) for sex in "fm" for year in YEARS]
    found = load(island, quillmere.CODE, 1, asked, figures="full")
    told = counted(revised=False)["tollbay"]
    for one in asked:
        at = (int(one.period) - 1999, "fm".index(one.sex))
        assert np.array_equal(found[one].panel.deaths, told.deaths[at])
        assert np.array_equal(found[one].panel.exposure, told.population[at])


def test_the_census_moves_the_population_and_no_death(island: Session) -> None:
    asked = [PopulationYear(WHOLE.code, "f", str(year)) for year in YEARS]
    before, after = (
        load(island, quillmere.CODE, number, asked, figures="full") for number in (2, 3)
    )
    for one in asked:
        assert np.array_equal(before[one].panel.deaths, after[one].panel.deaths)
        fewer = after[one].panel.exposure.sum() < before[one].panel.exposure.sum()
        assert fewer == (one.period >= "2012")
        assert after[one].status == before[one].status
    shorter = trend(island, WHOLE.code, "f").value - trend(island, WHOLE.code, "f", number=3).value
    assert np.all(shorter[:13] == 0)
    assert 0.05 < shorter[13] < shorter[-1] < 0.5


def test_the_trend_stops_at_the_census_and_measures_nothing_from_the_hot_summer(
    island: Session,
) -> None:
    asked = [("of", "e0"), ("area", WHOLE.code), ("sex", "f"), ("from", "1999"), ("to", "2018")]
    found = series(island, heading(island, quillmere.CODE, 3), TrendQuestion.parse(asked))
    assert found.ends == (("2012", "2017"),)
    (earlier,) = found.before
    assert earlier.run.ends == ("1999", "2011")
    assert [(one.period, one.kind) for one in found.broken] == [
        ("2012", "population"),
        ("2018", "shock"),
    ]
    assert not series(island, heading(island, quillmere.CODE, 2), TrendQuestion.parse(asked)).broken


def test_every_edition_is_made_again_from_its_files(island: Session) -> None:
    rebuilt = rebuild_editions(island, collection=quillmere.CODE, by=quillmere.OFFICE)
    assert [one.same for one in rebuilt] == [True, True, True]


def test_births_stand_beside_the_basis(island: Session) -> None:
    """Persons are the girls and boys of the table handed in, printed where the counts are told."""
    counts = {}
    for sex in "fmp":
        question = PopulationYearQuestion(PopulationYear("quillmere", sex, "2010"))
        page = population_year.build(island, heading(island, quillmere.CODE, 2), question)
        said = plain(page.basis[-1])
        assert "in Quillmere in 2010: " in said
        counts[sex] = int(said.rpartition(": ")[2].strip(".").replace(",", ""))
    assert counts["p"] == counts["f"] + counts["m"] > 1_000


@pytest.mark.parametrize("db_url", [POSTGRESQL], indirect=True)
def test_building_again_on_another_database_gives_the_same_editions(
    island: Session, session: Session
) -> None:
    quillmere.build(session, now=NOW)
    digests = [edition.digest for edition in editions.listing(session, quillmere.CODE)]
    assert digests == [edition.digest for edition in editions.listing(island, quillmere.CODE)]
    assert len(set(digests)) == 3


def test_only_2023_is_provisional(island: Session) -> None:
    status = schedules.contents(island, quillmere.CODE, 2).status
    assert len(status) == 7 * 3 * 25
    assert {period for (_, _, period), word in status.items() if word == "provisional"} == {"2023"}


def test_the_whole_and_persons_are_sums(island: Session) -> None:
    codes = [*(region.code for region in REGIONS), WHOLE.code]
    asked = [PopulationYear(code, sex, "2012") for code in codes for sex in ("f", "m", "p")]
    held = load(island, quillmere.CODE, 2, asked, figures="full")
    total = {
        (one.area, one.sex): (
            loaded.panel.deaths.sum(),
            loaded.panel.exposure.sum(),
            *loaded.panel.births,
        )
        for one, loaded in held.items()
    }
    for sex in ("f", "m", "p"):
        parts = [total[region.code, sex] for region in REGIONS]
        assert total[WHOLE.code, sex] == tuple(map(sum, zip(*parts, strict=True)))
    for code in codes:
        both = zip(total[code, "f"], total[code, "m"], strict=True)
        assert total[code, "p"] == tuple(map(sum, both))


@pytest.mark.parametrize(("sex", "begin", "end"), [("f", 80, 84), ("m", 75, 79.5)])
def test_length_of_life_grows(island: Session, sex: str, begin: float, end: float) -> None:
    whole = trend(island, WHOLE.code, sex)
    assert in_year(whole, 1999) == pytest.approx(begin, abs=0.5)
    assert in_year(whole, 2022) == pytest.approx(end, abs=0.5)


def test_men_of_tollbay_stand_still_while_others_gain(island: Session) -> None:
    stalled = trend(island, "tollbay", "m")
    others = [
        gain(trend(island, area, "m"), 2008, 2017)
        for area in ("northlade", "harrowfen", "stonereach", "elderwick")
    ]
    assert gain(stalled, 2008, 2017) < 0.5
    assert min(others) > 1.2
    assert gain(trend(island, "tollbay", "f"), 2008, 2017) > 0.8
    working = trend(island, "tollbay", "m", "45q15")
    assert in_year(working, 2017) > 1.15 * in_year(working, 2008)


@pytest.mark.parametrize("sex", ["f", "m"])
def test_the_hot_summer_shows_at_old_ages_most_in_elderwick(island: Session, sex: str) -> None:
    def dip(area: str) -> float:
        figures = trend(island, area, sex, "e65")
        return (in_year(figures, 2017) + in_year(figures, 2019)) / 2 - in_year(figures, 2018)

    assert dip("elderwick") > 2 * dip(WHOLE.code) > 0.4
    gains = np.diff(trend(island, WHOLE.code, sex, "e65").value)
    assert np.argmin(gains) == 2018 - 2000


def test_infants_of_harrowfen_gain(island: Session) -> None:
    for sex in ("f", "m"):
        there = trend(island, "harrowfen", sex, "5q0")
        before, after = there.value[:7].mean(), there.value[14:].mean()
        assert before > 1.8 * trend(island, "northlade", sex, "5q0").value[:7].mean()
        assert after < 0.45 * before
        assert there.high[14:].mean() < there.low[:7].mean()


def test_the_figures_of_little_auk_jump_by_chance(island: Session) -> None:
    for sex in ("f", "m"):
        small, whole = trend(island, "little-auk", sex), trend(island, WHOLE.code, sex)
        assert np.all(np.isfinite(small.value))
        wide, narrow = (figures.high - figures.low for figures in (small, whole))
        assert wide.min() > 8 * narrow.max()
        assert np.abs(np.diff(small.value)).max() > 2
        inside = (small.low <= whole.value) & (whole.value <= small.high)
        assert inside.sum() >= 21  # its interval nearly always holds the whole's figure


def test_what_ages_closed_at_85_cost(island: Session) -> None:
    plain = trend(island, "stonereach", "f", "H")
    assert set(plain.reason.tolist()) == {Reason.OPEN_GROUP_TOO_LARGE}
    fitted = trend(island, "stonereach", "f", "H", "almanac-1-kannisto")
    assert np.all(np.isfinite(fitted.value))
    assert np.all(np.isfinite(trend(island, WHOLE.code, "f", "H").value))


def test_the_revision_moves_one_region_and_the_whole_in_one_year(island: Session) -> None:
    moved = set()
    asked = [
        PopulationYear(code, sex, str(year))
        for code in (*(region.code for region in REGIONS), WHOLE.code)
        for sex, year in itertools.product(("f", "m"), YEARS)
    ]
    first, second = (
        load(island, quillmere.CODE, number, asked, figures="full") for number in (1, 2)
    )
    for one in asked:
        before, after = first[one].panel.deaths, second[one].panel.deaths
        if not np.array_equal(before, after):
            assert after.sum() > before.sum()
            moved.add((one.area, one.period))
    assert moved == {("northlade", "2021"), (WHOLE.code, "2021")}


def test_the_office_withholds_one_or_two_deaths(island: Session) -> None:
    asked = [PopulationYear("little-auk", "f", "2021")]
    shown, full = (
        load(island, quillmere.CODE, 3, asked, figures=figures)[asked[0]]
        for figures in ("released", "full")
    )
    small = (full.panel.deaths > 0) & (full.panel.deaths < 3)
    assert small.any()
    assert shown.withheld_on(shown.panel.grid)[small].all()
    assert not full.withheld
    assert shown.panel.deaths.sum() == pytest.approx(full.panel.deaths.sum(), abs=1e-6)
