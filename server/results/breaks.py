"""Where figures must not be followed on: breaks between two years, and years of shock."""

from collections.abc import Iterable, Sequence

from engine.settings import span
from server.store.records import Break

SHOCK = "shock"


def parting(breaks: Iterable[Break], *areas: str) -> tuple[Break, ...]:
    """The breaks that part the figures of any of these areas: theirs, and those of every area. A
    break of one cause of death does not part the figures of all causes."""
    return tuple(
        one for one in breaks if one.kind != SHOCK and not one.cause and one.area in ("", *areas)
    )


def between(breaks: Iterable[Break], first: str, last: str) -> tuple[Break, ...]:
    """Those that lie between two years: after the one, not after the other; in either order."""
    early, late = sorted((first, last))
    return tuple(one for one in breaks if early < one.period <= late)


def shocks(breaks: Iterable[Break], *areas: str) -> tuple[Break, ...]:
    """The years of shock of these areas, and those of every area."""
    return tuple(one for one in breaks if one.kind == SHOCK and one.area in ("", *areas))


def crossed(breaks: Iterable[Break], period: str, years: int) -> bool:
    """Whether the years added up to this one lie on both sides of a break."""
    return years > 1 and bool(between(breaks, span(period, years)[0], period))


def pieces(periods: Sequence[str], breaks: Iterable[Break]) -> tuple[tuple[str, ...], ...]:
    """The years cut where a break lies between two of them.

    >>> pieces(("2009", "2011", "2012", "2013"), [Break("", "2012", "coding")])
    (('2009', '2011'), ('2012', '2013'))
    """
    starts = sorted({one.period for one in breaks})
    found: dict[int, list[str]] = {}
    for period in periods:
        found.setdefault(sum(start <= period for start in starts), []).append(period)
    return tuple(tuple(piece) for piece in found.values())
