"""What intake found wrong: where, what was found, what was expected, what to do.

The texts of a problem are texts of the catalogue with their {values} beside them, so that a page
can put them into its reader's language; in plain English they are `found`, `expected`, `remedy`.
"""

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from typing import Literal, Protocol, cast

Severity = Literal["error", "warning"]
Value = str | int | float
Show = Callable[[int | float], str]


class Translate(Protocol):
    """The catalogue's own function, or `plain`."""

    def __call__(self, text: str, /, **values: object) -> str: ...


def figure(value: int | float) -> str:
    """A number as a file would write it."""
    return f"{value:.15g}"


def plain(text: str, /, **values: object) -> str:
    """The English text with its {names} filled in."""
    return text.format(**values) if values else text


class Text(str):
    """A text of the catalogue among the values of a problem, put into the reader's language when
    the problem is shown. As a plain text it is the English.

    >>> Text("hidden columns: {columns}", columns="B, C")
    'hidden columns: B, C'
    """

    text: str
    values: Mapping[str, "Value"]

    def __new__(cls, text: str, **values: "Value") -> "Text":
        made = super().__new__(cls, plain(text, **values))
        made.text, made.values = text, values
        return made

    def worded(self, translate: Translate) -> str:
        return translate(self.text, **_shown(self.values, translate, figure))


def _shown(values: Mapping[str, "Value"], translate: Translate, show: Show) -> dict[str, object]:
    """Values as they are put into a text."""
    return {
        name: value.worded(translate)
        if isinstance(value, Text)
        else value
        if isinstance(value, str)
        else show(value)
        for name, value in values.items()
    }


def _stored(value: "Value") -> object:
    if not isinstance(value, Text):
        return value
    return {"text": value.text, "values": {of: _stored(one) for of, one in value.values.items()}}


def _restored(value: object) -> "Value":
    if not isinstance(value, dict):
        return cast("Value", value)
    return Text(value["text"], **{of: _restored(one) for of, one in value["values"].items()})


@dataclass(frozen=True, slots=True, kw_only=True)
class Kind:
    """One entry of the registry of checks: what kind of problem it finds."""

    key: str
    severity: Severity
    meaning: str  # one sentence for the page that explains the checks
    found: str  # texts of a problem, filled from its values
    expected: str
    remedy: str
    why: str = ""  # what it guards against
    source: str = ""  # where the rule is published


@dataclass(frozen=True, slots=True, kw_only=True)
class Fault:
    """A place where a check failed; with its kind and file it becomes a problem."""

    column: str = ""
    file: str = ""  # empty: the file the check was asked about
    row: int | None = None  # as in the file, the heading being row 1
    last_row: int | None = None
    rows: int = 1  # how many rows share it
    others: int = 0  # further different values gathered under this one
    values: Mapping[str, Value] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Texts:
    found: str
    expected: str
    remedy: str


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing to put right (error) or to look at again (warning)."""

    key: str
    severity: Severity
    file: str
    row: int | None
    last_row: int | None
    column: str
    rows: int
    others: int
    texts: Texts
    values: Mapping[str, Value]

    @classmethod
    def of(cls, kind: Kind, fault: Fault, file: str = "") -> "Problem":
        return cls(
            key=kind.key,
            severity=kind.severity,
            file=fault.file or file,
            row=fault.row,
            last_row=fault.last_row,
            column=fault.column,
            rows=fault.rows,
            others=fault.others,
            texts=Texts(kind.found, kind.expected, kind.remedy),
            values=dict(fault.values),
        )

    def worded(self, translate: Translate = plain, show: Show = figure) -> Texts:
        """Found, expected and remedy in the reader's language; `show` prints the numbers."""
        values = _shown(self.values, translate, show)
        found = translate(self.texts.found, **values)
        if self.others:
            found = translate(
                "{found} and {count} other values", found=found, count=show(self.others)
            )
        return Texts(
            found,
            translate(self.texts.expected, **values),
            translate(self.texts.remedy, **values),
        )

    def rows_worded(
        self, translate: Translate = plain, show: Show = figure, *, named: bool = False
    ) -> str:
        """ "212", "418 to 430" or "9 between 12 and 301", and, if named, that these are rows; empty
        where no row is to blame."""
        if self.row is None:
            return ""
        last = self.row if self.last_row is None else self.last_row
        if last == self.row:
            text = "row {first}" if named else "{first}"
        elif self.rows == last - self.row + 1:
            text = "rows {first} to {last}" if named else "{first} to {last}"
        else:
            text = (
                "{count} rows between {first} and {last}"
                if named
                else ("{count} between {first} and {last}")
            )
        return translate(text, first=show(self.row), last=show(last), count=show(self.rows))

    def sentence(self, translate: Translate = plain, show: Show = figure) -> str:
        """The whole problem in one line, as a terminal or an error page prints it."""
        words = self.worded(translate, show)
        place = [self.file or translate("the upload")]
        if rows := self.rows_worded(translate, show, named=True):
            place.append(rows)
        if self.column:
            place.append(translate("column {column}", column=self.column))
        return translate(
            "{place}: found {found}, expected {expected}. {remedy}",
            place=", ".join(place),
            found=words.found,
            expected=words.expected,
            remedy=words.remedy,
        )

    @property
    def found(self) -> str:
        return self.worded().found

    @property
    def expected(self) -> str:
        return self.worded().expected

    @property
    def remedy(self) -> str:
        return self.worded().remedy

    def __str__(self) -> str:
        return self.sentence()

    def to_json(self) -> dict[str, object]:
        """Self-contained, so that an old report reads the same when the checks have changed."""
        return {
            "key": self.key,
            "severity": self.severity,
            "file": self.file,
            "row": self.row,
            "last_row": self.last_row,
            "column": self.column,
            "rows": self.rows,
            "others": self.others,
            "texts": [self.texts.found, self.texts.expected, self.texts.remedy],
            "values": {name: _stored(value) for name, value in self.values.items()},
        }

    @classmethod
    def from_json(cls, stored: Mapping[str, object]) -> "Problem":
        fields = dict(stored)
        fields["texts"] = Texts(*cast(list[str], fields["texts"]))
        values = cast(Mapping[str, object], fields["values"])
        fields["values"] = {name: _restored(value) for name, value in values.items()}
        return cls(**fields)  # type: ignore[arg-type]


def errors_of(problems: Iterable[Problem]) -> tuple[Problem, ...]:
    """Those that must be put right."""
    return tuple(problem for problem in problems if problem.severity == "error")
