"""Of an upload only some areas or years, and what they replace."""

from collections.abc import Iterable

from server.intake.parsing import Parsed
from server.store.errors import Refused
from server.store.records import Area, Key, Taking, Vector


def taken(
    parsed: Parsed, taking: Taking, base_areas: Iterable[Area]
) -> tuple[dict[Key, Vector], tuple[Area, ...]]:
    """The schedules of the areas and years taken, and where these areas lie; wholes that they are
    part of and that do not stand yet come along.

    Raises: Refused where an area or year is named that was not handed in, or nothing is left.
    """
    _require_handed(parsed, taking)
    cells = {key: cell for key, cell in parsed.cells.items() if taking.takes(key.area, key.period)}
    said = bool(parsed.breaks or parsed.successions)  # of counts that stand
    if not cells and (parsed.cells or not said or not tuple(base_areas)):
        raise Refused(
            "Of these areas and years the files hold no counts. Choose areas and years that go "
            "together, or take all of them."
        )
    if not taking.areas:
        return cells, tuple(parsed.areas)
    by_code = {area.code: area for area in parsed.areas}
    standing = {area.code for area in base_areas}
    kept, waiting = set(), list(taking.areas)
    while waiting:
        area = by_code[waiting.pop()]
        kept.add(area.code)
        if area.parent in by_code and area.parent not in standing | kept:
            waiting.append(area.parent)
    return cells, tuple(area for area in parsed.areas if area.code in kept)


def _require_handed(parsed: Parsed, taking: Taking) -> None:
    handed = {
        "areas": {area.code for area in parsed.areas},
        "years": {key.period for key in parsed.cells},
    }
    for kind, named in (("areas", taking.areas), ("years", taking.periods)):
        unknown = sorted(set(named) - handed[kind])
        if unknown:
            raise Refused(
                "The {kind} {unknown} were not handed in; the files hold {known}. Take some of "
                "these.",
                kind=kind,
                unknown=", ".join(unknown),
                known=", ".join(sorted(handed[kind])),
            )
