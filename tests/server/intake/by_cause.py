"""Small clean tables of deaths by cause, to be spoilt one way at a time."""

from collections.abc import Mapping
from dataclasses import replace

from server.intake.mapping import Mapping as Columns
from server.intake.parsing import Handed
from tests.server.intake.tables import COLUMNS, Row, csv

# hundredths of the deaths of every age; what is left is the last one's
PARTS: Mapping[str, int] = {"C34": 20, "I63.9": 15, "J44": 10, "W19": 6, "R54": 2, "I21.9": 0}
LAST = "I21.9"
NAMES = ("area", "year", "sex", "age", "cause", "deaths")
LISTED = "code,name,part of,codes,kind,care,sex"


def parted(table: list[Row], parts: Mapping[str, int] = PARTS) -> list[Row]:
    """Each row once for every cause, in whole deaths that add up to those of the row."""
    found = []
    for row in table:
        died = int(str(row["deaths"]))
        counts = {cause: died * part // 100 for cause, part in parts.items() if cause != LAST}
        counts[LAST] = died - sum(counts.values())
        found += [{**row, "cause": cause, "deaths": count} for cause, count in counts.items()]
    return found


def totals(table: list[Row], cause: str = "all causes", more: int = 0) -> list[Row]:
    """Rows of all causes."""
    return [{**row, "cause": cause, "deaths": int(str(row["deaths"])) + more} for row in table]


def by_cause(table: list[Row] | bytes, **mapping: object) -> Handed:
    """A file of deaths by cause, under the short list unless said otherwise."""
    content = table if isinstance(table, bytes) else csv(table, NAMES)
    stated = {"population": "", "cause": "cause", "cause_list": "short", **mapping}
    return Handed("deaths", "causes.csv", content, replace(COLUMNS, **stated))  # type: ignore[arg-type]


def own(*lines: str, heading: str = LISTED) -> Handed:
    """A cause list of the user's own; fields left out at the end are empty."""
    width = heading.count(",")
    filled = [line + "," * (width - line.count(",")) for line in lines]
    return Handed("causes", "list.csv", "\n".join([heading, *filled]).encode(), Columns())
