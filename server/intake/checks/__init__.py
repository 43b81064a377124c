"""The registry of checks: one family a file, each exporting CHECKS."""

from server.intake.checks import (
    ages,
    areas,
    breaks,
    columns,
    fields,
    files,
    lists,
    moved_counts,
    plausibility,
    series,
    successions,
    totals,
    unstated,
    worked_out,
)
from server.intake.problems import Kind

OF_LISTS = (lists, successions, moved_counts, breaks)
FAMILIES = (files, columns, areas, fields, ages, series, totals, unstated, worked_out, plausibility, *OF_LISTS)

KINDS: dict[str, Kind] = {check.key: check for family in FAMILIES for check in family.CHECKS}

# of all vectors of an upload together, when what does not state its sex, age or area is dealt with,
# in the order in which a report names what they find
OF_LEDGER = (*series.CHECKS, *plausibility.CHECKS)
