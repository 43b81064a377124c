"""Checks of how the counts were made: deaths over the people they are deaths of, and what changes
where an edition is carried on."""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from server.intake.checks.check import Check
from server.intake.checks.series import years_worded
from server.intake.problems import Fault, Problem, Text
from server.intake.standing import Standing
from server.store.records import Basis, Break, Key

CORRESPOND = (
    "Shryock & Siegel (1976), The Methods and Materials of Demography, ch. 14; United Nations "
    "(2014), Principles and Recommendations for a Vital Statistics System, Revision 3"
)
_FIELDS = {
    "people": Text("whose deaths are counted"),
    "dated_by": Text("what decides the year of a death"),
    "population": Text("what population means"),
    "population_date": Text("the date of the population"),
}
_ANSWERS = {
    "residents": Text("those who live in the area"),
    "occurrences": Text("those who died in the area"),
    "death": Text("the day of death"),
    "registration": Text("the day of registration"),
    "midyear": Text("people in the middle of the year"),
    "person_years": Text("person-years"),
}


@dataclass(frozen=True, slots=True)
class Bases:
    """The basis stated for an upload, beside what is handed in and what stands."""

    own: Basis
    handed: frozenset[Key]
    breaks: tuple[Break, ...]  # handed in
    standing: Standing

    @property
    def stated_before(self) -> bool:
        """Whether the edition that stands has the same people, dates and kind of population: what
        is said of it was said when it was made."""
        before = self.standing.basis
        return before is not None and all(
            getattr(before, name) == getattr(self.own, name)
            for name in ("people", "dated_by", "population")
        )

    def populations(self, keys: Iterable[Key]) -> set[tuple[str, str]]:
        """Areas and years with a population among some keys."""
        return {(key.area, key.period) for key in keys if key.measure == "person_years"}

    @property
    def renewed(self) -> set[str]:
        """Years held already whose population is handed in again."""
        held = self.populations(self.standing.held)
        return {year for area, year in self.populations(self.handed) if (area, year) in held}

    @property
    def kept(self) -> set[str]:
        """Years held whose population stays; wholes are sums of what is handed in."""
        areas = self.standing.areas
        wholes = {area.parent for area in areas} & {
            area.code for area in areas if not area.delivered
        }
        left = self.populations(self.standing.held) - self.populations(self.handed)
        return {year for area, year in left if area not in wholes}


def rebased(bases: Bases) -> tuple[str, ...]:
    """Years already held that get a new population under the deaths that stand."""
    if not bases.standing.held:
        return ()
    deaths = {(key.area, key.period) for key in bases.handed if key.measure == "deaths"}
    held = bases.populations(bases.standing.held)
    new = bases.populations(bases.handed)
    return tuple(sorted({year for area, year in new & held if (area, year) not in deaths}))


def _occurrences(bases: Bases) -> Iterator[Fault]:
    if bases.own.people == "occurrences" and not bases.stated_before:
        yield Fault()


def _registration(bases: Bases) -> Iterator[Fault]:
    if bases.own.dated_by == "registration" and not bases.stated_before:
        yield Fault()


def _changes(bases: Bases) -> Iterator[Fault]:
    before = bases.standing.basis
    for name, what in _FIELDS.items() if before else ():
        old, new = getattr(before, name), getattr(bases.own, name)
        if old != new:
            values = {"what": what, "new": _ANSWERS.get(new, new), "old": _ANSWERS.get(old, old)}
            yield Fault(values=values)


def _unnamed(bases: Bases) -> Iterator[Fault]:
    before, years = bases.standing.basis, rebased(bases)
    if before and years and bases.own.vintage == before.vintage:
        said = (
            Text("“{vintage}” as before", vintage=before.vintage)
            if before.vintage
            else Text("no name of it")
        )
        yield Fault(values={"said": said, "years": _years(years)})


def _in_part(bases: Bases) -> Iterator[Fault]:
    before = bases.standing.basis
    if not before or not bases.renewed or bases.own.vintage == before.vintage:
        return
    kept = bases.kept
    first = min(year for _, year in bases.populations(bases.handed))
    stated = any(
        one.kind == "population" and one.period == first
        for one in (*bases.breaks, *bases.standing.breaks)
    )
    if kept and not stated:
        values = {
            "vintage": bases.own.vintage or Text("no name"),
            "years": _years(kept),
            "first": first,
        }
        yield Fault(values=values)


def _years(periods: Iterable[str]) -> str:
    return years_worded(sorted({int(period) for period in periods}))


CHECKS: tuple[Check[Bases], ...] = (
    Check(
        key="occurrences_over_residents",
        severity="warning",
        meaning="Deaths are counted where they occurred, and set over the people who live there.",
        why="Visitors who die in an area, and above all in its hospitals, raise its rates; "
        "residents who die elsewhere lower them. The two do not cancel out, and a small area with "
        "a large hospital may seem twice as deadly as it is.",
        found="deaths of those who died in the area",
        expected="deaths of those who lived there, as the population is of residents",
        remedy="Ask for deaths by place of residence. If there are none, say in the note what "
        "follows for areas with hospitals.",
        source=CORRESPOND,
        find=_occurrences,
    ),
    Check(
        key="registered_over_lived",
        severity="warning",
        meaning="Deaths are counted in the year of their registration, and set over the people who "
        "lived in that year.",
        why="Late registrations move deaths from one year to the next: a year in which an office "
        "caught up looks deadly, the one before it healthy. A trend of such years is in part one "
        "of office work.",
        found="the day of registration as the date of a death",
        expected="the day of death, as the population is of the same year",
        remedy="Ask for deaths by the day of death. If there are none, say in the note how late "
        "registrations usually are.",
        source=CORRESPOND,
        find=_registration,
    ),
    Check(
        key="basis_changes",
        severity="warning",
        meaning="The basis stated for the upload differs from that of the edition it is laid over, "
        "and will stand over the whole of the new edition.",
        why="One basis stands over all figures of an edition. Counts that are kept from the "
        "edition before would then be described wrongly.",
        found="{what}: {new}",
        expected="{old}, as in the edition that stands",
        remedy="Hand in every year on the new basis; or keep the basis and set a break of "
        "definition in the first year of the new one.",
        source="Ebbline's own.",
        find=_changes,
    ),
    Check(
        key="rebase_without_name",
        severity="warning",
        meaning="A new population is handed in for years already held, and its estimate has no "
        "name of its own.",
        why="After a census the same year has two populations. Without a name a reader cannot tell "
        "which of them a figure rests on.",
        found="{said}, for the population of {years}",
        expected="a name that tells this estimate from the one that stands",
        remedy="Name it under the basis, such as: after the census of 2021.",
        source="Ebbline's own.",
        find=_unnamed,
    ),
    Check(
        key="vintage_in_part",
        severity="warning",
        meaning="A new estimate of the population replaces some of the years held and not others.",
        why="Where one estimate ends and the other begins the population jumps, and with it every "
        "rate, though nobody lived longer or died sooner.",
        found="the population of {years} as it stood before the estimate “{vintage}”",
        expected="the new estimate for every year, or a break of population in {first}",
        remedy="Hand in the other years too, or state the break: it can be typed on the page where "
        "files are chosen.",
        source="Ebbline's own.",
        find=_in_part,
    ),
)


def problems_of(bases: Bases) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(bases)]
