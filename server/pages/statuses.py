"""The marks of a page's numbers (server/exports/status.py): which rest on estimates, are
provisional, revised, or the first after a break."""

from collections.abc import Mapping
from dataclasses import dataclass, replace

from server.exports import status
from server.exports.table import Row, Table
from server.results.holdings import Holdings
from server.results.loading import Loaded
from server.results.questions import PopulationYear


@dataclass(frozen=True, slots=True)
class Marks:
    """Of one population-year: of what is worked out, and of counts as they were handed in."""

    figures: str
    counts: str
    revised: bool = False

    def beside(self, other: "Marks") -> "Marks":
        """Of what is worked out from both."""
        return Marks(
            status.first_of(self.figures, other.figures),
            status.first_of(self.counts, other.counts),
            self.revised or other.revised,
        )


def marks(held: Holdings, one: PopulationYear, loaded: Loaded) -> Marks:
    counts = status.first_of(
        status.BREAK if held.broken(one) else "",
        status.ESTIMATED if loaded.estimated or loaded.rounded else "",
        status.PROVISIONAL if loaded.status == "provisional" else "",
    )
    figures = status.first_of(counts, status.ESTIMATED if loaded.protected else "")
    return Marks(figures, counts, one in held.revised)


def marked(table: Table, of: Marks, columns: Mapping[str, Marks] | None = None) -> Table:
    """The table with a mark on every number; `columns` are those of another population-year, by the
    beginning of their keys."""
    own = []
    for column in table.columns:
        chosen = next((m for key, m in (columns or {}).items() if column.key.startswith(key)), of)
        own.append(chosen.counts if column.counted else chosen.figures)

    def row(one: Row) -> Row:
        return replace(one, marks=tuple(own), revised=one.revised or of.revised)

    return replace(
        table,
        rows=tuple(row(one) for one in table.rows),
        total=row(table.total) if table.total else None,
    )
