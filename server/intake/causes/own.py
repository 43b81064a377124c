"""A cause list of the user's own, as a small table of an upload."""

import re
from dataclasses import replace

from server.intake.areas import is_code
from server.intake.folding import folded
from server.intake.labels import read_sex
from server.intake.lists import Line, SmallTable
from server.store.records import CARE, CAUSE_KINDS, Cause

_KINDS = {kind.replace("_", " "): kind for kind in CAUSE_KINDS}


def read_kind(text: str) -> str | None:
    """One of CAUSE_KINDS, empty where nothing is said; None where it is none of them.

    >>> read_kind("Ill-defined"), read_kind(""), read_kind("strange")
    ('ill_defined', '', None)
    """
    said = re.sub("[-_ ]+", " ", folded(text))
    return _KINDS.get(said, None if said else "")


def read_care(text: str) -> str | None:
    said = folded(text)
    return said if said in ("", *CARE) else None


def read_only_sex(text: str) -> str | None:
    """f or m, empty where both may have it; None where it cannot be read."""
    found = read_sex(text) if text else "p"
    return {"f": "f", "m": "m", "p": ""}.get(found or "")


def read_lines(table: SmallTable) -> tuple[tuple[int, Cause], ...]:
    """Each row that can be read, with its number. An entry that says no kind has that of the one
    it is part of."""
    read = ((line.row, _read(line)) for line in table.lines)
    found = [(row, cause) for row, cause in read if cause is not None]
    by_code = {cause.code: cause for _, cause in found}
    return tuple((row, _with_kind(cause, by_code)) for row, cause in found)


def _read(line: Line) -> Cause | None:
    kind, care = read_kind(line["kind"]), read_care(line["care"])
    sex = read_only_sex(line["sex"])
    if not is_code(line["code"]) or kind is None or care is None or sex is None:
        return None
    joined = re.sub(r"\s*[-\u2010-\u2015\u2212]\s*", "-", line["codes"])
    ranges = tuple(filter(None, re.split(r"[,;+\s]+", joined)))
    label = line["name"] or line["code"]
    return Cause(line["code"], label, line["parent"], ranges, kind, care, sex)


def _with_kind(cause: Cause, by_code: dict[str, Cause]) -> Cause:
    kind, at, seen = cause.kind, cause, {cause.code}
    while not kind and at.parent in by_code and at.parent not in seen:
        at = by_code[at.parent]
        seen.add(at.code)
        kind = at.kind
    return replace(cause, kind=kind or "natural")
