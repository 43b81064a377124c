"""Checks of rows by cause: is the cause known, and can it be one of this sex and age."""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from engine.panel import SEXES
from server.intake.causes.items import ALL
from server.intake.causes.limits import ages_of, sexes_of
from server.intake.causes.parting import Rows
from server.intake.cells import UNREADABLE, Flags
from server.intake.checks.check import Marks, RowCheck


def _marks(rows: Rows, failing: Flags, **found: NDArray[np.object_]) -> Iterator[Marks]:
    if failing.any():
        sheet = rows.cells.sheet
        column = sheet.mapping.cause or sheet.mapping.column("deaths")
        yield Marks(column, failing, {"text": sheet.labels["cause"].at(failing), **found})


def _unknown(rows: Rows) -> Iterator[Marks]:
    yield from _marks(rows, rows.item == UNREADABLE)


def _twice(rows: Rows) -> Iterator[Marks]:
    """Rows of the same area, sex, year, age and cause as a row before."""
    key = rows.cell * len(rows.items) + rows.item
    known = np.flatnonzero(rows.item >= 0)
    _, first = np.unique(key[known], return_index=True)
    failing = np.zeros(len(key), bool)
    failing[known] = True
    failing[known[first]] = False
    yield from _marks(rows, failing)


def _spans(rows: Rows) -> Iterator[Marks]:
    """Ranges of several causes of the list where the file has none of these by itself."""
    items = rows.items
    at = np.unique(rows.item[rows.item >= 0])
    alone = [one for one in at[items.beside[at]].tolist() if not items.members(one, at).size]
    yield from _marks(rows, np.isin(rows.item, alone))


def _group_alone(rows: Rows) -> Iterator[Marks]:
    """Groups of the list of whose causes the file has none."""
    items = rows.items
    at = np.unique(rows.item[rows.item >= 0])
    inner = at[(at > ALL) & (at <= items.entries) & ~items.is_leaf[at]]
    above = np.unique(np.concatenate([np.zeros(0, np.int64), *items.ancestors(at)]))
    yield from _marks(rows, np.isin(rows.item, np.setdiff1d(inner, above)))


def _some(rows: Rows) -> Flags:
    """Rows with deaths of a known cause."""
    return np.asarray((rows.item >= 0) & (rows.cells.sheet.numbers["deaths"].values > 0))


def _not_underlying(rows: Rows) -> Iterator[Marks]:
    yield from _marks(rows, _some(rows) & (rows.items.kinds()[rows.item] == "not_underlying"))


def _wrong_sex(rows: Rows) -> Iterator[Marks]:
    only = sexes_of(rows.items)[rows.item]
    other = (only >= 0) & (rows.cells.sex != only) & (rows.cells.sex < SEXES.index("p"))
    failing = _some(rows) & other
    sex = np.array(SEXES, object)[rows.cells.sex[failing]]
    yield from _marks(rows, failing, sex=sex)


def _wrong_age(rows: Rows) -> Iterator[Marks]:
    first, last = ages_of(rows.items)
    cells = rows.cells
    # beside groups with an end, a label without one is a single year of age
    end = np.where((cells.end < 0) & (cells.end >= 0).any(), cells.start, cells.end)
    early = (end >= 0) & ~cells.open & (end < first[rows.item])
    failing = _some(rows) & (cells.start >= 0) & (early | (cells.start > last[rows.item]))
    labels = cells.sheet.labels.get("age")
    if labels is not None:
        yield from _marks(rows, failing, age=labels.at(failing))


def _people_differ(rows: Rows) -> Iterator[Marks]:
    """Rows of a cell with other people than its first row."""
    numbers = rows.cells.sheet.numbers.get("population")
    if numbers is None:
        return
    first = numbers.values[rows.head][rows.cell]
    failing = np.isfinite(first) & np.isfinite(numbers.values) & (numbers.values != first)
    if failing.any():
        found = {"text": numbers.at(failing)}
        yield Marks(rows.cells.sheet.mapping.column("population"), failing, found)


CHECKS: tuple[RowCheck[Rows], ...] = (
    RowCheck(
        key="unknown_cause",
        severity="error",
        meaning="A cause of death is neither a code of the list, nor one of its entries, nor a "
        "word for all causes or for an unknown cause.",
        found="“{text}”",
        expected="a code that some entry of the list holds, or the code or name of an entry",
        remedy="Correct the code; choose another list of causes, or hand in your own. Where the "
        "cause is not known, write: cause not stated.",
        mark=_unknown,
    ),
    RowCheck(
        key="cause_twice",
        severity="error",
        meaning="The same area, sex, year, age and cause stands in the file twice.",
        found="“{text}” a second time",
        expected="one row for each area, sex, year, age and cause",
        remedy="Take one of the rows out; add up rows that were split by another column.",
        mark=_twice,
    ),
    RowCheck(
        key="range_of_several_causes",
        severity="error",
        meaning="A range of codes holds several causes of the list, and the file does not part it.",
        found="“{text}”",
        expected="codes or ranges that fall into one cause each",
        remedy="Choose a list in which the range is one cause, hand in your own, or give the "
        "causes it holds.",
        mark=_spans,
    ),
    RowCheck(
        key="group_alone",
        severity="error",
        meaning="A group of the list of causes is given, and none of the causes that make it up.",
        found="“{text}” alone",
        expected="the causes of the group",
        remedy="Give the causes of the group, or hand in a list of your own in which it is one "
        "cause.",
        mark=_group_alone,
    ),
    RowCheck(
        key="people_by_cause_differ",
        severity="error",
        meaning="Rows of one area, sex, year and age differ in their people. People are those of "
        "all causes and stand once, or the same beside each cause.",
        found="{text}",
        expected="the number that stands beside the first cause",
        remedy="Give the people of all causes beside each cause, or in one row only.",
        mark=_people_differ,
    ),
    RowCheck(
        key="not_underlying_cause",
        severity="warning",
        meaning="A code says the nature of an injury, or why health services were used, and not "
        "what led to the death. Such deaths stay with the codes that are no underlying cause.",
        found="deaths under “{text}”",
        expected="the underlying cause, such as the fall and not the fracture",
        remedy="Ask who coded the deaths for the external cause (V01–Y89).",
        source="World Health Organization (2011), ICD-10, Volume 2, sections 4.1 and 4.2",
        mark=_not_underlying,
    ),
    RowCheck(
        key="cause_of_other_sex",
        severity="warning",
        meaning="A cause stands with a sex that it cannot befall.",
        found="deaths from “{text}”, sex {sex}",
        expected="such deaths of the other sex alone",
        remedy="Look whether the sex or the cause is wrong; it may be a shifted column.",
        source="World Health Organization (2011), ICD-10, Volume 2, categories limited to one sex",
        mark=_wrong_sex,
    ),
    RowCheck(
        key="cause_at_odd_age",
        severity="warning",
        meaning="A cause stands with an age at which it cannot, or hardly can, lead to a death: "
        "childbirth at 70, a condition of the first days at 10.",
        found="deaths from “{text}” at age {age}",
        expected="an age at which the cause can be",
        remedy="Look whether the age or the cause is wrong; late effects have codes of their own.",
        mark=_wrong_age,
    ),
)
