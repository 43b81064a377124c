"""Counts by cause in an edition to be: where a cause without a schedule has no deaths, and which
give way to deaths that come anew."""

from collections.abc import Collection, Iterable

from server.store.records import Key

Place = tuple[str, str, str]  # area, sex, period
DEATHS, COUNTED = "deaths", "counted_deaths"


def places(keys: Iterable[Key]) -> frozenset[Place]:
    """Where deaths are held by cause: a cause without a schedule there has no deaths."""
    return frozenset(key[:3] for key in keys if key.cause)


def causes_of(keys: Iterable[Key]) -> dict[tuple[str, str], list[str]]:
    """The causes of women and men, in code order, by area and period."""
    found: dict[tuple[str, str], set[str]] = {}
    for key in keys:
        if key.cause and key.sex != "p":
            found.setdefault((key.area, key.period), set()).add(key.cause)
    return {place: sorted(causes) for place, causes in found.items()}


def outdated(base: Iterable[Key], new: Collection[Key]) -> set[Key]:
    """Deaths as counted whose deaths have come anew, all of them counted; and deaths by cause of
    an area, sex and period whose deaths have come anew without that cause."""
    return {
        key
        for key in base
        if (key.measure == COUNTED or key.cause)
        and key not in new
        and (
            key._replace(measure=DEATHS) in new
            or (key.cause and Key(key.area, key.sex, key.period, DEATHS) in new)
        )
    }
