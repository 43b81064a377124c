"""A table of breaks as it is meant."""

from collections.abc import Iterable

from server.intake.areas import is_code
from server.intake.labels import read_year
from server.intake.lists import Line, SmallTable, number
from server.store.records import BREAKS, Break

NONE = "none"  # kind of a row that ends the breaks of its area, year and cause


def read_line(line: Line) -> Break | None:
    """A row; None where some field of it cannot be read."""
    ratio, error = (number(line[field]) for field in ("ratio", "ratio_error"))
    sound = (
        (not line["area"] or is_code(line["area"]))
        and str(read_year(line["year"])) == line["year"]
        and line["kind"] in (*BREAKS, NONE)
        and (not line["cause"] or is_code(line["cause"]))
        and (not line["ratio"] or (ratio is not None and ratio > 0))
        and (not line["ratio_error"] or (error is not None and error >= 0))
    )
    if not sound:
        return None
    return Break(
        area=line["area"],
        period=line["year"],
        kind=line["kind"],
        cause=line["cause"],
        note=line["note"],
        ratio=ratio,
        ratio_error=error,
    )


def read_lines(table: SmallTable) -> tuple[tuple[int, Break], ...]:
    """Each row that can be read, with its number."""
    found = ((line.row, read_line(line)) for line in table.lines)
    return tuple((row, one) for row, one in found if one is not None)


def ended(said: Iterable[Break], base: Iterable[Break]) -> tuple[Break, ...]:
    """Those of the base that a row of the kind NONE ends: all of its area, year and cause.

    >>> old = Break("", "2012", "population")
    >>> ended([Break("", "2012", NONE)], [old]) == (old,)
    True
    """
    rows = {(one.area, one.period, one.cause) for one in said if one.kind == NONE}
    return tuple(one for one in base if (one.area, one.period, one.cause) in rows)


def new(said: Iterable[Break]) -> tuple[Break, ...]:
    """Those to be kept: without the rows that only end others."""
    return tuple(one for one in said if one.kind != NONE)
