"""What an edition would change, before it is made."""

import json
import re
from collections.abc import Iterable, Mapping
from dataclasses import asdict, dataclass
from urllib.parse import urlencode

from server.results.changes import Altered, Cells, Yearly, yearly
from server.results.keys import BadValue, Items, Keys
from server.sentences.text import _
from server.store.errors import Refused
from server.store.records import (
    ALL_OF_IT,
    GIVES_WAY,
    Area,
    Change,
    Effect,
    Key,
    Taking,
    Vector,
)

NOTHING = Effect()
PLAIN = ("base", "by_cause", "settled", "unsettled")  # kept as they are


@dataclass(frozen=True, slots=True)
class Preview:
    """What the edition would do to the one that stands; `refusal` where it cannot be made."""

    base: int  # 0: none stands
    taking: Taking = ALL_OF_IT
    refusal: Refused | None = None
    schedules: Effect = NOTHING
    cells: Effect = NOTHING  # counts of one age group; under another status alone: restated
    by_cause: int = 0  # how many of the counts added, changed or dropped are deaths by cause
    years: tuple[Yearly, ...] = ()  # those that change
    settled: tuple[str, ...] = ()  # years that become final with no number moving
    unsettled: tuple[str, ...] = ()  # and provisional
    gives_way: Mapping[str, int] | None = None  # schedules of the base that each choice drops

    def to_json(self) -> str:
        """As it is kept, without what is taken."""
        stored = {name: getattr(self, name) for name in PLAIN}
        stored |= {"schedules": asdict(self.schedules), "cells": asdict(self.cells)}
        stored["years"] = [(one.period, *one.deaths, *one.person_years) for one in self.years]
        stored["gives_way"] = None if self.gives_way is None else dict(self.gives_way)
        if self.refusal is not None:
            stored["refusal"] = (self.refusal.text, self.refusal.values)
        return json.dumps(stored, ensure_ascii=False, default=str)

    @classmethod
    def from_json(cls, text: str, taking: Taking) -> "Preview":
        stored = json.loads(text)
        said = stored.get("refusal")
        return cls(
            base=stored["base"],
            taking=taking,
            refusal=Refused(said[0], **said[1]) if said else None,
            schedules=Effect(**stored["schedules"]),
            cells=Effect(**stored["cells"]),
            by_cause=stored.get("by_cause", 0),
            years=tuple(
                Yearly(period, (died, dies), (lived, lives))
                for period, died, dies, lived, lives in stored["years"]
            ),
            settled=tuple(stored["settled"]),
            unsettled=tuple(stored["unsettled"]),
            gives_way=stored["gives_way"],
        )


def preview(
    change: Change, base: Cells, base_areas: tuple[Area, ...], gives_way: Mapping[str, int]
) -> Preview:
    """The change beside all that its base holds."""
    after = _after(change, base)
    gone = base.keys() - change.cells.keys() if change.replace else base.keys() & change.ended
    sizes = [  # what stays is the very same
        (key, "added", len(cell.grid)) for key, cell in change.cells.items() if key not in base
    ]
    restated = []
    for key in (*(key for key in base if key in change.cells), *(gone - change.cells.keys())):
        one = Altered(key, base[key], after.get(key))
        if (kind := one.kind) != "marks" or one.restated:
            sizes.append((key, kind, _ages(one, kind)))
            restated += [one] if one.restated else []
    touched = {key.period for key, _kind, _size in sizes}
    moved = {key.period for key, kind, _size in sizes if kind != "marks"}
    restated = [one for one in restated if one.key.period not in moved]
    both = tuple(
        {key: cell for key, cell in side.items() if key.period in touched} for side in (base, after)
    )
    return Preview(
        base=change.base,
        taking=change.taking,
        schedules=_counted((kind, 1) for _key, kind, _size in sizes),
        cells=_counted((kind, size) for _key, kind, size in sizes),
        by_cause=sum(size for key, kind, size in sizes if key.cause and kind != "marks"),
        years=yearly(both[0], both[1], change.areas, base_areas),
        settled=_years(restated, "final"),
        unsettled=_years(restated, "provisional"),
        gives_way=gives_way,
    )


def _after(change: Change, base: Cells) -> dict[Key, Vector]:
    if change.replace:
        return dict(change.cells)
    kept = {key: cell for key, cell in base.items() if key not in change.ended}
    return kept | dict(change.cells)


def _years(restated: list[Altered], status: str) -> tuple[str, ...]:
    return tuple(
        sorted({one.key.period for one in restated if one.now and one.now.status == status})
    )


KINDS = {"added": "added", "dropped": "dropped", "marks": "restated"}  # others are changed


def _counted(sizes: Iterable[tuple[str, int]]) -> Effect:
    """How many there are of each kind."""
    found = {"added": 0, "changed": 0, "restated": 0, "dropped": 0}
    for kind, size in sizes:
        found[KINDS.get(kind, "changed")] += size
    return Effect(**found)


def _ages(one: Altered, kind: str) -> int:
    """How many numbers of age groups: all of them where another status stands beside them."""
    held = one.now or one.then
    return len(held.grid) if kind == "marks" and held else one.ages


def asked(taking: Taking) -> str:
    """What is taken, as it stands in an address; empty where it is all of the upload."""
    pairs = [("area", area) for area in taking.areas]
    pairs += [("years", ", ".join(taking.periods))] if taking.periods else []
    pairs += [("gives_way", taking.gives_way)] if taking != ALL_OF_IT else []
    return urlencode(pairs)


def taking_of(items: Items) -> Taking:
    """The same read again, from an address or a form. UnknownKey, BadValue."""
    keys = Keys(items, once=("years", "gives_way"), many=("area",))
    areas = tuple(dict.fromkeys(keys.code("area", text) for text in keys.all("area")))
    gives_way = keys.one("gives_way") or GIVES_WAY[0]
    return Taking(
        areas, years_of(keys.one("years")), keys.choice("gives_way", gives_way, GIVES_WAY)
    )


def years_of(text: str) -> tuple[str, ...]:
    """Years as people write them. BadValue.

    >>> years_of("2019, 2021-2023")
    ('2019', '2021', '2022', '2023')
    """
    found: set[int] = set()
    for part in re.split(r"[,;\s]+(?![-–])", text.strip()):
        if not part:
            continue
        span = re.fullmatch(r"(\d{4})(?:\s*[-–]\s*(\d{4}))?", part)
        if span is None:
            raise BadValue(
                _(
                    "“{text}” are no years. Write years of four digits with commas between them,"
                    " or the first and the last, such as 2019, 2021-2023.",
                    text=text,
                )
            )
        found |= set(range(int(span[1]), int(span[2] or span[1]) + 1))
    return tuple(f"{year:04}" for year in sorted(found))
