"""What an edition holds, and life expectancy of every area in its newest year."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import numpy as np
import pytest

from engine.estimates import Reason
from server.results.contents import Contents, ContentsQuestion, contents
from server.results.questions import UnknownKey
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import edition, gompertz_panel


@pytest.fixture
def isle(session: Session) -> Session:
    """Two areas and their whole; the south was not counted in the newest year."""
    panels = {
        f"{area}.{sex}.{year}": gompertz_panel(sex=sex, people=3e6, level=level)
        for area, level in (("north", 2e-5), ("south", 4e-5))
        for sex in "fm"
        for year in ("2013", "2014")
        if (area, year) != ("south", "2014")
    }
    edition(session, panels, parents={"north": "isle", "south": "isle"})
    return session


def asked(session: Session, **choices: str) -> Contents:
    return contents(session, heading(session, "isle", 1), ContentsQuestion(**choices))


def test_the_newest_year_of_every_area_women_and_men(isle: Session) -> None:
    found = asked(isle).newest
    assert found is not None
    assert found.periods == ("2014",)
    assert [".".join(line) for line in found.lines] == [
        "isle.f", "isle.m", "north.f", "north.m", "south.f", "south.m",
    ]  # fmt: skip
    known = np.isfinite(found.estimate.value[:, 0])
    np.testing.assert_array_equal(known, [False, False, True, True, False, False])
    assert (found.estimate.reason[~known] == Reason.NOT_AVAILABLE).all()
    assert found.indicator.key == "e0"


def test_the_settings_asked_for_are_those_of_the_figures(isle: Session) -> None:
    plain, law = (asked(isle, settings=key).newest for key in ("almanac-1", "almanac-1-kannisto"))
    assert plain is not None
    assert law is not None
    assert law.settings.key == "almanac-1-kannisto"
    assert plain.estimate.value[2, 0] != law.estimate.value[2, 0]


def test_the_address_is_read_and_spelled() -> None:
    question = ContentsQuestion.parse([("settings", "almanac-1-gompertz")])
    assert question.canonical() == "figures=released&settings=almanac-1-gompertz"
    with pytest.raises(UnknownKey, match=r"It knows\s+figures, settings"):
        ContentsQuestion.parse([("of", "e0")])


def test_eight_statements_at_most(
    isle: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    edition(isle, {"north.f.2014": gompertz_panel(people=3e6, seed=1)})
    with count_statements() as statements:
        asked(isle)
    assert len(statements) <= 8
