"""No course, path or added year crosses a break; a year of shock is no end of a course."""

import numpy as np
import pytest
from numpy.testing import assert_array_equal
from sqlalchemy.orm import Session

from engine.estimates import Reason
from server.results.breaks import between, crossed, parting, pieces, shocks
from server.results.comparison import comparison
from server.results.population_year import population_year
from server.results.questions import (
    ComparisonQuestion,
    PopulationYear,
    PopulationYearQuestion,
    TrendQuestion,
)
from server.results.series import Series, series
from server.store.heading import heading
from server.store.records import Break
from tests.factories import edition, gompertz_panel

YEARS = tuple(str(year) for year in range(2001, 2011))
CENSUS, CODES = Break("", "2006", "population"), Break("north", "2009", "definition")
HEAT, CAUSE = Break("", "2010", "shock"), Break("", "2004", "coding", cause="heart")


def panels(*areas: str) -> dict[str, object]:
    return {
        f"{area}.{sex}.{year}": gompertz_panel(
            sex=sex, people=3e5, seed=at, level=(2.2e-5 if sex == "f" else 3e-5) - 4e-7 * at
        )
        for area in areas
        for sex in "fm"
        for at, year in enumerate(YEARS)
    }


@pytest.fixture
def isle(session: Session) -> Session:
    """Edition 1 without breaks, edition 2 the same counts with them."""
    counts = panels("north", "south")
    edition(session, counts)  # type: ignore[arg-type]
    edition(session, {}, breaks=(CENSUS, CODES, HEAT, CAUSE))
    return session


def asked(session: Session, number: int, **options: str) -> Series:
    question = TrendQuestion(
        options.get("of", "e0"),
        ("north", "south"),
        ("f", "m"),
        options.get("first", YEARS[0]),
        options.get("last", YEARS[-1]),
        "released",
        options.get("settings", "almanac-1"),
    )
    return series(session, heading(session, "isle", number), question)


@pytest.mark.parametrize("of", ["e0", "median", "asr_esp2013"])
def test_the_pieces_of_a_trend_are_trends_of_the_pieces_alone(isle: Session, of: str) -> None:
    whole = asked(isle, 2, of=of)
    spans = {  # of each area: its pieces, years of shock left out at the ends
        "north": (("2001", "2005"), ("2006", "2008")),
        "south": (("2001", "2005"), ("2006", "2009")),
    }
    found = {}
    for one in (*whole.before, *whole.courses):
        assert one.run.ends is not None
        found[*whole.lines[one.run.line], *one.run.ends] = one
    wanted = {(a, s, *span) for a, of_area in spans.items() for s in "fm" for span in of_area}
    assert found.keys() == wanted
    for (area, sex, first, last), one in found.items():
        alone = asked(isle, 1, of=of, first=first, last=last)
        line = alone.lines.index((area, sex))
        for part in ("change", "earlier", "later"):
            got, want = getattr(one, part), getattr(alone, part)
            for name in ("value", "low", "high", "reason"):
                assert_array_equal(getattr(got, name), getattr(want, name)[line], err_msg=part)
        assert one.run.middle == alone.middle[line]


def test_breaks_move_no_figure_and_name_what_they_part(isle: Session) -> None:
    plain, parted = asked(isle, 1), asked(isle, 2)
    for name in ("value", "low", "high", "reason"):
        assert_array_equal(getattr(plain.estimate, name), getattr(parted.estimate, name))
    assert plain.broken == ()
    assert parted.broken == (CENSUS, CODES, HEAT)
    assert [one.run.after for one in parted.courses] == [(CENSUS,)] * 4
    assert [one.run.after for one in parted.before] == [()] * 4
    assert {one.run.left_out for one in parted.before} == {()}
    assert plain.ends == (("2001", "2010"),) * 4


def test_too_few_years_after_a_break_leave_the_course_before_it(isle: Session) -> None:
    found = asked(isle, 2, first="2006", last="2009")
    ends = dict(zip(found.lines, found.ends, strict=True))
    assert ends["north", "f"] == ("2006", "2008")  # 2009 alone is no course
    assert ends["south", "f"] == ("2006", "2009")


def test_added_years_on_both_sides_of_a_break_give_no_figure(isle: Session) -> None:
    found = asked(isle, 2, settings="almanac-1-3-years")
    reasons = dict(zip(found.lines, found.estimate.reason, strict=True))
    mixed = {
        area: [
            period
            for period, code in zip(found.periods, reasons[area, "f"], strict=True)
            if code == Reason.ACROSS_A_BREAK
        ]
        for area in ("north", "south")
    }
    assert mixed == {"north": ["2006", "2007", "2009", "2010"], "south": ["2006", "2007"]}


def test_no_path_and_no_year_before_across_a_break(isle: Session) -> None:
    def path(number: int, first: str, last: str) -> object:
        question = ComparisonQuestion(
            PopulationYear("south", "f", last), PopulationYear("south", "f", first)
        )
        return comparison(isle, heading(isle, "isle", number), question).explained.path

    assert path(1, "2003", "2008") is not None
    assert path(2, "2003", "2008") is None
    assert path(2, "2001", "2005") is not None
    assert path(2, "2006", "2009") is not None

    def before(number: int, year: str) -> object:
        question = PopulationYearQuestion(PopulationYear("north", "m", year))
        return population_year(isle, heading(isle, "isle", number), question).before

    assert before(1, "2006") is not None
    assert before(2, "2006") is None
    assert before(2, "2007") is not None
    assert before(2, "2009") is None


def test_where_a_break_lies() -> None:
    all_ = (CENSUS, CODES, HEAT, CAUSE)
    assert parting(all_, "south") == (CENSUS,)
    assert parting(all_, "north") == (CENSUS, CODES)
    assert shocks(all_, "south") == (HEAT,)
    assert between([CENSUS], "2005", "2006") == between([CENSUS], "2006", "2005") == (CENSUS,)
    assert between([CENSUS], "2006", "2008") == ()
    assert between([CENSUS], "2001", "2005") == ()
    assert not crossed([CENSUS], "2006", 1)
    assert [crossed([CENSUS], year, 3) for year in ("2005", "2006", "2007", "2008")] == [
        False,
        True,
        True,
        False,
    ]
    assert pieces(YEARS, []) == (YEARS,)
    cut = pieces(YEARS, [CENSUS, CODES])
    assert np.concatenate(cut).tolist() == list(YEARS)
    assert [piece[0] for piece in cut] == ["2001", "2006", "2009"]
