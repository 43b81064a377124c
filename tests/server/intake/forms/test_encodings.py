"""Encodings that say themselves, that are guessed, and that do not fit."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.intake.forms.encodings import ENCODINGS, decoded

TEXT = "Sjælland;2014;12\nØstergård;2014;15\n"
LETTERS = {  # letters that each single-byte encoding has and UTF-8 stores otherwise
    "windows-1252": "æøåéßñ–€",
    "latin-1": "æøåéßñ",
    "iso-8859-15": "æøåŒ€",
    "iso-8859-2": "łąęžčő",
    "windows-1250": "łąęžč–",
    "windows-1251": "Область",
    "windows-1253": "Αθήνα",
    "windows-1254": "İşğ",
    "windows-1257": "ąčęėį",
    "cp850": "æøåéßñ",
    "mac-roman": "æøåéßñ",
}


@pytest.mark.parametrize(
    ("content", "encoding", "mark", "sure"),
    [
        (TEXT.encode(), "utf-8", False, True),
        (TEXT.encode("utf-8-sig"), "utf-8", True, True),
        (TEXT.encode("utf-16"), "utf-16-le", True, True),
        (b"\xfe\xff" + TEXT.encode("utf-16-be"), "utf-16-be", True, True),
        (TEXT.encode("utf-16-le"), "utf-16-le", False, True),
        (TEXT.encode("utf-16-be"), "utf-16-be", False, True),
        (TEXT.encode("latin-1"), "latin-1", False, False),
        (TEXT.replace(";", "–").encode("windows-1252"), "windows-1252", False, False),
        (b"plain", "utf-8", False, True),
    ],
)
def test_what_the_bytes_say(content: bytes, encoding: str, mark: bool, sure: bool) -> None:
    found = decoded(content)
    assert (found.encoding, found.mark, found.sure) == (encoding, mark, sure)
    assert found.body.decode().replace("–", ";") in (TEXT, "plain")
    assert [one.key for one in found.found] == ([] if sure else ["encoding_guessed"])


@pytest.mark.parametrize("encoding", list(ENCODINGS))
def test_a_stated_encoding_goes_before_any_guess(encoding: str) -> None:
    text = LETTERS.get(encoding, TEXT)
    found = decoded(text.encode(encoding), encoding)
    assert (found.body.decode(), found.sure, found.found) == (text, True, ())


@pytest.mark.parametrize(
    ("content", "stated", "row"),
    [
        (b"a\n\xe6b\n", "utf-8", 2),
        (b"\xef\xbb\xbfa\n\xe6b\n", "", 2),
        (b"a\nb\n\x81\xe6\n", "", 3),  # Windows-1252 has no sign there
        (TEXT.encode() + b"\xe6;2014;3\n", "", 3),  # two encodings in one file
        (TEXT.encode("utf-16-le")[:-1], "utf-16-le", 2),
    ],
)
def test_bytes_without_a_meaning_are_told_with_their_row(
    content: bytes, stated: str, row: int
) -> None:
    (found,) = decoded(content, stated).found
    assert (found.key, found.fault.row) == ("wrong_encoding", row)


def test_the_line_of_a_guess_is_shown() -> None:
    (found,) = decoded(b"a,b\n1,2\n" + "Østergård,3\n".encode("latin-1")).found
    assert (found.fault.row, found.fault.values["text"]) == (3, "Østergård,3")


@given(st.text([chr(n) for n in range(256) if n != 13], max_size=40))
def test_no_sign_is_lost_in_a_guess(text: str) -> None:
    """Every text of Latin-1 comes back, or is told not to be readable."""
    found = decoded(text.encode("latin-1"), "latin-1")
    assert found.body.decode() == text


@given(st.binary(max_size=80))
def test_any_bytes_are_text_or_told(content: bytes) -> None:
    found = decoded(content)
    wrong = any(one.key == "wrong_encoding" for one in found.found)
    assert wrong or found.body.decode() is not None
