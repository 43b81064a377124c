"""The registry of checks: one family a file, each exporting CHECKS."""

from server.intake.checks import ages, columns, fields, files, plausibility, series, totals
from server.intake.problems import Kind

FAMILIES = (files, columns, fields, ages, series, totals, plausibility)

KINDS: dict[str, Kind] = {
    check.key: check
    for family in (*(family.CHECKS for family in FAMILIES), columns.AREA_CHECKS)
    for check in family
}
