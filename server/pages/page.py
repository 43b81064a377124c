"""What every page carries, as data, before it is HTML."""

from dataclasses import dataclass, field
from typing import ClassVar, Literal

from server.charts.chart import Chart
from server.exports.table import Table
from server.sentences.pieces import Piece, Sentence

__all__ = ["Caution", "Frame", "Notice", "Page", "Piece", "Sentence"]


@dataclass(frozen=True, slots=True)
class Notice:
    """A hanging word between two rubric hairlines: newer edition, withdrawn, engine changed."""

    word: str
    text: Sentence


@dataclass(frozen=True, slots=True)
class Caution:
    word: str
    text: str
    beside: bool = False  # told with the answer, since it is about the very figures there


@dataclass(frozen=True, slots=True)
class Frame:
    """What stands round every page."""

    title: str  # of the document
    address: str  # canonical, as in the colophon
    locator: Sentence
    shown: str = ""  # at the locator's right: "Figures as released"
    nav: Literal["", "collections", "methods", "upload", "words"] = ""
    notices: tuple[Notice, ...] = ()
    colophon: tuple[
        tuple[str, str], ...
    ] = ()  # term and text: edition, settings; address and engine are added


@dataclass(frozen=True, slots=True, kw_only=True)
class Page:
    """One question answered. Twins and HTML are written from `tables`."""

    template: ClassVar[str]
    # blocks, each the inside of the element of its name, that go along when another is asked for
    out_of_band: ClassVar[tuple[str, ...]] = ()
    frame: Frame
    answer: Sentence
    lead: tuple[Sentence, ...] = ()
    tables: tuple[Table, ...] = ()
    charts: tuple[Chart, ...] = ()
    cautions: tuple[Caution, ...] = ()
    twins: dict[str, str] = field(
        default_factory=dict
    )  # 'csv', 'xlsx', 'json' -> address; csv lacks &table=

    def table(self, key: str) -> Table:
        """The table of this key; KeyError lists the keys."""
        for table in self.tables:
            if table.key == key:
                return table
        raise KeyError(f"{key!r}: this page has the tables {[table.key for table in self.tables]}")

    def chart(self, key: str) -> Chart:
        """The chart of this key; KeyError lists the keys."""
        for chart in self.charts:
            if chart.key == key:
                return chart
        raise KeyError(f"{key!r}: this page has the charts {[chart.key for chart in self.charts]}")
