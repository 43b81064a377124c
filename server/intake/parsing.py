"""From handed-in bytes to schedules or problems: a pure function of bytes, mapping and reader."""

from collections import defaultdict
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from server.intake.areas_over_time import OwnCauses, own_causes, tables_of, told
from server.intake.causes.placing import CauseList, by_cause, causes_of
from server.intake.causes.profiles import Profiles
from server.intake.causes.spreading import by_leaves
from server.intake.cells import (
    AREA_UNSTATED,
    UNREADABLE,
    cells,
    codes_of,
    names_of,
    parts_of,
    whole_code,
)
from server.intake.checks import (
    OF_LEDGER,
    cause_columns,
    cause_profiles,
    columns,
    files,
    totals,
    unstated,
)
from server.intake.checks import areas as area_checks
from server.intake.checks import causes as cause_sums
from server.intake.checks import worked_out as derived
from server.intake.checks.causes import CauseSums
from server.intake.file_rows import FileRows, sorted_out
from server.intake.forms import across
from server.intake.forms.addresses import placed
from server.intake.january import averaged
from server.intake.layout import layout
from server.intake.ledger import Ledger
from server.intake.mapping import EVERY_ROLE, JANUARY, LISTS, ROLES, Mapping
from server.intake.problems import Problem, errors_of
from server.intake.rates import WorkedOut, worked_out
from server.intake.schedules import RATE
from server.intake.sharing import Unstated, settle
from server.intake.sheets import Sheet, load
from server.intake.standing import NOTHING_STANDS, Standing
from server.intake.successions import NOTHING, Successions
from server.intake.vectors import vectors, vectors_by_cause
from server.store.records import Area, Break, Cause, Key, Vector

# what it is at, texts of the catalogue
READING, CHECKING = "reading the rows", "checking the counts"
Reached = Callable[[int, str], object]
DYING = ("deaths", RATE)
READER = "reader-4"  # changes whenever the same bytes and mapping would give other schedules


@dataclass(frozen=True, slots=True)
class Handed:
    """A file as handed in, and how it is to be read."""

    role: str  # one of mapping.EVERY_ROLE
    name: str
    content: bytes
    mapping: Mapping


@dataclass(frozen=True, slots=True)
class Parsed:
    """What an upload says. With an error among the problems it must not become an edition."""

    cells: dict[Key, Vector]
    areas: tuple[Area, ...]
    problems: tuple[Problem, ...]
    row_count: int  # rows read, headings and blank lines not counted
    sound_count: int  # rows without an error
    whole: str  # code of the area that is summed from the others; empty where none is
    successions: Successions = NOTHING  # not yet applied: the edition before has old codes too
    breaks: tuple[Break, ...] = ()
    rebased: tuple[str, ...] = ()  # years held that get a new population under deaths that stand
    unstated: tuple[Unstated, ...] = ()  # what became of counts that do not state all
    causes: tuple[Cause, ...] = ()  # the cause list, where deaths are by cause or a list came along

    @property
    def errors(self) -> tuple[Problem, ...]:
        return errors_of(self.problems)


def parse(
    handed: Sequence[Handed],
    standing: Standing | None = NOTHING_STANDS,
    *,
    warn: bool = True,
    reached: Reached = lambda step, stage: None,
) -> Parsed:
    """Read the files of one upload. Never raises on bad content: it collects all problems.

    `standing` is what the edition before holds, against which the upload is checked too; with None
    it is not. The schedules do not depend on it. `reached` is told which stage begins, and
    after how many steps, a step a file. Without `warn`, series are looked through for errors alone.

    Raises: ValueError where a role is unknown or comes twice.
    """
    roles, known = [file.role for file in handed], ", ".join(EVERY_ROLE)
    if len(set(roles)) != len(roles) or not set(roles) <= set(EVERY_ROLE):
        raise ValueError(f"an upload has one file of each role of {known}; got {roles}")
    lists = tables_of([file for file in handed if file.role in LISTS])
    # codes of which it is said what becomes of them are not missed
    left = standing.without(lists.old_codes) if standing else None
    counted = [file for file in handed if file.role not in LISTS]
    own = own_causes(handed, lists)
    counts = _counts(counted, left, own, warn=warn, reached=reached)
    grids = {key: cell.grid for key, cell in counts.cells.items() if not key.cause}
    said = told(lists, counts.areas, grids, standing)
    causes = _causes(counted, own.list)
    doubts = []
    if warn and standing is not None and (causes or standing.causes):
        profiles = Profiles(causes, counts.cells, standing, said.breaks)
        doubts = cause_profiles.problems_of(profiles)
    return replace(
        counts,
        successions=said.successions,
        breaks=said.breaks,
        causes=causes,
        problems=(*counts.problems, *said.problems, *doubts),
        row_count=counts.row_count + said.rows,
        sound_count=counts.sound_count + said.sound,
    )


