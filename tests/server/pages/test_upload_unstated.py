"""Counts that do not state all, from the file to the pages."""

import re
from dataclasses import replace

import pytest
from numpy.testing import assert_allclose

from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.actions.rebuild_editions import rebuild_editions
from server.pages import population_year, upload_problems
from server.results.questions import PopulationYear, PopulationYearQuestion
from server.sentences.pieces import plain
from server.store import schedules
from server.store.connect import Session
from server.store.heading import heading
from server.store.records import Key
from tests.factories import (
    COLUMNS,
    NOON,
    checked_upload,
    counts_csv,
    gompertz_panel,
    stored_collection,
)

BESIDE = b"""
2001,f,not stated,north,3,0
2001,unknown,10+,north,5,0
2002,m,5-9,unknown,2,0
2002,unknown,unknown,unknown,1,0
"""
CHOSEN = replace(
    COLUMNS,
    unstated=(("sex", "spread"), ("age", "spread"), ("area", "spread")),
    whole="isle",
    whole_name="Isle",
)


SHARED = {"f": "8.0", "m": "1.0", "p": "9"}  # of two 883 and 837 ways; seven are women


@pytest.fixture
def salt(session: Session) -> Session:
    stored_collection(session)
    return session


def test_the_report_shows_counts_before_and_after(salt: Session) -> None:
    upload = checked_upload(salt, counts_csv() + BESIDE, mapping=CHOSEN)
    built = upload_problems.build(salt, upload.id)
    assert not built.errors.tables
    assert built.shared_out == (
        "11 deaths did not state their sex, age or area and were shared out in proportion to those"
        " of the same year that do. The sums are kept."
    )
    assert [row.cells for row in built.table("not_stated").rows] == [
        ("2002", "deaths", 648.0, 0.0, 0.0, 3.0, 0.0, 651.0),
        ("2001", "deaths", 520.0, 5.0, 3.0, 0.0, 0.0, 528.0),
    ]
    chosen = replace(CHOSEN, unstated=(*CHOSEN.unstated[:2], ("area", "left_out")))
    built = upload_problems.build(
        salt, checked_upload(salt, counts_csv() + BESIDE, mapping=chosen).id
    )
    assert built.shared_out.startswith("8 deaths did not state")
    assert built.shared_out.endswith("3 deaths that do not state all of these were left out.")
    plain_one = checked_upload(salt, counts_csv(), mapping=CHOSEN)
    assert upload_problems.build(salt, plain_one.id).shared_out == ""


def test_an_edition_holds_what_was_counted_and_is_made_again(salt: Session) -> None:
    upload = checked_upload(salt, counts_csv() + BESIDE, mapping=CHOSEN)
    commit_upload(salt, upload_id=upload.id, note="with deaths shared out", by=LOCAL, now=NOON)
    held = schedules.load(salt, "saltmarsh", 1)
    counted = {key for key in held if key.measure == "counted_deaths"}
    assert {key.sex for key in counted} == {"f", "m", "p"}
    assert Key("isle", "p", "2001", "counted_deaths") in counted
    assert Key("south", "f", "2001", "counted_deaths") not in counted
    for period, stated, after in (("2001", 520, 528), ("2002", 648, 651)):
        whole = (held[Key("isle", "p", period, name)] for name in ("counted_deaths", "deaths"))
        sums = [cell.values.sum() for cell in whole]
        assert_allclose(sums, [stated, after], rtol=1e-12)
    assert all(made.same for made in rebuild_editions(salt, collection="saltmarsh", by=LOCAL))


def test_a_figure_says_how_many_deaths_were_shared_out(salt: Session) -> None:
    lines = ["year,sex,age,area,deaths,population"]
    for seed, sex in enumerate("fm"):
        panel = gompertz_panel(people=400_000, sex=sex, seed=seed)
        counts = zip(panel.grid.labels, panel.deaths, panel.exposure, strict=True)
        lines += [f"2001,{sex},{age},north,{dead:.0f},{lived:.0f}" for age, dead, lived in counts]
    beside = "\n2001,f,not stated,north,7,0\n2001,unknown,85-89,north,2,0"
    content = ("\n".join(lines) + beside).encode()
    upload = checked_upload(salt, content, mapping=replace(CHOSEN, whole="", whole_name=""))
    commit_upload(salt, upload_id=upload.id, note="with deaths shared out", by=LOCAL, now=NOON)

    def computed(code: str) -> str:
        question = PopulationYearQuestion(PopulationYear.parse(code))
        built = population_year.build(salt, heading(salt, "saltmarsh", 1), question)
        return " ".join(plain(one) for one in built.computed)

    said = r"Not stated\. (\d[.\d]*) of the [\d,]+ deaths did not state their sex, age or area\."
    shared = {sex: re.search(said, computed(f"north.{sex}.2001")) for sex in "fmp"}
    assert {sex: found and found[1] for sex, found in shared.items()} == SHARED
