"""Deaths of an upload under each cause, counted up for its report."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from server.intake.schedules import DECIMALS
from server.store.records import Cause, Key, Vector


@dataclass(frozen=True, slots=True)
class Counted:
    """Deaths of a cause; without a code, those that have no cause."""

    code: str
    label: str
    deaths: float
    shared: float  # of them shared out, since they did not state their sex, age or area


def counted(
    cells: Mapping[Key, Vector], causes: Sequence[Cause], without: str = ""
) -> tuple[Counted, ...]:
    """In the order of the list, those with deaths; empty where no deaths are by cause. The counts
    of the area `without`, a sum of others, are left out."""
    deaths: dict[str, float] = {}
    stated: dict[str, float] = {}
    parted = {(key.area, key.period) for key in cells if key.cause}
    for key, cell in cells.items():
        if key.area == without or (key.area, key.period) not in parted:
            continue
        if key.measure == "deaths":
            died = float(cell.values.sum())
            deaths[key.cause] = deaths.get(key.cause, 0.0) + died
            counts = cells.get(key._replace(measure="counted_deaths"), cell)
            stated[key.cause] = stated.get(key.cause, 0.0) + float(counts.values.sum())
    found = [
        Counted(one.code, one.label, deaths[one.code], deaths[one.code] - stated[one.code])
        for one in causes
        if one.code in deaths
    ]
    return (*found, *_without_cause(deaths, stated)) if found else ()


def _without_cause(deaths: Mapping[str, float], stated: Mapping[str, float]) -> Iterator[Counted]:
    """What the deaths of all causes have beyond those of the causes."""
    died, counts = (2 * of.get("", 0.0) - sum(of.values()) for of in (deaths, stated))
    if round(died, DECIMALS) > 0:
        yield Counted("", "", round(died, DECIMALS), round(died - counts, DECIMALS))
