"""The registry of checks: one family a file, each exporting CHECKS; chapters of families by the
question they answer."""

from dataclasses import dataclass
from types import ModuleType

from server.intake.checks import (
    ages,
    areas,
    basis,
    breaks,
    cause_columns,
    cause_lists,
    cause_profiles,
    cause_rows,
    causes,
    columns,
    completeness,
    fields,
    files,
    forms,
    jumps,
    lists,
    moved_counts,
    old_ages,
    open_ages,
    plausibility,
    repeats,
    series,
    sexes,
    standing,
    stated_ages,
    successions,
    totals,
    unstated,
    worked_out,
)
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Kind


@dataclass(frozen=True, slots=True)
class Chapter:
    """Families of checks that answer one question about an upload."""

    key: str
    label: str
    question: str
    families: tuple[ModuleType, ...]

    @property
    def checks(self) -> tuple[Kind, ...]:
        return tuple(check for family in self.families for check in family.CHECKS)


CHAPTERS = (
    Chapter(
        "form",
        "The form of the file",
        "Can the file be read, and does every row say what it counts?",
        (forms, files, columns, cause_columns, areas, fields, ages),
    ),
    Chapter(
        "sums",
        "What belongs together",
        "Do deaths, populations and totals stand beside one another as they must?",
        (series, totals, unstated, worked_out, plausibility),
    ),
    Chapter(
        "years",
        "Years and areas",
        "Does a year stand out, stand twice, or fail to come again?",
        (jumps, repeats, standing),
    ),
    Chapter(
        "ages",
        "Sexes and ages",
        "Are women and men, and the ages, as they are in any population?",
        (sexes, old_ages, open_ages, stated_ages),
    ),
    Chapter(
        "completeness",
        "Completeness",
        "Were all deaths registered, and the same share of them in every year?",
        (completeness,),
    ),
    Chapter(
        "lists",
        "Tables of areas and breaks",
        "Does what is said of areas and breaks fit the areas and years that are held?",
        (lists, successions, moved_counts, breaks),
    ),
    Chapter(
        "basis",
        "How the counts were made",
        "Are the deaths those of the people counted, and does the basis of an edition go on?",
        (basis,),
    ),
    Chapter(
        "causes",
        "Causes of death",
        "Do the causes add up, can each be one of its sex and age, and are their shares as usual?",
        (cause_lists, cause_rows, causes, cause_profiles),
    ),
)

KINDS: dict[str, Kind] = {check.key: check for one in CHAPTERS for check in one.checks}

# of all vectors of an upload together, when what does not state its sex, age or area is dealt with,
# in the order in which a report names what they find
OF_LEDGER = (
    *series.CHECKS,
    *plausibility.CHECKS,
    *jumps.CHECKS,
    *repeats.CHECKS,
    *standing.CHECKS,
    *sexes.CHECKS,
    *old_ages.CHECKS,
    *open_ages.CHECKS,
    *stated_ages.CHECKS,
    *completeness.CHECKS,
)
DOUBTS = ("years", "ages", "completeness")  # chapters that ask about figures, not about a file


def doubts(ledger: Ledger) -> list[tuple[str, str, list[Fault]]]:
    """What the checks of figures find: key of the check, its chapter, its faults."""
    return [
        (check.key, one.key, list(check.find(ledger)))
        for one in CHAPTERS
        if one.key in DOUBTS
        for family in one.families
        for check in family.CHECKS
    ]
