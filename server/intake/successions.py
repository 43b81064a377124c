"""What becomes of the codes of areas: merged, shared out, or ended where new series begin."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from itertools import groupby

from engine.ages import AgeGrid
from server.intake.areas import is_code
from server.intake.labels import ALL_AGES, Age, read_age, read_sex, read_year
from server.intake.lists import Line, SmallTable, number
from server.store.records import Area, Break, Key

FIRST, LAST = "0000", "9999"  # years of a row that names none
# kinds of counts that a share may be stated for, and the measures they are
COUNTS = {
    "deaths": ("deaths", "counted_deaths"),
    "population": ("person_years",),
    "births": ("births", "stillbirths", "neonatal_deaths"),
}
_KIND_OF = {measure: kind for kind, measures in COUNTS.items() for measure in measures}


@dataclass(frozen=True, slots=True)
class Becoming:
    """One row: counts of `code` from `first` to `last` are counts of `becomes`."""

    row: int
    code: str
    becomes: str
    first: str
    last: str
    share: float | None  # None: not stated
    counts: str  # a key of COUNTS; empty: all
    sex: str  # f, m; empty: each
    age: Age | None  # None: all ages
    name: str
    parent: str

    @property
    def years(self) -> tuple[str, str]:
        return self.first, self.last


@dataclass(frozen=True, slots=True)
class Share:
    """Which part of some counts goes to a code, by age."""

    becomes: str
    counts: str  # empty: of all
    sex: str  # empty: of each
    grid: AgeGrid
    values: tuple[float, ...]  # [age]

    @property
    def whole(self) -> bool:
        return set(self.values) == {1.0}

    def reads(self, key: Key) -> bool:
        return self.counts in ("", _KIND_OF[key.measure]) and self.sex in ("", key.sex)


@dataclass(frozen=True, slots=True)
class Succession:
    """What becomes of one code in a run of years. Without shares: nothing, it has ended."""

    code: str
    first: str
    last: str
    becomes: tuple[str, ...]
    shares: tuple[Share, ...]

    @property
    def span(self) -> tuple[str, str]:
        """First and last year; empty where none is named."""
        return self.first.removeprefix(FIRST), self.last.removeprefix(LAST)

    @property
    def way(self) -> str:
        """merged, shared or ended."""
        if not self.shares:
            return "ended"
        return "merged" if all(share.whole for share in self.shares) else "shared"

    def covers(self, area: str, period: str) -> bool:
        return area == self.code and self.first <= period <= self.last

    def shares_of(self, key: Key) -> tuple[Share, ...]:
        """Those stated for just these counts before those for all."""
        fitting = [share for share in self.shares if share.reads(key)]
        own = [share for share in fitting if share.counts] or fitting
        return tuple([share for share in own if share.sex] or own)

    def by_sex(self, measure: str) -> bool:
        return any(one.sex and one.counts in ("", _KIND_OF[measure]) for one in self.shares)


@dataclass(frozen=True, slots=True)
class Successions:
    """All that a table of areas over time says."""

    of: tuple[Succession, ...] = ()
    areas: tuple[Area, ...] = ()  # the new codes

    def __bool__(self) -> bool:
        return bool(self.of)

    @property
    def codes(self) -> tuple[str, ...]:
        """The old codes, in order."""
        return tuple(sorted({one.code for one in self.of}))

    def find(self, area: str, period: str) -> Succession | None:
        return next((one for one in self.of if one.covers(area, period)), None)

    def before(self, area: str, period: str) -> tuple[str, ...]:
        """The codes whose counts of this year the area is made of."""
        made = (one for one in self.of if area in one.becomes and one.shares)
        return tuple(one.code for one in made if one.covers(one.code, period))

    @property
    def breaks(self) -> tuple[Break, ...]:
        """Boundary breaks of codes that end where new series begin, and of the new ones."""
        new = [one for one in self.of if not one.shares]
        found = {
            (area, one.first): Break(area, one.first, "boundary", note=_said(one))
            for one in new
            for area in (one.code, *one.becomes)
        }
        return tuple(found[key] for key in sorted(found))


NOTHING = Successions()


def _said(one: Succession) -> str:
    return f"{one.code} becomes {', '.join(one.becomes)}"


def read_line(line: Line) -> Becoming | None:
    """A row as it is meant; None where some field of it cannot be read."""
    first, last = line["from"] or FIRST, line["to"] or LAST
    share = number(line["share"]) if line["share"] else None
    sex = read_sex(line["sex"]) if line["sex"] else ""
    age = read_age(line["age"]) if line["age"] else ALL_AGES
    sound = (
        is_code(line["code"])
        and is_code(line["becomes"])
        and (not line["parent"] or is_code(line["parent"]))
        and all(year in (FIRST, LAST) or str(read_year(year)) == year for year in (first, last))
        and first <= last
        and (not line["share"] or (share is not None and 0 <= share <= 1))
        and sex in ("", "f", "m", "p")
        and age is not None
        and (age is ALL_AGES or age.start >= 0)
        and line["counts"] in ("", *COUNTS)
    )
    if not sound or sex is None or age is None:
        return None
    return Becoming(
        row=line.row,
        code=line["code"],
        becomes=line["becomes"],
        first=first,
        last=last,
        share=share,
        counts=line["counts"],
        sex="" if sex == "p" else sex,
        age=None if age is ALL_AGES else age,
        name=line["name"],
        parent=line["parent"],
    )


def read_lines(table: SmallTable) -> tuple[Becoming, ...]:
    return tuple(one for line in table.lines if (one := read_line(line)) is not None)


Runs = Mapping[tuple[str, str, str], tuple[Becoming, ...]]


def runs(rows: Iterable[Becoming]) -> Runs:
    """Rows of one code and the same years together, in the order of the file."""

    def place(one: Becoming) -> tuple[str, str, str]:
        return one.code, one.first, one.last

    ordered = sorted(rows, key=place)
    return {key: tuple(found) for key, found in groupby(ordered, key=place)}


def shares_of(rows: Iterable[Becoming]) -> dict[tuple[str, str, str], tuple[Becoming, ...]]:
    """Rows of one new code, kind of counts and sex together, by age."""

    def place(one: Becoming) -> tuple[str, str, str]:
        return one.becomes, one.counts, one.sex

    def start(one: Becoming) -> int:
        return 0 if one.age is None else one.age.start

    ordered = sorted(rows, key=lambda one: (place(one), start(one)))
    return {key: tuple(found) for key, found in groupby(ordered, key=place)}


def grid_of(rows: tuple[Becoming, ...]) -> AgeGrid | None:
    """The ages of the rows of one share; None where they leave a gap, or begin above 0."""
    starts = [0 if one.age is None else one.age.start for one in rows]
    for one, following in zip(rows, [*starts[1:], None], strict=True):
        end = None if one.age is None else one.age.end
        if following is None:
            if end is not None and not (one.age and one.age.open):
                return None
        elif end is not None and end + 1 != following:
            return None
    if starts[0] != 0 or len(set(starts)) < len(starts):
        return None
    return AgeGrid(tuple(starts))


def is_new_series(rows: tuple[Becoming, ...]) -> bool:
    """One code that becomes several, with no share stated."""
    return len({one.becomes for one in rows}) > 1 and all(one.share is None for one in rows)


def successions(rows: tuple[Becoming, ...]) -> Successions:
    """What rows without faults say."""
    found = []
    for (code, first, last), run in runs(rows).items():
        becomes = tuple(dict.fromkeys(one.becomes for one in run))
        shares = () if is_new_series(run) else tuple(_shares(run))
        found.append(Succession(code, first, last, becomes, shares))
    return Successions(tuple(found), _areas(rows))


def _shares(run: tuple[Becoming, ...]) -> Iterable[Share]:
    for (becomes, counts, sex), rows in shares_of(run).items():
        grid = grid_of(rows)
        if grid is not None:
            values = tuple(1.0 if one.share is None else one.share for one in rows)
            yield Share(becomes, counts, sex, grid, values)


def _areas(rows: tuple[Becoming, ...]) -> tuple[Area, ...]:
    """The new codes with the names and wholes that are stated."""
    made = []
    for code in sorted({one.becomes for one in rows}):
        own = [one for one in rows if one.becomes == code]
        name = next((one.name for one in own if one.name), "")
        parent = next((one.parent for one in own if one.parent), "")
        made.append(Area(code, name, parent))
    return tuple(made)
