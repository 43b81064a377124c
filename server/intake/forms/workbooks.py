"""A sheet of a workbook as a table of text: values as they are kept, nothing worked out or run."""

import re
from dataclasses import dataclass, replace

from server.intake.forms.dates import shows_date
from server.intake.forms.found import Found
from server.intake.forms.packages import Broken, Package, local, package
from server.intake.forms.sheet_rows import (
    BETWEEN,
    MARKED,
    MOST_COLUMNS,
    Book,
    SheetRows,
    TooLarge,
    TooWide,
    may_be_number,
    place,
    sheet_rows,
    written,
)
from server.intake.forms.unpacking import MOST_UNPACKED
from server.intake.mapping import Form
from server.intake.problems import Fault, Text

HEAD = 64_000  # bytes of a sheet in which its size is looked for
_SIZE = re.compile(rb'dimension ref="[A-Z]+\d+:([A-Z]+\d+)"')
NO_WORKBOOK = Text("a zipped file that is no workbook")


@dataclass(frozen=True, slots=True)
class Tab:
    """A sheet of a workbook."""

    name: str
    rows: int
    columns: int
    hidden: bool
    part: str = ""


@dataclass(frozen=True, slots=True)
class Workbook:
    """The table of one sheet, fields between BETWEEN, and what is said of the whole."""

    body: bytes = b""
    sheet: str = ""
    sure: bool = False
    tabs: tuple[Tab, ...] = ()
    cells: SheetRows | None = None
    texts: tuple[str, ...] = ()  # that may be numbers
    found: tuple[Found, ...] = ()


def workbook(content: bytes, form: Form) -> Workbook:
    """The sheet that the form names, or the largest that is shown. Never raises."""
    opened = package(content)
    if isinstance(opened, Found):
        return Workbook(found=(opened,))
    try:
        return _opened(opened, form)
    except Broken as error:
        return Workbook(found=(Found("broken_workbook", Fault(values={"part": error.args[0]})),))
    except TooWide as error:
        fault = Fault(row=error.args[0], values={"most": MOST_COLUMNS})
        return Workbook(found=(Found("too_many_columns", fault),))
    except TooLarge:
        return Workbook(found=(Found("sheet_too_large", Fault(values={"most": MOST_UNPACKED})),))


def _opened(book: Package, form: Form) -> Workbook:
    if what := _other_kind(book):
        return Workbook(found=(Found("not_text", Fault(values={"what": what})),))
    main = next((part for kind, part in book.links("").values() if kind == "officeDocument"), "")
    tabs, from_1904, links = _tabs(book, main)
    if not tabs:
        return Workbook(found=(Found("not_text", Fault(values={"what": NO_WORKBOOK})),))
    found = _beside(book, tabs)
    tab, sure = _chosen(tabs, form.sheet, found)
    if tab is None:
        return Workbook(tabs=tabs, found=tuple(found))
    texts = _texts(book, links.get("sharedStrings", ""))
    shared = Book(texts, _date_styles(book, links.get("styles", "")), from_1904)
    cells = sheet_rows(book, tab.part, shared, form.decimal)
    exact = replace(tab, rows=len(cells.rows), columns=cells.width)
    return Workbook(
        body=_table(cells),
        sheet=tab.name,
        sure=sure,
        tabs=tuple(exact if one is tab else one for one in tabs),
        cells=cells,
        texts=(*cells.marked, *filter(may_be_number, texts))[:MARKED],
        found=tuple(found),
    )


def _other_kind(book: Package) -> str:
    """What the package is where it is no workbook of XML."""
    names = book.parts.namelist()
    if "mimetype" in names:
        return Text("an OpenDocument file")
    binary = any(name.endswith("workbook.bin") for name in names)
    return Text("a binary workbook") if binary else ""


def _tabs(book: Package, main: str) -> tuple[tuple[Tab, ...], bool, dict[str, str]]:
    """Sheets in their order, whether days are counted from 1904, and other parts by their kind."""
    links = book.links(main)
    tabs: list[Tab] = []
    from_1904: list[bool] = []

    def begin(tag: str, given: dict[str, str]) -> None:
        if local(tag) == "sheet":
            key = next((value for name, value in given.items() if local(name) == "id"), "")
            kind, part = links.get(key, ("", ""))
            if kind == "worksheet":
                hidden = given.get("state", "visible") != "visible"
                tabs.append(Tab(given.get("name", ""), 1, 1, hidden, part))
        elif local(tag) == "workbookPr":
            from_1904.append(given.get("date1904") in ("1", "true"))

    book.parse(main, begin)
    if len(tabs) > 1:  # of a single one the size is known when it was read
        sizes = [_size(book, tab.part) for tab in tabs]
        tabs = [
            replace(tab, rows=rows, columns=columns)
            for tab, (rows, columns) in zip(tabs, sizes, strict=True)
        ]
    return tuple(tabs), any(from_1904), dict(links.values())