def _causes(counted: Sequence[Handed], own: CauseList | None) -> tuple[Cause, ...]:
    """The list that the files go by, else the one that was handed in."""
    asked = (causes_of(file.role, file.mapping, own) for file in counted)
    return next((found.causes for found in asked if found), own.causes if own else ())


def _list_of(file: Handed | Sheet, own: OwnCauses) -> CauseList | None:
    return causes_of(file.role, file.mapping, own.list)


def _counts(
    handed: Sequence[Handed],
    standing: Standing | None,
    own: OwnCauses,
    *,
    warn: bool,
    reached: Reached,
) -> Parsed:
    """The files of counts, as `parse`."""
    problems: list[Problem] = []
    sheets: list[Sheet] = []
    wide: dict[str, across.Spread] = {}
    unread = 0
    for step, file in enumerate(sorted(handed, key=lambda file: list(ROLES).index(file.role))):
        reached(step, READING)
        laid = layout(file.content, file.name, file.mapping.form)
        found = files.problems_of(laid)
        if not errors_of(found):
            mapped = columns.Mapped(laid, file.role, file.mapping, own.handed_in)
            found += [*columns.problems_of(mapped), *cause_columns.problems_of(mapped)]
        problems += found
        unlisted = by_cause(file.role, file.mapping) and not _list_of(file, own)
        if errors_of(found) or unlisted:
            unread += laid.row_count
        else:
            sheets.append(load(laid, file.mapping, file.role))
            if spread := across.spread(file.mapping.form):
                wide[laid.name] = spread
    codes, areas, clashes = _areas(sheets, handed)
    problems += clashes
    cut = [sorted_out(cells(sheet, codes), _list_of(sheet, own)) for sheet in sheets]
    died = _years_of_deaths(cut)
    done = [_dated(part, sheet.mapping, died) for part, sheet in zip(cut, sheets, strict=True)]
    problems += [problem for part in done for problem in part.problems]
    parts = {
        area.code
        for area in (standing.areas if standing else ())
        if area.parent and area.parent == _whole(handed)
    }
    ledger = _ledger(
        done,
        codes,
        areas,
        elsewhere=bool(parts - set(codes)),
        unplaced=len(sheets) < len(handed) or any(part.unplaced for part in done),
        standing=standing,
    )
    reached(len(handed), CHECKING)
    parted = [part.by_cause for part in done if part.by_cause is not None]
    settled, spread_out = by_leaves(settle(ledger), parted)
    problems += [problem for check in totals.CHECKS for problem in check.problems(ledger)]
    problems += [problem for check in unstated.CHECKS for problem in check.problems(settled)]
    for one in parted:
        for sums_check in cause_sums.CHECKS:
            if warn or sums_check.severity == "error":
                problems += sums_check.problems(CauseSums(one, ledger))
    made = _deaths_of_rates(settled.ledger, done, handed)
    problems += derived.problems_of(made.found)
    for check in OF_LEDGER:
        if warn or check.severity == "error":
            problems += check.problems(made.ledger)
    kept = made.ledger.without_totals()
    return Parsed(
        cells=vectors(kept) | vectors_by_cause(kept, spread_out),
        areas=areas,
        problems=tuple(placed(problem, wide) for problem in problems),
        row_count=unread + sum(len(part.sound_rows) for part in done),
        sound_count=sum(int(part.sound_rows.sum()) for part in done),
        whole=_whole(handed),
        unstated=settled.account,
    )


def _whole(handed: Iterable[Handed]) -> str:
    return next((code for file in handed if (code := whole_code(file.mapping))), "")


