"""What a chart says and shows, before any drawing library: the figure (and later other drawings) is
made from this record, and its words become HTML."""

from dataclasses import dataclass, field
from typing import Literal

Sequence = tuple[float | None, ...]


@dataclass(frozen=True, slots=True)
class At:
    """Where a series' label or a note stands, in data units; narrow_* for the phone."""

    x: float
    y: float
    side: Literal["left", "right", "center"] = "left"
    dx: int = 0
    dy: int = 0
    narrow_x: float | None = None
    narrow_y: float | None = None


@dataclass(frozen=True, slots=True)
class Series:
    label: str
    x: tuple[float, ...]
    y: Sequence  # None: a gap, never bridged
    draw: Literal["line", "needles", "bars", "dots", "reaches", "squares"] = "line"
    sex: Literal["f", "m", "p"] = "f"  # gives the dash of a line
    role: str = "s1"  # colour token s1 ... s7; this is s1, that is s2
    weight: Literal["this", "that", "one", "many"] = "one"
    low: Sequence = ()
    high: Sequence = ()
    widths: tuple[float, ...] = ()  # of bars, in units of x; of squares their sides, px
    at: At | Literal["end"] | None = None  # where the label stands; None: not labelled
    short: str = ""  # label at line's end on the phone
    name: str = ""  # in the hover label, where the label on the chart says more than who
    names: tuple[str, ...] = ()  # one name a point, for the hover label
    provisional: tuple[bool, ...] = ()  # hollow points; of squares those below 0


@dataclass(frozen=True, slots=True)
class Mark:
    """A labelled tick on the x axis (mean, median, most common age)."""

    x: float
    label: str


@dataclass(frozen=True, slots=True)
class Drop:
    """A line dropped from a curve to the axis at one age, with its reading beside it."""

    x: float
    y: float
    label: str
    label_y: float


@dataclass(frozen=True, slots=True)
class Break:
    """A dated change that a line must not cross: a dotted vertical with words."""

    x: float
    label: str
    short: str


@dataclass(frozen=True, slots=True)
class Shock:
    """Years that no course is measured from or to: a hatched band with a word."""

    first: float  # where the band begins and ends, in data units
    last: float
    label: str
    short: str


@dataclass(frozen=True, slots=True)
class Note:
    text: str
    at: At


@dataclass(frozen=True, slots=True)
class Chart:
    key: str  # DOM id chart-<key>, file name of the picture
    finding: str  # the title: a sentence with its number
    unit: str  # the unit line; the page puts "Figure n." before it
    source: str
    x_kind: Literal["age", "year", "amount"]  # amount: rows, each reaching from 0 to its x
    x_range: tuple[float, float]
    y_title: str
    y_range: tuple[float, float]
    y_ticks: tuple[float, ...]
    series: tuple[Series, ...]
    described: str = ""  # the sentence for those who do not see the picture
    size: Literal["low", "std", "tall", "rows"] = "std"
    x_ticks: tuple[float, ...] = ()  # of amounts
    y_text: tuple[str, ...] = ()  # texts of the ticks
    y_log: bool = False
    hover: str = "%{x}: %{y}"
    table: str = ""  # key of the table that holds its numbers
    marks: tuple[Mark, ...] = ()
    marks_top: float = 0.0
    drops: tuple[Drop, ...] = ()
    between: tuple[int, int] | None = None  # series whose space between is hatched
    breaks: tuple[Break, ...] = ()
    shocks: tuple[Shock, ...] = ()
    foot_row: tuple[tuple[float, str], ...] = ()  # (x, text) under the bars
    foot_sum: str = ""
    notes: tuple[Note, ...] = field(default_factory=tuple)
