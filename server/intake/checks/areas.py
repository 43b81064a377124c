"""Checks of the areas of an upload: names and wholes agree over its files."""

from collections.abc import Iterator
from dataclasses import dataclass

from server.intake.checks.check import Check
from server.intake.labels import is_total
from server.intake.problems import Fault


@dataclass(frozen=True, slots=True)
class Said:
    """What files and mappings of an upload say of areas."""

    names: dict[str, tuple[str, ...]]  # of each code
    wholes: tuple[str, ...]
    codes: tuple[str, ...]
    delivered: tuple[str, ...]


def _names(said: Said) -> Iterator[Fault]:
    for code, names in sorted(said.names.items()):
        if len(names) > 1:
            yield Fault(values={"area": code, "names": ", ".join(names)[:200], "first": names[0]})


def _wholes(said: Said) -> Iterator[Fault]:
    if len(said.wholes) > 1:
        yield Fault(values={"wholes": ", ".join(said.wholes)})


def _unknown_delivered(said: Said) -> Iterator[Fault]:
    for code in said.delivered:
        if code not in said.codes:
            yield Fault(values={"area": code, "codes": ", ".join(said.codes)[:200]})


def _total_among_areas(said: Said) -> Iterator[Fault]:
    for code in said.codes:
        words = (code.replace("-", " "), *said.names.get(code, ()))
        if len(said.codes) > 1 and code not in said.wholes and any(map(is_total, words)):
            others = [other for other in said.codes if other != code]
            yield Fault(values={"area": code, "codes": ", ".join(others)[:200]})


CHECKS: tuple[Check[Said], ...] = (
    Check(
        key="area_names_differ",
        severity="warning",
        meaning="One code of an area comes with several names.",
        found="{area} named {names}",
        expected="one name for each code",
        remedy="“{first}” will be used; correct the file if two areas share the code.",
        find=_names,
    ),
    Check(
        key="wholes_differ",
        severity="error",
        meaning="The mappings of the files name different areas as the whole.",
        found="{wholes}",
        expected="the same whole in every file",
        remedy="Correct the mapping.",
        find=_wholes,
    ),
    Check(
        key="unknown_delivered",
        severity="error",
        meaning="An area is declared as delivered that is not in the files.",
        found="{area}",
        expected="one of the areas {codes}",
        remedy="Correct the mapping.",
        find=_unknown_delivered,
    ),
    Check(
        key="total_among_areas",
        severity="error",
        meaning="An area is called a total of all areas, and nothing says that it is the whole. "
        "Its counts would stand beside those of its parts as if they were others.",
        found="{area} among {codes}",
        expected="a total to be named as the whole area",
        remedy="Say in the mapping that {area} is the whole, of which the others are parts; or "
        "take its rows out.",
        find=_total_among_areas,
    ),
)
