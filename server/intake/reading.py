"""A first look at a handed-in file: its form as found, its columns and first rows."""

from collections.abc import Iterator, Sequence
from collections.abc import Mapping as Mapped
from dataclasses import dataclass, field, replace

from server.intake.checks import files
from server.intake.forms.delimiters import NAMES
from server.intake.forms.encodings import ENCODINGS
from server.intake.forms.lines import taken
from server.intake.forms.opening import Opened, opened
from server.intake.forms.units import suggested
from server.intake.forms.workbooks import Tab
from server.intake.layout import Layout, laid_out
from server.intake.mapping import Form
from server.intake.problems import Problem, errors_of
from server.intake.recognising.marks import Marks, is_number, is_sign, marks
from server.intake.recognising.rows import heading
from server.intake.sheets import distinct, no_numbers

SAMPLE = 8  # rows shown
RAW = 60  # rows among which the heading is looked for
TEXTS = 2_000  # different texts of a column that are looked at
MOST_SIGNS = 8  # different texts that stand for numbers


@dataclass(frozen=True, slots=True)
class Question:
    """What the file does not say by itself: to be answered before its numbers are believed.

    `key` is a field of Form (encoding, delimiter, sheet, heading, decimal) or `units`; the page
    words it from its key and `values`.
    """

    key: str
    proposal: str  # the answer to begin with
    choices: tuple[str, ...]  # the answers there are; empty: any text
    column: str = ""  # the column it was seen in
    likely: bool = True  # False: the proposal is no better than another
    values: Mapped[str, str] = field(default_factory=dict)  # evidence: an example, what it means


@dataclass(frozen=True, slots=True)
class Reading:
    """What stands in the file, before anything is made of it."""

    name: str
    form: Form  # as applied: what was handed in, filled with what was found or is proposed
    columns: tuple[str, ...]  # empty text: no heading and nothing below it
    rows: tuple[tuple[str, ...], ...]  # the first ones below the heading, as text
    row_count: int  # below the heading
    delimiter: str  # the character; empty: a workbook
    delimiter_name: str  # comma, semicolon, tab, pipe, blanks; empty: a workbook
    encoding: str  # in words
    sure: tuple[str, ...]  # of encoding, delimiter, sheet, heading: those that are no guess
    sheets: tuple[Tab, ...]  # of a workbook: name, rows, columns, hidden
    top: tuple[tuple[str, ...], ...]  # rows above the heading
    questions: tuple[Question, ...]
    problems: tuple[Problem, ...]  # what keeps it from being read at all
    file: Layout = field(repr=False, compare=False)

    def values(self, column: str) -> tuple[str, ...]:
        """First values of a column."""
        place = self.columns.index(column)
        return tuple(row[place].strip() for row in self.rows if len(row) > place)

    def distinct(self, column: str, most: int = TEXTS) -> tuple[str, ...]:
        """The different texts of a column over the whole file; of a file that cannot be read, over
        its first rows."""
        if self.problems:
            return tuple(dict.fromkeys(filter(None, self.values(column))))
        return distinct(self.file, self.columns.index(column), most)

    def signs(self, columns: Sequence[str]) -> tuple[str, ...]:
        """Texts that stand in these columns of numbers and may do so on purpose; none of columns
        that have many, and hold something else."""
        places = sorted({self.columns.index(one) for one in columns if one in self.columns})
        if self.problems or not places:
            return ()
        found = tuple(filter(is_sign, no_numbers(self.file, places)))
        return found if len(found) <= MOST_SIGNS else ()


def read(content: bytes, name: str, form: Form | None = None, *, sample: int = SAMPLE) -> Reading:
    """Look into a file of any form: as `form` says, or, without one, as is proposed. Never raises:
    a file that cannot be read says why in `problems`."""
    if form is None:
        return proposed(content, name, Form(), sample=sample)
    file = laid_out(opened(content, form), name, form)
    return _look(file, sample, (*file.sure, "heading"), ())


def proposed(content: bytes, name: str, stated: Form, *, sample: int = SAMPLE) -> Reading:
    """The whole form found by looking, but for encoding, delimiter and sheet where they are stated.
    What is no more than a proposal is asked."""
    source = opened(content, stated)
    asked = tuple(one for one in source.found if one.key != "sheet_not_chosen")
    source = replace(source, found=asked)
    bare = Form(encoding=stated.encoding, delimiter=stated.delimiter, sheet=source.sheet)
    raw = laid_out(source, name, bare)
    rows = taken(source.body, 0, RAW, raw.delimiter).rows
    top = heading([row or ("",) for row in rows])
    form = replace(bare, heading=top.first, heading_rows=top.rows)
    file = laid_out(source, name, form)
    sure = (*file.sure, *(("heading",) if top.sure else ()))
    look = _look(file, sample, sure, ())
    found = _marks(look, source)
    form = replace(file.form, decimal=found.decimal, thousands=found.thousands)
    questions = (*_about_form(look), *_about_marks(found), *_about_units(look))
    return replace(look, form=form, questions=questions)


def _look(
    file: Layout, sample: int, sure: tuple[str, ...], questions: tuple[Question, ...]
) -> Reading:
    found = files.problems_of(file)
    return Reading(
        name=file.name,
        form=file.form,
        columns=file.columns,
        rows=file.first_rows(sample),
        row_count=file.row_count,
        delimiter=file.form.delimiter,
        delimiter_name=NAMES.get(file.form.delimiter, ""),
        encoding=file.encoding,
        sure=sure,
        sheets=file.tabs,
        top=file.top,
        questions=questions,
        problems=errors_of(found),
        file=file,
    )


def _marks(look: Reading, source: Opened) -> Marks:
    """Marks of the numbers of all columns that hold numbers; of a workbook only those that stand
    there as texts have marks."""
    if source.tabs:
        return marks(source.texts)
    texts: dict[str, None] = {}
    for column in filter(None, look.columns):
        first = [value for value in look.values(column) if value]
        if first and 2 * sum(map(is_number, first)) > len(first):
            texts.update(dict.fromkeys(look.distinct(column)))
    return marks(texts)


def _about_form(look: Reading) -> Iterator[Question]:
    shown = "; ".join(" | ".join(row) for row in look.rows[:1])[:80]
    if look.form.encoding and "encoding" not in look.sure:
        known = tuple(ENCODINGS)
        yield Question("encoding", look.form.encoding, known, values={"example": shown})
    if "delimiter" not in look.sure and not look.problems:
        choices = tuple(NAMES)
        yield Question("delimiter", look.delimiter, choices, values={"example": shown})
    if look.sheets and "sheet" not in look.sure:
        yield Question("sheet", look.form.sheet, tuple(tab.name for tab in look.sheets))
    if "heading" not in look.sure and not look.problems:
        proposal = str(look.form.heading)
        yield Question("heading", proposal, (), values={"example": shown})


def _about_marks(found: Marks) -> Iterator[Question]:
    """Asked wherever a mark stands in a number, even where only one reading is possible."""
    if not found.example:
        return
    other_decimal, other_thousands = found.otherwise
    values = {
        "example": found.example,
        "thousands": found.thousands,
        "other": other_decimal,
        "other_thousands": other_thousands,
    }
    yield Question("decimal", found.decimal, (".", ","), likely=found.sure, values=values)


def _about_units(look: Reading) -> Iterator[Question]:
    for column in look.columns:
        if unit := suggested(column):
            yield Question("units", unit, (), column=column, likely=False)