def _areas(
    sheets: Sequence[Sheet], handed: Sequence[Handed]
) -> tuple[tuple[str, ...], tuple[Area, ...], list[Problem]]:
    """Codes in order, the areas, and names or wholes that disagree."""
    names: dict[str, dict[str, None]] = defaultdict(dict)  # each once, in the order found
    found: set[str] = set()
    for sheet in sheets:
        codes = codes_of(sheet)
        found |= set(codes) - {"", AREA_UNSTATED}
        for code, given in names_of(sheet, codes).items():
            names[code].update(dict.fromkeys(given))
    whole = _whole(handed)
    found |= {whole} - {""}
    delivered = {code for file in handed for code in file.mapping.delivered}
    named = next((file.mapping.whole_name for file in handed if file.mapping.whole_name), "")
    areas = tuple(
        Area(
            code=code,
            name=(named if code == whole else "") or next(iter(names[code]), ""),
            parent="" if code == whole else whole,
            delivered=code in delivered,
        )
        for code in sorted(found)
    )
    said = area_checks.Said(
        names={code: tuple(given) for code, given in names.items()},
        wholes=tuple(dict.fromkeys(filter(None, (whole_code(f.mapping) for f in handed)))),
        codes=tuple(sorted(found)),
        delivered=tuple(sorted(delivered)),
    )
    problems = [problem for check in area_checks.CHECKS for problem in check.problems(said)]
    return tuple(sorted(found)), areas, problems if sheets else []


def _years_of_deaths(parts: Iterable[FileRows]) -> set[str]:
    of_deaths = (block for part in parts for block in part.blocks if block.measure in DYING)
    return {str(year) for block in of_deaths for year in np.unique(parts_of(block.place)[2])}


def _dated(part: FileRows, mapping: Mapping, died: set[str]) -> FileRows:
    """With people of 1 January made people at risk, where the mapping says that they are that.
    That a 1 January has no next one is told where deaths of its year are handed in, or none are."""
    if mapping.population_is != JANUARY:
        return part
    mean = averaged(part.blocks, part.age_totals)
    found = [
        one
        for one in mean.found
        if one.key != "last_january" or not died or one.fault.values["year"] in died
    ]
    return replace(
        part,
        blocks=list(mean.blocks),
        age_totals=list(mean.asides),
        ageless=list(averaged((), part.ageless).asides),
        grouped=list(averaged((), part.grouped).asides),
        problems=part.problems + derived.problems_of(found),
    )


def _unknown(done: Sequence[FileRows]) -> NDArray[np.int64]:
    """Places of which one file says that a count is not available, and none has an error."""
    nowhere = np.zeros(0, np.int64)
    unknown = np.unique(np.concatenate([nowhere, *(part.unknown for part in done)]))
    faulty = [np.setdiff1d(part.spoiled, part.unknown) for part in done]
    return np.setdiff1d(unknown, np.concatenate([nowhere, *faulty]))


def _deaths_of_rates(
    ledger: Ledger, done: Sequence[FileRows], handed: Sequence[Handed]
) -> WorkedOut:
    rates = [block for part in done for block in part.blocks if block.measure == RATE]
    unstated_ones = (aside for part in done for aside in (*part.ageless, *part.grouped))
    unknown = [aside for aside in unstated_ones if aside.measure == RATE]
    kind = next((file.mapping.rate_is for file in handed if file.role == "rates"), "")
    return worked_out(ledger, rates, unknown, kind)


def _ledger(
    done: Sequence[FileRows],
    codes: tuple[str, ...],
    areas: Sequence[Area],
    *,
    elsewhere: bool,
    unplaced: bool,
    standing: Standing | None,
) -> Ledger:
    whole = {area.parent for area in areas} - {""}
    return Ledger(
        codes=codes,
        whole=codes.index(whole.pop()) if whole else UNREADABLE,
        delivered=frozenset(place for place, area in enumerate(areas) if area.delivered),
        blocks=tuple(block for part in done for block in part.blocks if block.measure != RATE),
        spoiled=np.unique(np.concatenate([np.zeros(0, np.int64), *(p.spoiled for p in done)])),
        unknown=_unknown(done),
        elsewhere=elsewhere,
        unplaced=unplaced,
        age_totals=tuple(one for part in done for one in part.age_totals if one.measure != RATE),
        ageless=tuple(one for part in done for one in part.ageless if one.measure != RATE),
        grouped=tuple(one for part in done for one in part.grouped if one.measure != RATE),
        standing=standing,
    )
