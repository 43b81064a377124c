"""Where a count of a wide table stands: row of the file and group of columns in one number.

Row numbers go through reading, sorting and checking as whole numbers. A row of a wide table holds
many counts, so each is known by its row and its group of columns, packed into one number that
sorts as the file reads; problems of such a file are put back into rows and headings at the end.
"""

from collections.abc import Mapping
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from server.intake.forms.across import Spread
from server.intake.problems import Problem

GROUPS = 1 << 16
WIDE = 1 << 48  # above every row number, so that an address is never taken for one


def addresses(rows: NDArray[np.int64], groups: int) -> NDArray[np.int64]:
    """Address of each group of each row, row by row."""
    return (WIDE + rows[:, None] * GROUPS + np.arange(groups)).ravel()


def placed(problem: Problem, wide: Mapping[str, Spread]) -> Problem:
    """A problem with the rows and the heading of its file; `wide` are the files that were made
    long, by the names that problems have for them."""
    spread = wide.get(problem.file)
    if spread is None or problem.row is None or problem.row < WIDE:
        return problem
    row, first = divmod(problem.row - WIDE, GROUPS)
    last_row, last = divmod((problem.last_row or problem.row) - WIDE, GROUPS)
    if problem.column and problem.column not in spread.numbers:
        # a column beside those spread: each of its rows came once for every group
        rows = max(problem.rows // len(spread.groups), 1)
        return replace(problem, row=row, last_row=last_row, rows=rows)
    one, other = (spread.heading(group, problem.column) for group in (first, last))
    column = one if one == other else f"{one} … {other}"
    return replace(problem, row=row, last_row=last_row, column=column)
