"""Wide tables: headings that are ages, sexes, years, or several of these at once, or causes."""

import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations, pairwise

from server.intake.folding import folded
from server.intake.labels import read_age, read_sex, read_year
from server.intake.recognising.causes import are_causes, is_cause
from server.intake.recognising.names import is_rate, named, number_named

KINDS = ("year", "sex", "age", "number")  # a heading says each at most once
DOUBTFUL = ("h", "v")  # men in one language, women or nothing in another: which is asked
LONGEST = 9  # pieces of a heading that are tried together
_PIECES = re.compile(r"\d+|[^\W\d_]+|[+<>≥&]+")
_COUNTED = ("deaths", "population", "births", "stillbirths", "neonatal_deaths")


@dataclass(frozen=True, slots=True)
class Across:
    """Which headings carry values: as `across` and `across_columns` of a form."""

    fields: tuple[str, ...]  # year, sex, age, number; or cause alone
    columns: tuple[tuple[str, ...], ...]  # a heading, and its value in each field


def _year(text: str) -> str:
    year = read_year(text)
    return str(year) if year else ""


def _sex(text: str) -> str:
    return text if read_sex(text) or folded(text) in DOUBTFUL else ""


def _age(text: str) -> str:
    return text if read_age(text) else ""


def _number(text: str) -> str:
    return "" if is_rate(text) else named(text, _COUNTED)


_READ: dict[str, Callable[[str], str]] = {
    "year": _year,
    "sex": _sex,
    "age": _age,
    "number": _number,
}


def meanings(heading: str) -> Iterator[dict[str, str]]:
    """Every way in which a whole heading can be read as some of the kinds.

    >>> list(meanings("Males 0-4"))
    [{'sex': 'Males', 'age': '0-4'}]
    """
    for kind in KINDS:
        if found := _READ[kind](heading):
            yield {kind: found}
    pieces = list(_PIECES.finditer(heading))
    if 1 < len(pieces) <= LONGEST:
        for count in (2, 3, 4):
            for cuts in combinations(range(1, len(pieces)), count - 1):
                yield from _read_pieces(heading, pieces, (0, *cuts, len(pieces)))


def _read_pieces(
    heading: str, pieces: list[re.Match[str]], cuts: tuple[int, ...]
) -> Iterator[dict[str, str]]:
    found: dict[str, str] = {}
    for first, last in pairwise(cuts):
        text = heading[pieces[first].start() : pieces[last - 1].end()]
        kind, value = next(_kinds(text, found), ("", ""))
        if not kind:
            return
        found[kind] = value
    yield {kind: found[kind] for kind in KINDS if kind in found}


def _kinds(text: str, taken: dict[str, str]) -> Iterator[tuple[str, str]]:
    """A kind that a piece can be, not one that another piece is; "0_4" is read as "0-4"."""
    for kind in KINDS:
        for spelt in (text, text.replace("_", " "), re.sub(r"[_.]", "-", text)):
            if kind not in taken and (value := _READ[kind](spelt)):
                yield kind, value


def across(columns: Sequence[str], numeric: Callable[[str], bool]) -> Across | None:
    """The columns that stand for ages, sexes or years; None where a table is long.

    At least two of them, all of the same kinds. `numeric` says whether a column holds numbers.
    """
    return next(iter(every_across(columns, numeric)), None)


def every_across(columns: Sequence[str], numeric: Callable[[str], bool]) -> tuple[Across, ...]:
    """Every way to read some columns as standing for the same kinds, that of most columns first."""
    read = {
        column: [found for found in meanings(column) if set(found) - {"number"}]
        for column in dict.fromkeys(columns)
        if column and not is_rate(column) and numeric(column)
    }
    ways = []
    for signature in {tuple(found) for each in read.values() for found in each}:
        taken = tuple(
            (column, *found.values())
            for column, each in read.items()
            if (found := next((one for one in each if tuple(one) == signature), None))
        )
        said = {tuple(map(folded, row[1:])) for row in taken}
        if len(taken) > 1 and len(said) == len(taken):  # two that say the same mean something else
            ways.append(Across(signature, taken))
    causes = [one for one in dict.fromkeys(columns) if one and is_cause(one) and numeric(one)]
    if are_causes(causes):
        ways.append(Across(("cause",), tuple((one, one) for one in causes)))
    return tuple(sorted(ways, key=lambda way: (-len(way.columns), len(way.fields), way.fields)))


def number_of(texts: Sequence[str]) -> str:
    """The count that the texts around a table name, its title, sheet or file, the nearest first."""
    return next((number for text in texts if (number := number_named(text))), "")
