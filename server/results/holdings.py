"""What an edition holds at all, and what its breaks part."""

from dataclasses import dataclass, replace

from engine.settings import span
from server.results.breaks import between, parting
from server.results.questions import PopulationYear
from server.sentences.names import listed
from server.sentences.text import _
from server.store import schedules
from server.store.connect import Session
from server.store.content_lists import lists
from server.store.records import Area, Break, Cause


class NotInEdition(LookupError):
    """A population-year, area or year the edition does not hold (404); its text lists what it
    holds."""


@dataclass(frozen=True, slots=True)
class Holdings:
    """What an edition holds at all: areas in tree order, sexes, sorted periods, status of each."""

    areas: tuple[Area, ...]
    sexes: tuple[str, ...]
    periods: tuple[str, ...]
    status: dict[PopulationYear, str]
    breaks: tuple[Break, ...] = ()
    revised: frozenset[PopulationYear] = frozenset()  # this edition changed their counts
    causes: tuple[Cause, ...] = ()  # its cause list, each before its parts; empty: it has none

    def broken(self, one: PopulationYear) -> bool:
        """Whether a break lies before its year: it is the first of another kind."""
        return any(found.period == one.period for found in parting(self.breaks, one.area))

    def name(self, area: str) -> str:
        """The area's name; its code where it has none."""
        return next((one.name for one in self.areas if one.code == area), "") or area

    def require_area(self, code: str) -> None:
        """NotInEdition where the edition has no such area."""
        codes = [area.code for area in self.areas]
        if code not in codes:
            raise NotInEdition(
                _(
                    "This edition has no area {code}. Its areas are {areas}. Choose among these.",
                    code=code,
                    areas=listed(codes, most=12),
                )
            )

    def require(self, wanted: PopulationYear) -> None:
        """NotInEdition where the edition does not hold it."""
        if wanted not in self.status:
            raise self.lacks(wanted)

    def all_of(self, wanted: PopulationYear, years: int) -> bool:
        """Whether the edition holds it and the years before it that are pooled with it."""
        if wanted not in self.status or int(wanted.period) < years:
            return False
        pooled = span(wanted.period, years)
        return all(replace(wanted, period=period) in self.status for period in pooled)

    def lacks(self, wanted: PopulationYear, years: int = 1) -> NotInEdition:
        """What is said of a population-year without counts, with one measure alone, or without one
        of the years that are pooled with it."""
        periods = self.periods
        if wanted in self.status and years > 1:
            return NotInEdition(
                _(
                    "These settings add up {years} years, and this edition does not hold all of"
                    " them up to {code}. Its years are {first} to {last}. Choose a later year, or"
                    " settings of single years.",
                    years=years,
                    code=wanted.code,
                    first=periods[0],
                    last=periods[-1],
                )
            )
        return NotInEdition(
            _(
                "This edition does not hold {code}, or not both its deaths and its person-years."
                " Its areas are {areas}; its sexes {sexes}; its years {first} to {last}. Choose"
                " among these.",
                code=wanted.code,
                areas=listed([area.code for area in self.areas], most=12),
                sexes=listed(self.sexes),
                first=periods[0] if periods else _("none"),
                last=periods[-1] if periods else _("none"),
            )
        )

    def previous(self, wanted: PopulationYear, years: int = 1) -> PopulationYear | None:
        """The same area and sex a year before, or as many as are pooled, where the edition holds
        it and no break lies between."""
        before = self._before(wanted, years)
        return None if self.cut_off(wanted, years) else before

    def cut_off(self, wanted: PopulationYear, years: int = 1) -> tuple[Break, ...]:
        """The breaks that part it from the year before, where the edition holds that."""
        before = self._before(wanted, years)
        if before is None:
            return ()
        return self.parted(span(before.period, years)[0], wanted.period, wanted.area)

    def _before(self, wanted: PopulationYear, years: int) -> PopulationYear | None:
        before = replace(wanted, period=f"{int(wanted.period) - years:04}")
        return before if self.all_of(before, years) else None

    def mixed(self, one: PopulationYear, years: int) -> tuple[Break, ...]:
        """The breaks on both sides of which the years added up lie."""
        return self.parted(span(one.period, years)[0], one.period, one.area) if years > 1 else ()

    def parted(self, first: str, last: str, *areas: str) -> tuple[Break, ...]:
        """The breaks of these areas that lie between two years."""
        return between(parting(self.breaks, *areas), first, last)


def holdings(session: Session, collection: str, number: int) -> Holdings:
    """Two statements."""
    contents = schedules.contents(session, collection, number)
    listed = lists(session, collection, number)
    return Holdings(
        listed.areas,
        contents.sexes,
        contents.periods,
        {PopulationYear(*key): status for key, status in contents.status.items()},
        listed.breaks,
        frozenset(PopulationYear(*key) for key in contents.revised),
        listed.causes,
    )
