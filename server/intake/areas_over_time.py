"""The small tables of an upload read and checked: what becomes of areas, breaks, a cause list."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Protocol

from engine.ages import AgeGrid
from server.intake import break_rows, successions
from server.intake.causes import own
from server.intake.causes.placing import CauseList, own_list
from server.intake.checks import breaks as break_checks
from server.intake.checks import cause_lists, columns, files, lists, moved_counts
from server.intake.checks import successions as succession_checks
from server.intake.layout import layout
from server.intake.lists import SmallTable, small_table
from server.intake.mapping import Mapping as Columns
from server.intake.problems import Problem, errors_of
from server.intake.standing import Standing
from server.intake.successions import NOTHING, Successions
from server.store.records import Area, Break, Key


class File(Protocol):
    """A file as handed in."""

    @property
    def role(self) -> str: ...
    @property
    def name(self) -> str: ...
    @property
    def content(self) -> bytes: ...
    @property
    def mapping(self) -> Columns: ...


@dataclass(frozen=True, slots=True)
class Told:
    """What the small tables say. Not to be used where there is an error among the problems."""

    successions: Successions = NOTHING
    breaks: tuple[Break, ...] = ()  # rows of the kind NONE among them
    problems: tuple[Problem, ...] = ()
    rows: int = 0
    sound: int = 0  # of the rows, those that can be read


@dataclass(frozen=True, slots=True)
class Tables:
    """The small tables as far as they can be read."""

    of: tuple[SmallTable, ...]
    problems: tuple[Problem, ...]
    unread: int

    @property
    def old_codes(self) -> frozenset[str]:
        """Codes of which it is said what becomes of them."""
        lines = [line for table in self.of if table.role == "areas" for line in table.lines]
        return frozenset(line["code"] for line in lines)


@dataclass(frozen=True, slots=True)
class OwnCauses:
    """The cause list of the user's own; without `list`, none was handed in, or it has errors."""

    handed_in: bool
    list: CauseList | None


def own_causes(handed: Sequence[File], tables: Tables) -> OwnCauses:
    given = any(file.role == "causes" for file in handed)
    table = next((table for table in tables.of if table.role == "causes"), None)
    wrong = table and any(one.file == table.name for one in errors_of(tables.problems))
    if table is None or wrong:
        return OwnCauses(given, None)
    return OwnCauses(given, own_list(tuple(cause for _, cause in own.read_lines(table))))


def tables_of(handed: Sequence[File]) -> Tables:
    tables, problems, unread = [], [], 0
    for file in handed:
        laid = layout(file.content, file.name, file.mapping.form)
        found = files.problems_of(laid)
        found += columns.problems_of_list(columns.Mapped(laid, file.role, file.mapping))
        if errors_of(found):
            unread += laid.row_count
        else:
            table = small_table(laid, file.role)
            found += lists.problems_of(table)
            if table.role == "causes":
                found += cause_lists.problems_of(cause_lists.OwnList(table, own.read_lines(table)))
            tables.append(table)
        problems += found
    return Tables(tuple(tables), tuple(problems), unread)


def told(
    tables: Tables,
    areas: Iterable[Area],
    held: Mapping[Key, AgeGrid],
    standing: Standing | None,
) -> Told:
    """What the tables say; `areas` and `held` are what the files of counts hold. Without `standing`
    it is not asked whether codes and years are known."""
    problems = [*tables.problems]
    listed = _Listed({area.code: area for area in areas}, held, standing)
    said, breaks, sound = NOTHING, [], 0
    for table in tables.of:
        if table.role == "areas":
            rows = successions.read_lines(table)
            problems += listed.of_areas(table, rows)
            said = successions.successions(rows)
            sound += len(rows)
        elif table.role == "causes":
            sound += len(own.read_lines(table))
        else:
            numbered = break_rows.read_lines(table)
            problems += listed.of_breaks(table, numbered)
            breaks += [one for _, one in numbered]
            sound += len(numbered)
    return Told(
        said,
        (*breaks, *_unless_said(said.breaks, breaks)),
        tuple(problems),
        tables.unread + sum(table.row_count for table in tables.of),
        sound,
    )


@dataclass(frozen=True, slots=True)
class _Listed:
    areas: Mapping[str, Area]  # handed in
    held: Mapping[Key, AgeGrid]  # handed in
    standing: Standing | None

    @property
    def known(self) -> dict[str, Area]:
        stood = self.standing.areas if self.standing else ()
        return {**{area.code: area for area in stood}, **self.areas}

    def of_areas(self, table: SmallTable, rows: tuple[successions.Becoming, ...]) -> list[Problem]:
        if self.standing is None:
            return []
        said = succession_checks.Said(table, rows, self.known, self.held, self.standing)
        return moved_counts.problems_of(said)

    def of_breaks(self, table: SmallTable, rows: tuple[tuple[int, Break], ...]) -> list[Problem]:
        if self.standing is None:
            return []
        periods = {key.period for key in (*self.held, *self.standing.held)}
        said = break_checks.Said(
            table,
            rows,
            frozenset(self.known),
            tuple(sorted(periods)),
            self.standing.breaks,
        )
        return break_checks.problems_of(said)


def _unless_said(made: Iterable[Break], said: Iterable[Break]) -> list[Break]:
    """Breaks that follow from new series, unless the table of breaks states them itself."""
    stated = {(one.area, one.period, one.kind) for one in said}
    return [one for one in made if (one.area, one.period, one.kind) not in stated]
