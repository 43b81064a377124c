"""The page of a problem shows the way on."""

import pytest

from server.pages import error
from server.sentences.pieces import plain
from server.web.problem import Problem


def a_problem(asked: str, status: int = 404) -> Problem:
    return Problem(status, "No such page", "There is no edition 7.", asked, "1234-abcd", ("a", "b"))


def test_from_an_edition_that_is_not_there_to_the_one_that_stands() -> None:
    (lead,) = error.build(a_problem("/c/isle/7/trend?of=e0&area=x")).lead
    assert [piece.href for piece in lead if piece.href] == ["/c/isle/trend?of=e0&area=x", "/c/isle"]


@pytest.mark.parametrize(
    ("asked", "status"), [("/c/isle", 404), ("/methods/x", 404), ("/c/isle/7/trend?of=e0", 400)]
)
def test_elsewhere_there_is_no_such_way(asked: str, status: int) -> None:
    assert error.build(a_problem(asked, status)).lead == ()


@pytest.mark.parametrize(
    ("asked", "form"),
    [
        ("/uploads", "/uploads/new"),
        ("/uploads/7/reading", "/uploads/7/reading"),
        ("/uploads/7/commit", "/uploads/7/problems"),
    ],
)
def test_from_a_form_that_was_refused_back_to_it(asked: str, form: str) -> None:
    (lead,) = error.build(a_problem(asked, 422)).lead
    assert [piece.href for piece in lead if piece.href] == [form]


def test_everything_said_is_on_the_page_and_in_the_notice_beside_one() -> None:
    page = error.build(a_problem("/x"))
    assert plain(page.answer) == "There is no edition 7."
    assert page.reference == "Problem 404, request 1234-abcd."
    assert page.errors == ("a", "b")
    assert plain(page.alert.text).startswith("There is no edition 7. a b What stands below")
