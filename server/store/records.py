"""What the store hands out: frozen records, never database rows."""

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass
from typing import NamedTuple

from engine.ages import AgeGrid, Array

MEASURES = (
    "deaths",
    "person_years",
    "births",
    "stillbirths",
    "neonatal_deaths",
    "counted_deaths",  # as counted, where `deaths` holds shared-out ones too: chance is of these
)
BREAKS = ("boundary", "coding", "definition", "population", "shock")
STATUSES = ("final", "provisional")


class Key(NamedTuple):
    """Which schedule: one vector over age. A plain tuple, since a large edition looks up, compares
    and sorts them by the million."""

    area: str
    sex: str  # f, m, p
    period: str  # ISO 8601: "2014"
    measure: str
    cause: str = ""  # none: all causes


@dataclass(frozen=True, slots=True)
class Vector:
    """The content of a schedule: status, grid, and one number an age group (nan: no number)."""

    status: str
    grid: AgeGrid
    values: Array  # [age]
    estimated: bool = False  # split by shares, or worked out from rates
    withheld: tuple[int, ...] = ()  # as released: starts of groups whose number only stands in
    rounded: int = 0  # as released: the base its numbers are rounded to; 0: as counted


@dataclass(frozen=True, slots=True)
class Basis:
    """How the counts of an edition were made; content of the edition."""

    people: str  # "residents" or "occurrences"
    dated_by: str  # "death" or "registration"
    population: str  # "midyear" (mid-year population) or "person_years"
    population_date: str  # in words or ISO: "1 July of each year"
    source: str
    vintage: str = ""  # which estimate of the population: "after the 2021 census"


@dataclass(frozen=True, slots=True, order=True)
class Break:
    """A dated change that a trend must not cross; content of the edition. A shock year is no break,
    it is left out where a course of years is fitted."""

    area: str  # empty: every area
    period: str  # the first of the new kind, or the year of shock
    kind: str  # one of BREAKS
    cause: str = ""  # of a coding break: the cause it moved; empty: all
    note: str = ""
    ratio: float | None = None  # comparability: counts after over counts before
    ratio_error: float | None = None  # standard error of the ratio


CAUSE_KINDS = ("natural", "external", "undetermined", "ill_defined", "pending", "not_underlying")
NOT_STATED = "not-stated"  # code of all deaths less those of the causes; in no list
CARE = ("suicide", "overdose", "violence")  # pages on such deaths follow reporting cautions


@dataclass(frozen=True, slots=True)
class Cause:
    """One entry of a cause list, a tree. Codes, parents, ranges and kinds are content of the
    edition, labels are presentation. Deaths are stored for causes that have none under them."""

    code: str
    label: str
    parent: str = ""  # code of the cause it is part of; empty at the top
    ranges: tuple[str, ...] = ()  # of codes of the classification: "A00-B99", "U07"
    kind: str = "natural"  # one of CAUSE_KINDS
    care: str = ""  # one of CARE; empty: none
    sex: str = ""  # f or m: such deaths befall this sex alone; empty: both


@dataclass(frozen=True, slots=True)
class Area:
    """One area of a collection. Parents are content of the edition, names are presentation."""

    code: str
    name: str  # of an upload that gives none: empty, and the area keeps the name it has
    parent: str = ""  # code of the area it is part of; empty at the top
    delivered: bool = False  # its counts were delivered as such, not summed from its parts


@dataclass(frozen=True, slots=True)
class Event:
    """Something that befell an edition after it was made."""

    what: str  # "withdrawn" or "reinstated"
    at: dt.datetime
    by: str
    note: str


GIVES_WAY = ("cells", "handed", "years", "areas", "all")


@dataclass(frozen=True, slots=True)
class Taking:
    """What of an upload becomes part of an edition, and what of its base gives way to it.

    `gives_way`: "cells" the counts of the same area, sex, year and measure; "handed" everything of
    an area and year taken; "years" everything of a year taken, of all areas; "areas" everything of
    an area taken, of all years; "all" the whole base.
    """

    areas: tuple[str, ...] = ()  # codes; empty: all that were handed in
    periods: tuple[str, ...] = ()  # empty: all that were handed in
    gives_way: str = "cells"  # one of GIVES_WAY

    def takes(self, area: str, period: str) -> bool:
        return not (self.areas and area not in self.areas) and not (
            self.periods and period not in self.periods
        )


ALL_OF_IT = Taking()


@dataclass(frozen=True, slots=True)
class Effect:
    """How many schedules (one measure of an area, sex and year) an edition changed of its base."""

    added: int = 0
    changed: int = 0  # other numbers or age groups
    restated: int = 0  # the same numbers under another status
    dropped: int = 0


@dataclass(frozen=True, slots=True)
class Edition:
    """One immutable state of a collection."""

    number: int
    base: int  # number of the edition it was built on; 0: none
    made: dt.datetime  # UTC
    by: str
    note: str
    digest: str  # content hash, 64 hex digits
    upload: int | None
    basis: Basis
    events: tuple[Event, ...] = ()
    replaces: bool = False  # True: nothing of the base stayed
    taking: Taking = ALL_OF_IT
    effect: Effect | None = None  # None: made before this was counted

    @property
    def withdrawn(self) -> bool:
        return bool(self.events) and self.events[-1].what == "withdrawn"