def _size(book: Package, part: str) -> tuple[int, int]:
    """Rows and columns as the sheet says itself, or the rows there are."""
    if part not in book.parts.namelist():
        raise Broken(part)
    if match := _SIZE.search(book.start(part, HEAD)):
        return place(match[1].decode())
    at = [0, 0]
    reached = [0, 0]

    def begin(tag: str, given: dict[str, str]) -> None:
        name = local(tag)
        if name == "row":
            at[:] = int(given.get("r", at[0] + 1)), 0
        elif name == "c":
            at[1] += 1
            reached[:] = at[0], max(reached[1], at[1])

    book.parse(part, begin)
    return reached[0], reached[1]


def _chosen(tabs: tuple[Tab, ...], stated: str, found: list[Found]) -> tuple[Tab | None, bool]:
    """The sheet to be read, and whether there is no doubt about it."""
    names = ", ".join(tab.name for tab in tabs)
    if stated:
        tab = next((tab for tab in tabs if tab.name == stated), None)
        if tab is None:
            values = {"sheet": stated, "sheets": names}
            found.append(Found("unknown_sheet", Fault(values=values)))
        return tab, True
    shown = [tab for tab in tabs if tab.rows and not tab.hidden] or list(tabs)
    if len(shown) > 1:
        found.append(Found("sheet_not_chosen", Fault(values={"sheets": names})))
    return max(shown, key=lambda tab: tab.rows * tab.columns), len(shown) == 1


def _beside(book: Package, tabs: tuple[Tab, ...]) -> list[Found]:
    """What a workbook holds that is not looked at."""
    hidden = [tab.name for tab in tabs if tab.hidden and tab.rows]
    told = {
        Text("macros, which are not run"): book.has(r"vbaProject"),
        Text("links to other files, which are not followed"): book.has(r"externalLinks/[^/]+$"),
        Text("hidden sheets: {sheets}", sheets=", ".join(hidden)): len(hidden),
    }
    return [
        Found("beside_the_sheet", Fault(values={"what": what}))
        for what, count in told.items()
        if count
    ]


def _texts(book: Package, part: str) -> list[str]:
    """The texts that cells point at, by number; how they are spoken is no part of them."""
    texts: list[str] = []
    pieces: list[str] = []
    listens = [False, False]  # within a text; within what is spoken

    def begin(tag: str, _: dict[str, str]) -> None:
        name = local(tag)
        if name == "si":
            pieces.clear()
        elif name == "t":
            listens[0] = True
        elif name == "rPh":
            listens[1] = True

    def end(tag: str) -> None:
        name = local(tag)
        if name == "si":
            texts.append(written("".join(pieces)))
        elif name == "t":
            listens[0] = False
        elif name == "rPh":
            listens[1] = False

    def text(piece: str) -> None:
        if listens == [True, False]:
            pieces.append(piece)

    if part:
        if book.size(part) > MOST_UNPACKED:
            raise TooLarge
        book.parse(part, begin, end, text)
    return texts


def _date_styles(book: Package, part: str) -> frozenset[int]:
    """Numbers of the styles that show a date."""
    codes: dict[int, str] = {}
    styles: list[int] = []
    inside = [False]

    def begin(tag: str, given: dict[str, str]) -> None:
        name = local(tag)
        if name == "numFmt":
            codes[int(given.get("numFmtId", "0"))] = given.get("formatCode", "")
        elif name == "cellXfs":
            inside[0] = True
        elif name == "xf" and inside[0]:
            styles.append(int(given.get("numFmtId", "0")))

    def end(tag: str) -> None:
        if local(tag) == "cellXfs":
            inside[0] = False

    if part:
        book.parse(part, begin, end)
    return frozenset(
        style for style, number in enumerate(styles) if shows_date(number, codes.get(number, ""))
    )


def _table(cells: SheetRows) -> bytes:
    """Lines of as many fields each; rows without a cell are blank lines."""
    lines = (
        line + BETWEEN * (cells.width - 1 - line.count(BETWEEN)) if line else ""
        for line in cells.rows
    )
    return ("\n".join(lines) + "\n").encode("utf-8", "replace")
