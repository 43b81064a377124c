"""From the bytes of a file to one table of text, whatever the file is."""

from dataclasses import dataclass

from server.intake.forms.encodings import decoded
from server.intake.forms.found import Found
from server.intake.forms.unpacking import unpacked
from server.intake.mapping import Form
from server.intake.problems import Fault

FOREIGN = {
    b"PK\x03\x04": "a zipped spreadsheet",
    b"\xd0\xcf\x11\xe0": "an old spreadsheet",
    b"%PDF": "a PDF",
}
NO_TEXT = "bytes of value 0, which no text has"


@dataclass(frozen=True, slots=True)
class Tab:
    """A sheet of a workbook."""

    name: str
    rows: int
    columns: int
    hidden: bool


@dataclass(frozen=True, slots=True)
class Opened:
    """One table as text in UTF-8, fields and lines not cut yet."""

    body: bytes
    encoding: str = ""  # key of ENCODINGS; empty: a workbook, whose text has none to choose
    label: str = ""
    sure: tuple[str, ...] = ()
    delimiter: str = ""  # where it does not have to be found out
    sheet: str = ""
    tabs: tuple[Tab, ...] = ()
    texts: tuple[str, ...] = ()  # of a workbook: numbers that stand there as texts
    found: tuple[Found, ...] = ()


def opened(content: bytes, form: Form) -> Opened:
    """The table that a file holds. Never raises: what is wrong is found."""
    package = unpacked(content)
    if package.found:
        return Opened(b"", found=package.found)
    content = package.content
    for start, what in FOREIGN.items():
        if content.startswith(start):
            return Opened(b"", found=(Found("not_text", Fault(values={"what": what})),))
    text = decoded(content, form.encoding)
    found = list(text.found)
    if b"\0" in text.body:
        row = text.body.count(b"\n", 0, text.body.index(b"\0")) + 1
        found.append(Found("not_text", Fault(row=row, values={"what": NO_TEXT})))
    return Opened(
        body=text.body,
        encoding=text.encoding,
        label=text.label,
        sure=("encoding",) if text.sure else (),
        found=tuple(found),
    )
