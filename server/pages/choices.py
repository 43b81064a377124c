"""What the plain forms of pinned pages offer: areas, sexes and years of the edition."""

from dataclasses import dataclass

from server.results.loading import Holdings
from server.sentences import names

Options = tuple[tuple[str, str], ...]  # value and label, for a form


@dataclass(frozen=True, slots=True)
class Offer:
    """Everything an edition holds, as options; the newest year first."""

    areas: Options
    sexes: Options
    periods: Options


def offer(held: Holdings) -> Offer:
    return Offer(
        areas=tuple((area.code, area.name or area.code) for area in held.areas),
        sexes=tuple((sex, names.sex(sex)) for sex in ("f", "m", "p") if sex in held.sexes),
        periods=tuple((period, period) for period in reversed(held.periods)),
    )