@dataclass(frozen=True, slots=True)
class Statement:
    """What an analyst stated of an edition's quality, by question."""

    at: dt.datetime  # UTC
    by: str
    answers: Mapping[str, str]


@dataclass(frozen=True, slots=True)
class Collection:
    id: int
    code: str
    name: str
    owner: str  # the office that answers for the data
    revision: int  # counts every change of standing, policy, names and notes
    made: dt.datetime  # UTC; tells it from one of the same code in another database


@dataclass(frozen=True, slots=True)
class UploadFile:
    """A file as handed in, kept byte for byte."""

    role: str  # "counts" (deaths and population in one), "deaths", "population", "births"
    name: str
    size: int
    sha256: str
    mapping: str  # JSON of intake.mapping.Mapping
    erased: dt.datetime | None = None  # when its bytes were erased; digest and report stay
    erased_by: str = ""
    erased_why: str = ""


@dataclass(frozen=True, slots=True)
class Upload:
    """A draft: files, mapping, basis and checking report. Nothing else is a draft."""

    id: int
    collection: str  # code
    received: dt.datetime
    by: str
    files: tuple[UploadFile, ...]
    basis: Basis | None
    reader: str  # version of the reader that made the report
    report: str  # JSON list of problems; empty before the first check
    edition: int | None  # number of the edition it became
    base: int | None = None  # edition that stood at the check; 0: none, None: not checked


@dataclass(frozen=True, slots=True)
class Change:
    """What a commit will write, prepared before any lock is taken."""

    collection: str
    base: int  # newest standing edition the checks ran against; 0: none
    cells: Mapping[Key, Vector]  # of the upload, with totals of sexes and areas summed
    areas: tuple[Area, ...]
    basis: Basis
    upload: int | None = None
    replace: bool = False  # True: nothing of the base stays
    ended: frozenset[Key] = frozenset()  # of the base: sums no longer made, codes that ended
    taking: Taking = ALL_OF_IT
    ended_areas: frozenset[str] = frozenset()  # codes of the base that became others
    breaks: tuple[Break, ...] = ()  # handed in
    ended_breaks: tuple[Break, ...] = ()  # of the base
    causes: tuple[Cause, ...] = ()  # handed in, in the order of their list
    ended_causes: frozenset[str] = frozenset()  # codes of the base that the list no longer has


@dataclass(frozen=True, slots=True)
class Terms:
    """What may be shown of small counts: those below the threshold are withheld, or all counts are
    rounded."""

    threshold: int = 5  # deaths from 1 up to one less are withheld
    persons: int = 0  # cells with fewer person-years, and the deaths in them, are withheld; 0: none
    zeros: str = "shown"  # or "withheld": whether it is said that nobody died
    coarse_below: int = 0  # persons; smaller areas are given by five-year groups; 0: none
    base: int = 0  # counts are rounded to multiples of it, and none is withheld; 0: not rounded
    causes: str = "whole"  # deaths by cause are shown of areas that are part of none; or "none"


@dataclass(frozen=True, slots=True)
class Policy:
    """The terms a collection is released under since `made`; a change is a new number."""

    number: int
    terms: Terms
    made: dt.datetime
    by: str
    note: str


@dataclass(frozen=True, slots=True)
class Hidden:
    """What of one schedule is not shown, and what stands in for it in figures."""

    ages: tuple[int, ...]  # starts of the groups withheld or rounded; -1: the sum over age
    values: tuple[float, ...]  # rounded, or worked out from what is shown; never the counts
    starts: tuple[int, ...] = ()  # coarser groups it is given by; empty: its own
    rounded: int = 0  # the base that its numbers are rounded to, all of them; 0: withheld


Mask = Mapping[Key, Hidden]


@dataclass(frozen=True, slots=True)
class Unprotected:
    """How many small counts of a period could not be protected as was asked."""

    exposed: int = 0  # may be worked out all the same: no other count could protect them
    narrow: int = 0  # may be told apart from some counts below the threshold


@dataclass(frozen=True, slots=True)
class Selection:
    """Which schedules to load; None: all there are."""

    areas: tuple[str, ...] | None = None
    sexes: tuple[str, ...] | None = None
    periods: tuple[str, ...] | None = None
    measures: tuple[str, ...] | None = None
    cause: str | None = ""  # empty: the deaths of all causes


@dataclass(frozen=True, slots=True)
class Job:
    """A piece of work that may outlast a request."""

    id: int
    kind: str
    params: str  # JSON, keys sorted
    digest: str  # of kind and params: the same request has the same digest
    state: str  # queued, running, done, failed, cancelled
    done: int
    total: int  # 0: not known yet
    message: str
    attempt: int  # how often it was begun; a worker writes only under the attempt it began
    beat: int  # grows with every sign of life
    queued: dt.datetime
    started: dt.datetime | None
    ended: dt.datetime | None
