"""In which encoding a text stands: its mark, its zero bytes or being UTF-8 says so, or a guess."""

import re
from dataclasses import dataclass

from server.intake.forms.found import Found
from server.intake.problems import Fault, Text

# names as a form states them, and as readers know them
ENCODINGS = {
    "utf-8": "UTF-8",
    "utf-16-le": "UTF-16, low byte first",
    "utf-16-be": "UTF-16, high byte first",
    "windows-1252": "Windows-1252",
    "latin-1": "Latin-1",
    "iso-8859-15": "Latin-9",
    "iso-8859-2": "Latin-2",
    "windows-1250": "Windows-1250",
    "windows-1251": "Windows-1251",
    "windows-1253": "Windows-1253",
    "windows-1254": "Windows-1254",
    "windows-1257": "Windows-1257",
    "cp850": "DOS 850",
    "mac-roman": "Mac Roman",
}
MARKS = {b"\xef\xbb\xbf": "utf-8", b"\xff\xfe": "utf-16-le", b"\xfe\xff": "utf-16-be"}
WITH_MARK = " with byte order mark"
LOOKED_AT = 4_000  # bytes in which zero bytes are counted
MOSTLY = 0.7  # share of the bytes of one side that are zero in UTF-16 of letters and digits
SHOWN = 40  # signs of a line shown as evidence

_LATER = rb"[\x80-\xbf]"
_UTF_8 = re.compile(
    rb"[\xc2-\xdf]" + _LATER + rb"|[\xe0-\xef]" + _LATER + rb"{2}|[\xf0-\xf4]" + _LATER + rb"{3}"
)
_HIGH = bytes(range(0x80, 0x100))
_ONLY_WINDOWS = re.compile(rb"[\x80-\x9f]")  # letters and marks there, nothing in Latin-1


@dataclass(frozen=True, slots=True)
class Decoded:
    """A text as UTF-8 with lines ended by a line feed, and how it stood in the file."""

    body: bytes
    encoding: str  # a key of ENCODINGS
    mark: bool = False
    sure: bool = True  # False: guessed from the bytes that are no UTF-8
    found: tuple[Found, ...] = ()

    @property
    def label(self) -> str:
        return ENCODINGS.get(self.encoding, self.encoding) + (WITH_MARK if self.mark else "")


def decoded(content: bytes, stated: str = "") -> Decoded:
    """The text of some bytes; `stated` goes before what the bytes look like. Never loses a sign:
    where the encoding does not fit, that is found and the text is not to be used."""
    if stated and stated not in ENCODINGS:
        known = ", ".join(ENCODINGS)
        fault = Fault(values={"encoding": stated, "known": known})
        return Decoded(content, stated, found=(Found("unknown_encoding", fault),))
    mark = next((mark for mark in MARKS if content.startswith(mark)), b"")
    if mark and stated in ("", MARKS[mark]):
        return _read(content[len(mark) :], MARKS[mark], mark=True)
    if stated:
        return _read(content, stated)
    if wide := _zero_bytes(content[:LOOKED_AT]):
        return _read(content, wide)
    return _single(content)


def _zero_bytes(start: bytes) -> str:
    """UTF-16 without a mark, where every other byte is zero; '' elsewhere."""
    if b"\0" not in start or len(start) < 4:
        return ""
    half = len(start) // 2
    even, odd = start[0::2].count(0) / half, start[1::2].count(0) / half
    if odd >= MOSTLY and not even:
        return "utf-16-le"
    return "utf-16-be" if even >= MOSTLY and not odd else ""


def _single(content: bytes) -> Decoded:
    """UTF-8 where it can be; else the guess that its bytes allow."""
    if content.isascii():
        return Decoded(_lines(content), "utf-8")
    try:
        content.decode()
    except UnicodeDecodeError as error:
        if _mixed(content):
            return _unfit(content, "utf-8", error.start)
        guess = "windows-1252" if _ONLY_WINDOWS.search(content) else "latin-1"
        return _guessed(content, guess, error.start)
    return Decoded(_lines(content), "utf-8")


def _mixed(content: bytes) -> bool:
    """Mostly UTF-8, with bytes among it that are not: no single encoding reads it."""
    rest, letters = _UTF_8.subn(b"", content)
    return letters > len(rest) - len(rest.translate(None, _HIGH))


def _guessed(content: bytes, guess: str, first: int) -> Decoded:
    read = _read(content, guess)
    if read.found:
        return read
    row = content.count(b"\n", 0, first) + 1
    start = content.rfind(b"\n", 0, first) + 1
    line = content[max(start, first - SHOWN // 2) : first + SHOWN // 2].split(b"\n")[0]
    values = {"encoding": Text(ENCODINGS[guess]), "text": line.decode(guess, "replace").strip()}
    fault = Fault(row=row, values=values)
    return Decoded(read.body, guess, sure=False, found=(Found("encoding_guessed", fault),))


def _read(content: bytes, encoding: str, *, mark: bool = False) -> Decoded:
    try:
        text = content if encoding == "utf-8" else content.decode(encoding).encode()
        if encoding == "utf-8" and not content.isascii():
            content.decode()
    except UnicodeError as error:
        start = error.start if isinstance(error, UnicodeDecodeError) else 0
        return _unfit(content, encoding, start, mark=mark)
    return Decoded(_lines(text), encoding, mark=mark)


def _unfit(content: bytes, encoding: str, start: int, *, mark: bool = False) -> Decoded:
    line = "\n".encode(encoding)
    fault = Fault(
        row=content.count(line, 0, start) + 1,
        values={"byte": f"0x{content[start]:02x}", "encoding": Text(ENCODINGS[encoding])},
    )
    body = _lines(content.decode(encoding, "replace").encode())
    return Decoded(body, encoding, mark=mark, sure=False, found=(Found("wrong_encoding", fault),))


def _lines(text: bytes) -> bytes:
    """Lines ended by a line feed alone."""
    return text.replace(b"\r\n", b"\n").replace(b"\r", b"\n") if b"\r" in text else text
