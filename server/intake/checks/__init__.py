"""The registry of checks: one family a file, each exporting CHECKS."""

from server.intake.checks import (
    ages,
    areas,
    columns,
    fields,
    files,
    plausibility,
    series,
    totals,
    unstated,
)
from server.intake.problems import Kind

FAMILIES = (files, columns, areas, fields, ages, series, totals, unstated, plausibility)

KINDS: dict[str, Kind] = {check.key: check for family in FAMILIES for check in family.CHECKS}

# of all vectors of an upload together, when what does not state its sex, age or area is dealt with,
# in the order in which a report names what they find
OF_LEDGER = (*series.CHECKS, *plausibility.CHECKS)
