"""Wide tables: ages, sexes, years or kinds of counts that stand in headings, made long."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from server.intake.forms.found import Found
from server.intake.mapping import NUMBERS, Form, numbers_of
from server.intake.problems import Fault, Text

FIELDS = ("age", "sex", "year", "cause", "number")


@dataclass(frozen=True, slots=True)
class Group:
    """Columns whose headings say the same age, sex and year: one count of each kind."""

    values: tuple[str, ...]  # of the fields across, without the number
    columns: dict[str, str]  # heading by number


@dataclass(frozen=True, slots=True)
class Spread:
    """How one row of a wide file becomes several."""

    fields: tuple[str, ...]  # across, without the number
    groups: tuple[Group, ...]

    @property
    def numbers(self) -> tuple[str, ...]:
        return tuple(dict.fromkeys(number for group in self.groups for number in group.columns))

    @property
    def columns(self) -> tuple[str, ...]:
        return tuple(column for group in self.groups for column in group.columns.values())

    def headings(self, number: str) -> tuple[str, ...]:
        """Column of a kind of count in each group; '' where it has none."""
        return tuple(group.columns.get(number, "") for group in self.groups)

    def heading(self, group: int, number: str) -> str:
        """Heading of a kind of count in a group, or of the first there is."""
        columns = self.groups[group].columns
        return columns.get(number) or next(iter(columns.values()))

    def texts(self, field: str) -> tuple[str, ...]:
        """Value of a field in each group."""
        place = self.fields.index(field)
        return tuple(group.values[place] for group in self.groups)


def spread(form: Form) -> Spread | None:
    """Groups of columns in the order of their first headings; None: the table is long."""
    if not form.across or not sound(form):
        return None
    place = form.across.index("number") if "number" in form.across else -1
    groups: dict[tuple[str, ...], dict[str, str]] = {}
    for heading, *values in form.across_columns:
        number = values.pop(place) if place >= 0 else form.across_number
        groups.setdefault(tuple(values), {})[number] = heading
    return Spread(
        fields=tuple(field for field in form.across if field != "number"),
        groups=tuple(Group(values, columns) for values, columns in groups.items()),
    )


def sound(form: Form) -> bool:
    """Whether each heading has one value for each matter that stands in headings."""
    return all(len(column) == len(form.across) + 1 for column in form.across_columns)


def wrong(form: Form, role: str, taken: Sequence[str]) -> Iterator[Found]:
    """What keeps a table from being made long; `taken` are the fields that columns hold."""

    def found(what: str, heading: str = "") -> Found:
        return Found("bad_across", Fault(column=heading, values={"what": what}))

    if not form.across:
        if form.across_columns:
            yield found(Text("headings with a meaning, and no matter said to stand in headings"))
        return
    if set(form.across) - set(FIELDS) or len(set(form.across)) != len(form.across):
        yield found(Text("a matter that cannot stand in headings, or one named twice"))
        return
    if not sound(form):
        yield found(Text("a heading without a value for each matter"))
        return
    if not form.across_columns:
        yield found(Text("no heading whose meaning is said"))
        return
    for field in form.across:
        if field in taken:
            yield found(Text("a matter that stands in headings and elsewhere too"), field)
    numbers = {form.across_number}
    if "number" in form.across:
        place = form.across.index("number") + 1
        numbers = {column[place] for column in form.across_columns}
    for number in sorted(numbers - set(numbers_of(role))):
        yield found(Text("a number that this kind of file does not hold"), number)
    for number in NUMBERS:
        if number in taken:
            yield found(Text("a number in one column beside headings that part it"), number)
    cells = [column[1:] for column in form.across_columns]
    if len(set(cells)) < len(cells):
        doubled = next(cell for cell in cells if cells.count(cell) > 1)
        yield found(Text("two headings that mean the same"), " ".join(doubled))
