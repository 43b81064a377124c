"""A problem in words."""

import json

from server.intake.checks import KINDS
from server.intake.checks.check import LISTED, listed
from server.intake.problems import Fault, Problem, Text
from server.sentences.text import _, speaking


def problem(**fault: object) -> Problem:
    return Problem.of(KINDS["unknown_sex"], Fault(**fault), "a.csv")  # type: ignore[arg-type]


THREE = {"column": "sex", "row": 1_200, "last_row": 1_202, "rows": 3, "values": {"text": "x"}}


def test_it_says_where_what_and_what_to_do() -> None:
    assert str(problem(**THREE)) == (
        "a.csv, rows 1200 to 1202, column sex: found “x”, expected f, m or p (female, male, "
        "persons). Give one row for each sex, or say in the mapping what the code means."
    )


def test_numbers_are_shown_as_the_page_shows_them() -> None:
    assert problem(**THREE).rows_worded(show=lambda n: f"{n:,}") == "1,200 to 1,202"


def test_every_word_but_the_users_own_passes_through_the_catalogue() -> None:
    with speaking("pseudo"):
        words = problem(**THREE).worded(_)
        assert words.found == "⟦“x”⟧"
        assert words.expected.startswith("⟦f, m or p")
        assert words.remedy.endswith("⟧")
        assert problem(**THREE).rows_worded(_) == "⟦1200 to 1202⟧"
        assert problem(others=4, values={"text": "x"}).worded(_).found.startswith("⟦⟦“x”⟧ and 4")


def test_texts_that_fill_a_finding_are_of_the_catalogue_too() -> None:
    """Put into the reader's language when it is shown, also out of a report that was kept."""
    hidden = Text("hidden columns: {columns}", columns="B, C")
    one = problem(values={"text": hidden, "other": Text("all ages"), "count": 3})
    assert one.found == "“hidden columns: B, C”"
    kept = Problem.from_json(json.loads(json.dumps(one.to_json())))
    assert kept == one
    with speaking("pseudo"):
        assert one.worded(_).found == kept.worded(_).found == "⟦“⟦hidden columns: B, C⟧”⟧"
        assert problem(values={"text": "all ages"}).worded(_).found == "⟦“all ages”⟧"  # a user's
    with speaking("es"):
        assert "todas las edades" in problem(values={"text": Text("all ages")}).worded(_).found


def test_texts_of_users_are_never_filled_in_twice() -> None:
    odd = problem(values={"text": "{rows} {0} %s"})
    assert odd.found == "“{rows} {0} %s”"
    assert "“{rows} {0} %s”" in str(odd)


def test_it_survives_its_text() -> None:
    one = problem(**THREE, others=7)
    assert Problem.from_json(json.loads(json.dumps(one.to_json()))) == one


def test_an_old_report_reads_the_same_when_a_check_is_gone() -> None:
    stored = problem(**THREE).to_json() | {"key": "a_check_of_old"}
    assert str(Problem.from_json(stored)) == str(problem(**THREE))


def test_what_goes_beyond_the_list_is_counted() -> None:
    faults = [Fault(row=row, rows=2, last_row=row + 1) for row in range(2, 102, 2)]
    kept = listed(faults)
    assert kept[:LISTED] == faults[:LISTED]
    assert kept[LISTED] == Fault(row=42, last_row=101, rows=60, others=29)
    assert listed(faults[: LISTED + 1]) == faults[: LISTED + 1]


def test_what_is_counted_lies_between_its_first_and_its_last_row_in_any_order() -> None:
    faults = [Fault(row=row, last_row=row) for row in (*range(900, 900 + LISTED), 70, 90, 50)]
    assert listed(faults)[LISTED] == Fault(row=50, last_row=90, rows=3, others=2)


def test_what_is_counted_over_two_files_names_no_rows() -> None:
    faults = [Fault(file=file, column="x", row=2, last_row=2) for file in ("a", "b") * LISTED]
    assert listed(faults)[LISTED] == Fault(rows=LISTED, others=LISTED - 1)
