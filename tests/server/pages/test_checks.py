"""The page that explains each check."""

import pytest

from server.intake.checks import CHAPTERS, KINDS
from server.pages import checks
from server.pages.checks import ChecksPage
from server.sentences import checks as say
from server.sentences.pieces import plain


@pytest.fixture(scope="module")
def page() -> ChecksPage:
    return checks.build()


def test_every_check_stands_there_with_all_that_is_known_of_it(page: ChecksPage) -> None:
    entries = {entry.key: dict(entry.facts) for one in page.chapters for entry in one.entries}
    assert sorted(entries) == sorted(KINDS)
    assert [one.key for one in page.chapters][:4] == ["years", "ages", "completeness", "form"]
    for key, kind in KINDS.items():
        facts = entries[key]
        assert facts["Means"] == kind.meaning
        assert facts["What to do"] == kind.remedy
        assert facts.get("Why", "") == kind.why
        assert facts.get("Source", "") == kind.source
        assert facts["False alarms"].endswith(".")


def test_doubts_about_figures_say_why_and_who_says_so() -> None:
    for chapter in CHAPTERS:
        if chapter.key in ("years", "ages", "completeness"):
            for kind in chapter.checks:
                assert kind.why.endswith("."), kind.key
                assert kind.source, kind.key


def test_the_answer_counts_them(page: ChecksPage) -> None:
    errors = sum(kind.severity == "error" for kind in KINDS.values())
    said = plain(page.answer)
    assert f"{len(KINDS)} checks: {errors} find" in said
    assert f"{len(KINDS) - errors} what wants" in said


def test_the_list_has_a_row_for_each_and_the_measured_data(page: ChecksPage) -> None:
    assert [row.cells[0] for row in page.table("checks").rows] == list(KINDS)
    assert {"Denmark 1974–2012, single years to 95+"} < {
        row.cells[0] for row in page.table("clean_counts").rows
    }


def test_how_often_a_check_is_wrong_is_said_in_words() -> None:
    assert say.no_alarm(64_234) == "Not one in 64,234 clean areas, sexes and years."
    assert say.some_alarms(0.016, 0.25, "Denmark") == (
        "0.02 in 1,000 clean areas, sexes and years; at worst 0.25, in Denmark."
    )
