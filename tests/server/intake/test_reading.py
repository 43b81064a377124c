"""A first look at a file."""

import pytest

from server.intake.layout import layout
from server.intake.reading import read

PLAIN = b"year,sex,deaths\n2014,f,12\n2014,m,15\n"


@pytest.mark.parametrize(
    ("content", "delimiter"),
    [
        (PLAIN, "comma"),
        (PLAIN.replace(b",", b";"), "semicolon"),
        (PLAIN.replace(b",", b"\t"), "tab"),
        (b"\xef\xbb\xbf" + PLAIN, "comma"),
        (PLAIN.replace(b"\n", b"\r\n"), "comma"),
        (PLAIN.replace(b"\n", b"\r"), "comma"),
        (PLAIN.rstrip(), "comma"),
        (PLAIN.replace(b"sex", b'"sex"').replace(b"12", b'"12"'), "comma"),
        (PLAIN.replace(b",", b" , "), "comma"),
    ],
)
def test_usual_forms_read_alike(content: bytes, delimiter: str) -> None:
    reading = read(content, "deaths.csv")
    assert reading.problems == ()
    assert reading.columns == ("year", "sex", "deaths")
    assert reading.values("deaths") == ("12", "15")
    assert reading.row_count == 2
    assert reading.delimiter_name == delimiter


def test_the_encoding_is_named() -> None:
    assert read(PLAIN, "a").encoding == "UTF-8"
    assert read(b"\xef\xbb\xbf" + PLAIN, "a").encoding == "UTF-8 with byte order mark"


def test_at_most_eight_rows_are_shown_and_all_are_counted() -> None:
    reading = read(b"a,b\n" + b"1,2\n" * 500, "a")
    assert len(reading.rows) == 8
    assert reading.row_count == 500


def test_a_delimiter_inside_a_heading_does_not_count() -> None:
    assert read(b'"age, in years, at death";sex\n1;f\n', "a").columns == (
        "age, in years, at death",
        "sex",
    )


def test_quoted_fields_may_hold_anything() -> None:
    reading = read(b'name,n\n"Upper, ""old"" shore\nand isles",3\nLower,4\n', "a")
    assert reading.problems == ()
    assert reading.row_count == 2
    assert reading.values("name") == ('Upper, "old" shore\nand isles', "Lower")


@pytest.mark.parametrize(
    ("content", "row"),
    [
        (b'a,b\n1,2\n3,"4\n', 3),
        (b'a,b\n1,2\n3,4"5\n', 3),
        (b'a,b\n"1"2,2\n3,4\n', 2),
        (b'a,"b\n1,2\n', 1),
        (b'a,b\n1,2"\n3,"4\n', 2),
    ],
)
def test_a_stray_quotation_mark_is_found(content: bytes, row: int) -> None:
    (problem,) = read(content, "a").problems
    assert (problem.key, problem.row) == ("stray_quote", row)


def test_rows_of_another_length_are_found_and_grouped() -> None:
    content = b"a,b\n1,2\n1,2,3\n1\n1,2,3\n\n"
    long, short = read(content, "a").problems
    assert (long.row, long.last_row, long.rows, long.values["count"]) == (3, 5, 2, 3)
    assert (short.row, short.rows, short.values["count"]) == (4, 1, 1)


def test_fields_are_counted_line_by_line() -> None:
    assert layout(b'a,b\n1,"2,3"\n\n,\n', "a").fields.tolist() == [2, 0, 0]
    assert layout(b"a", "a").fields.tolist() == []


@pytest.mark.parametrize(
    ("content", "keys"),
    [
        (b"", ["empty_file"]),
        (b" \n ", ["empty_file"]),
        (b"\xef\xbb\xbf", ["empty_file"]),
        (b"a,b", ["no_rows"]),
        (b"a,b\n\n\n", ["no_rows"]),
        (b"\n1,2\n", ["blank_heading"]),
        (PLAIN.decode().encode("utf-16"), []),
        (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", ["not_text"]),
        (b"a\n" + b"x" * 200_000 + b"\n", []),
        (b"a" * 300_000 + b"\n1\n", []),
    ],
)
def test_strange_files_are_read_or_told(content: bytes, keys: list[str]) -> None:
    assert [problem.key for problem in read(content, "a").problems] == keys
