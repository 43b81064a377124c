"""How a page shows what is withheld: gaps in tables by age, fixed decimals, words and ways out."""

from collections.abc import Iterable, Sequence
from dataclasses import replace

import numpy as np

from server.charts.chart import Chart
from server.charts.chart import Sequence as Drawn
from server.exports.table import Cell, Column, Row, Table
from server.results.loading import Loaded
from server.sentences import withholding as say
from server.sentences.basis import Told

DIGITS = 4  # of a drawn number that rests on stand-ins


def tables_given(tables: Iterable[Table], *sides: Loaded | None) -> tuple[Table, ...]:
    """Tables as they are; where a population they rest on is protected, to the printed decimals."""
    if not protected(sides):
        return tuple(tables)
    return tuple(_to_print(table) for table in tables)


def charts_given(charts: Iterable[Chart], *sides: Loaded | None) -> tuple[Chart, ...]:
    """Pictures as they are; where a population they rest on is protected, to a few digits."""
    if not protected(sides):
        return tuple(charts)
    return tuple(
        replace(
            chart,
            series=tuple(
                replace(one, y=_short(one.y), low=_short(one.low), high=_short(one.high))
                for one in chart.series
            ),
        )
        for chart in charts
    )


def protected(sides: Sequence[Loaded | None]) -> bool:
    return any(side is not None and side.protected for side in sides)


def caution(*sides: Loaded | None) -> Told:
    """What is withheld or rounded, and what that makes of the figures; None where nothing is."""
    known = [side for side in sides if side is not None]
    if not protected(known):
        return None
    ages = {
        (start, label)
        for side in known
        for start, label, gone in zip(
            side.panel.grid.starts,
            side.panel.grid.labels,
            side.withheld_on(side.panel.grid),
            strict=True,
        )
        if gone
    }
    base = max(side.rounded for side in known)
    # what is protected and not rounded is withheld
    only = any(side.protected and not side.rounded for side in known)
    told = say.withheld([label for _start, label in sorted(ages)]) if ages or only else None
    return say.rounded(base, told) if base else told


def _to_print(table: Table) -> Table:
    return replace(
        table,
        rows=tuple(_row_to_print(row, table.columns) for row in table.rows),
        total=_row_to_print(table.total, table.columns) if table.total else None,
    )


def _row_to_print(row: Row, columns: Sequence[Column]) -> Row:
    cells = tuple(
        _cell_to_print(cell, column, row) for cell, column in zip(row.cells, columns, strict=True)
    )
    return replace(row, cells=cells, estimated=True)


def _cell_to_print(cell: Cell, column: Column, row: Row) -> Cell:
    if not isinstance(cell, float) or column.decimals is None:
        return cell
    return float(round(cell, column.decimals if row.decimals is None else row.decimals))


def _short(column: Drawn) -> Drawn:
    return tuple(
        None
        if one is None
        else float(
            np.format_float_positional(one, precision=DIGITS, fractional=False, unique=False)
        )
        for one in column
    )
