"""What kind of file it is: the role it plays in an upload, told by what it holds."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from server.intake.lists import role_of
from server.intake.mapping import NUMBERS, Form
from server.intake.reading import Reading, proposed
from server.intake.recognising.across import number_of
from server.intake.recognising.columns import ways
from server.intake.recognising.names import is_rate, named, suggests

COLUMNS_SAY = "its columns say so"
TITLE_SAYS = "its title, sheet or name says so"


@dataclass(frozen=True, slots=True)
class Kind:
    """A role, empty where it cannot be told. The reason is a text of the catalogue."""

    role: str
    why: str = ""
    sheet: str = ""  # the one that holds it, of a workbook with sheets of several kinds


@dataclass(frozen=True, slots=True)
class Sorted:
    files: tuple[tuple[str, str, bytes], ...]  # role, name, content
    twice: tuple[tuple[str, str], ...] = ()  # a role and the name of one more file that has it


def kinds(content: bytes, name: str) -> tuple[Kind, ...]:
    """What a file holds; several where the sheets of a workbook play different roles, each once.

    Of other workbooks the sheet is to be chosen, and they are one file.
    """
    first = proposed(content, name, Form())
    shown = [tab.name for tab in first.sheets if not tab.hidden and tab.rows > 1]
    if len(shown) > 1:
        parts = [(kind(proposed(content, name, Form(sheet=sheet))), sheet) for sheet in shown]
        told = [(part, sheet) for part, sheet in parts if part.role]
        if len(told) > 1 and len({part.role for part, _ in told}) == len(told):
            return tuple(Kind(part.role, part.why, sheet) for part, sheet in told)
    return (kind(first),)


def sorted_out(files: Sequence[tuple[str, bytes]], taken: Iterable[str] = ()) -> Sorted:
    """Each file by what it holds. A file that does not tell takes a place that is left, deaths
    first; which it is, is then asked."""
    placed: list[tuple[str, str, bytes]] = []
    free = [role for role in ("deaths", "population", "counts", "births") if role not in taken]
    untold, twice = [], []
    for name, content in files:
        for found in kinds(content, name):
            if not found.role:
                untold.append((name, content))
            elif found.role in {*taken, *(role for role, _, _ in placed)}:
                twice.append((found.role, name))
            else:
                placed.append((found.role, name, content))
    told = {role for role, _, _ in placed}
    left = [role for role in free if role not in told]
    placed += [(role, *file) for role, file in zip(left, untold, strict=False)]
    twice += [(left[-1] if left else "", name) for name, _ in untold[len(left) :]]
    return Sorted(tuple(placed), tuple(twice))


def kind(reading: Reading) -> Kind:
    """By the columns, else by the words around the table."""
    if role := role_of(reading.columns):
        return Kind(role, COLUMNS_SAY)
    if role := _role(_counted(reading)):
        return Kind(role, COLUMNS_SAY)
    titles = (" ".join(row) for row in reversed(reading.top))
    role = _role({number_of((reading.form.sheet, *titles, reading.name))})
    return Kind(role, TITLE_SAYS) if role else Kind("")


def _counted(reading: Reading) -> set[str]:
    """The numbers that the headings name."""
    columns = [column for column in reading.columns if column]
    found = {_number(column) for column in columns}
    for way in ways(reading)[:1]:
        if "number" in way.fields:
            place = way.fields.index("number") + 1
            found |= {row[place] for row in way.columns}
    return found - {""}


def _number(column: str) -> str:
    if is_rate(column):
        return "rate"
    counts = tuple(number for number in NUMBERS if number != "rate")
    return named(column, counts) or suggests(column, counts)


def _role(numbers: set[str]) -> str:
    """The role of a file that holds these numbers. Births come with deaths of infants, rates with
    the people they are of; rates beside deaths are not needed."""
    if "births" in numbers:
        return "births"
    if {"deaths", "population"} <= numbers:
        return "counts"
    if "rate" in numbers and "deaths" not in numbers:
        return "rates"
    return next((role for role in ("deaths", "population") if role in numbers), "")
