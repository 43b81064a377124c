"""The registry of checks: one family a file, each exporting CHECKS."""

from server.intake.checks import ages, areas, columns, fields, files, plausibility, series, totals
from server.intake.problems import Kind

FAMILIES = (files, columns, areas, fields, ages, series, totals, plausibility)

KINDS: dict[str, Kind] = {check.key: check for family in FAMILIES for check in family.CHECKS}

# of all vectors of an upload together, in the order in which a report names what they find
OF_LEDGER = (*series.CHECKS, *totals.CHECKS, *plausibility.CHECKS)
