"""What is said of files handed in."""

from server.sentences import uploads as say
from server.sentences.pieces import plain


def test_one_row_is_one_row() -> None:
    assert say.outcome(1, 0, 1, 0).startswith("One row was read; 0 is sound. To be put right: 1;")
    assert say.outcome(0, 0, 7800, 7800).startswith("7,800 rows were read; 7,800 are sound.")
    said = plain(say.read_rows(1, 1, 3))
    assert said == "One row was read; 1 is sound. Nothing has changed: edition 3 stands."
    assert plain(say.read_rows(2, 2, 0)).endswith("Nothing has been made of it yet.")


def test_things_are_counted_in_words_as_far_as_they_go() -> None:
    assert [say.things(count) for count in (0, 1, 9, 1200)] == [
        "nothing",
        "one thing",
        "nine things",
        "1,200 things",
    ]
