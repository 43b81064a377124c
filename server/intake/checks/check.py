"""What an entry of the registry of checks is."""

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, replace
from typing import Generic, TypeVar

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from server.intake.problems import Fault, Kind, Problem

Subject = TypeVar("Subject")
LISTED = 20  # different values listed one by one; what follows is gathered in one more line


@dataclass(frozen=True, slots=True)
class Marks:
    """Rows that fail a check, and what is found in them."""

    column: str
    failing: NDArray[np.bool_]  # [row]
    found: dict[str, NDArray[np.object_]]  # texts of the failing rows, by their name in the kind


@dataclass(frozen=True, slots=True, kw_only=True)
class Check(Kind, Generic[Subject]):
    """A check of a whole: yields its faults."""

    find: Callable[[Subject], Iterable[Fault]]

    def problems(self, subject: Subject, file: str = "") -> list[Problem]:
        return [Problem.of(self, fault, file) for fault in listed(self.find(subject))]


@dataclass(frozen=True, slots=True, kw_only=True)
class RowCheck(Kind, Generic[Subject]):
    """A check of rows: marks those that fail. Rows that share what was found share a problem."""

    mark: Callable[[Subject], Iterable[Marks]]

    def problems(self, marks: Marks, rows: NDArray[np.int64], file: str) -> list[Problem]:
        """`rows` are the row numbers in the file of all rows marked over."""
        return [Problem.of(self, fault, file) for fault in gathered(marks, rows[marks.failing])]


def listed(faults: Iterable[Fault]) -> list[Fault]:
    """The first LISTED faults and, of the rest, one that counts them; it names rows where all of
    them stand in one column of one file."""
    kept = list(faults)
    if len(kept) <= LISTED + 1:
        return kept
    first, rest = kept[LISTED], kept[LISTED:]
    rows = [row for fault in rest for row in (fault.row, fault.last_row) if row is not None]
    if len({(fault.file, fault.column) for fault in rest}) > 1:
        first, rows = replace(first, file="", column=""), []
    return [
        *kept[:LISTED],
        replace(
            first,
            row=min(rows, default=None),
            last_row=max(rows, default=None),
            rows=sum(fault.rows for fault in rest),
            others=sum(1 + fault.others for fault in rest) - 1,
        ),
    ]


def several(found: NDArray[np.int64], fault: Callable[[int], Fault]) -> Iterator[Fault]:
    """A fault of each of these, made for no more than are listed: the last stands for the rest."""
    shown = found[: LISTED + 1].tolist()
    rest = len(found) - len(shown)
    for at in shown[: len(shown) if not rest else -1]:
        yield fault(at)
    if rest:
        last = fault(shown[-1])
        yield replace(last, rows=last.rows * (1 + rest), others=rest)


def gathered(marks: Marks, rows: NDArray[np.int64], file: str = "") -> list[Fault]:
    """Faults by what was found, in the order of their first rows; at most LISTED and one more."""
    if not len(rows):
        return []
    table = pd.DataFrame({"row": rows, **marks.found})
    names = list(marks.found)
    table = table.sort_values("row", kind="stable")
    if names:
        groups = table.groupby(names, sort=False, dropna=False)["row"].agg(["min", "max", "size"])
        values = [key if isinstance(key, tuple) else (key,) for key in groups.index]
    else:
        groups = table["row"].agg(["min", "max", "size"]).to_frame().T
        values = [()]
    limits = groups.to_numpy(int)
    return listed(
        Fault(
            column=marks.column,
            file=file,
            row=int(first),
            last_row=int(last),
            rows=int(count),
            values=dict(zip(names, found, strict=True)),
        )
        for (first, last, count), found in zip(limits, values, strict=True)
    )
