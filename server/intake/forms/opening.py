"""From the bytes of a file to one table of text, whatever the file is."""

from dataclasses import dataclass

from server.intake.forms.encodings import decoded
from server.intake.forms.found import Found
from server.intake.forms.packages import ZIP
from server.intake.forms.sheet_rows import BETWEEN, SheetRows
from server.intake.forms.unpacking import unpacked
from server.intake.forms.workbooks import Tab, workbook
from server.intake.mapping import Form
from server.intake.problems import Fault, Text

FOREIGN = {
    b"\xd0\xcf\x11\xe0": Text("a spreadsheet of the old kind, or one locked with a password"),
    b"%PDF": Text("a PDF"),
    b"{\\rtf": Text("a text document"),
    b"BZh": Text("a file packed with bzip2"),
    b"\xfd7zXZ": Text("a file packed with xz"),
    b"7z\xbc\xaf": Text("a file packed with 7-Zip"),
    b"PAR1": Text("a Parquet file"),
}
NO_TEXT = Text("bytes of value 0, which no text has")


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
    cells: SheetRows | None = None
    texts: tuple[str, ...] = ()  # of a workbook: texts that may be numbers
    found: tuple[Found, ...] = ()


def opened(content: bytes, form: Form) -> Opened:
    """The table that a file holds. Never raises: what is wrong is found."""
    package = unpacked(content)
    if package.found:
        return Opened(b"", found=package.found)
    if package.content.startswith(ZIP):
        return _no_table("package_in_package") if package.packed else _sheet(content, form)
    for start, what in FOREIGN.items():
        if package.content.startswith(start):
            return _no_table("not_text", what=what)
    return _text(package.content, form)


def _no_table(key: str, **values: str) -> Opened:
    return Opened(b"", found=(Found(key, Fault(values=values)),))


def _sheet(content: bytes, form: Form) -> Opened:
    book = workbook(content, form)
    return Opened(
        body=book.body,
        sure=("encoding", "sheet") if book.sure else ("encoding",),
        delimiter=BETWEEN,
        sheet=book.sheet,
        tabs=book.tabs,
        cells=book.cells,
        texts=book.texts,
        found=book.found,
    )


def _text(content: bytes, form: Form) -> Opened:
    text = decoded(content, form.encoding)
    found = list(text.found)
    if b"\0" in text.body:
        row = text.body.count(b"\n", 0, text.body.index(b"\0")) + 1
        found.append(Found("not_text", Fault(row=row, values={"what": NO_TEXT})))
    return Opened(
        body=text.body,
        encoding=text.encoding,
        label=text.label,
        sure=("encoding", "sheet") if text.sure else ("sheet",),
        found=tuple(found),
    )
