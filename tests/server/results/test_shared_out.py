"""Counts shared out to new codes: their figures, and how far chance may have moved them."""

import numpy as np
import pytest
from sqlalchemy.orm import Session

from engine.estimates import Estimate
from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.results.questions import TrendQuestion
from server.results.series import series
from server.store.heading import heading
from tests.factories import NOON, checked_upload, edition, gompertz_panel

SPLIT = "code,becomes,share\nnorth,moor,0.25\nnorth,fell,0.75\n"


def figures(session: Session, number: int, area: str, of: str) -> Estimate:
    question = TrendQuestion(of, (area,), ("f",), "2013", "2014", "full")
    return series(session, heading(session, "isle", number), question).estimate[0]


@pytest.fixture
def isle(session: Session) -> Session:
    panels = {
        f"{area}.{sex}.{year}": gompertz_panel(sex=sex, seed=seed, people=3e5)
        for area in ("north", "south")
        for sex in "fm"
        for seed, year in enumerate(("2013", "2014"))
    }
    edition(session, panels, parents={"north": "isle", "south": "isle"})
    upload = checked_upload(session, collection="isle", areas=SPLIT)
    commit_upload(session, upload_id=upload.id, note="split", by=LOCAL, now=NOON)
    return session


@pytest.mark.parametrize("of", ["e0", "asr_esp2013", "45q15"])
def test_a_share_of_deaths_and_people_has_the_rates_of_the_whole_and_its_chance(
    isle: Session, of: str
) -> None:
    before = figures(isle, 1, "north", of)
    for area in ("moor", "fell"):
        after = figures(isle, 2, area, of)
        for part in ("value", "low", "high"):
            np.testing.assert_allclose(
                getattr(after, part), getattr(before, part), rtol=2e-3, err_msg=part
            )


@pytest.mark.parametrize("of", ["e0", "cdr"])
def test_the_whole_keeps_its_figures_and_their_limits(isle: Session, of: str) -> None:
    before, after = (figures(isle, number, "isle", of) for number in (1, 2))
    for part in ("value", "low", "high"):
        np.testing.assert_allclose(getattr(after, part), getattr(before, part), rtol=1e-9)
