"""What the edition to be made of an upload would change, and the choices that decide it."""

import math
from dataclasses import asdict, dataclass

from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.intake.report import Report
from server.pages.contents_tables import Listing
from server.results.changes import Yearly
from server.results.preview import Preview, asked
from server.sentences import taking as say
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _
from server.store.records import Taking

Options = tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class Effect:
    """`areas`, `years` and `gives_way` are what is chosen; the options are empty where there is
    nothing to choose."""

    said: tuple[Sentence, ...]
    years: Listing  # totals before and after
    area_options: Options
    areas: tuple[str, ...]
    periods: str  # as written into the form
    options: Options
    gives_way: str
    asked: str  # the choices as they stand in the address: what was shown before the button


UNSHOWN = "nothing"  # where nothing was shown: no choices are spelled so


def effect(
    taking: Taking, shown: Preview | None, report: Report, *, base: int, number: int
) -> Effect:
    """`number` is that of the edition to be made on `base` (0: none); `shown` None: what these
    choices would change is not worked out yet."""
    years = shown.years if shown else ()
    return Effect(
        said=_said(shown, number),
        years=Listing((_years(years, "effect"),) if years else ()),
        area_options=tuple((code, code) for code in report.areas) if len(report.areas) > 1 else (),
        areas=taking.areas,
        periods=", ".join(taking.periods),
        options=say.choices(shown.gives_way if shown else None) if base else (),
        gives_way=taking.gives_way,
        asked=asked(taking) if shown else UNSHOWN,
    )


def _said(shown: Preview | None, number: int) -> tuple[Sentence, ...]:
    if shown is None:
        return (say.not_worked_out(),)
    if shown.refusal is not None:
        return (phrase(_(shown.refusal.text, **shown.refusal.values)),)
    said = (
        say.would_change(number, shown.base, asdict(shown.cells)),
        say.by_cause(shown.by_cause),
        say.settled(shown.settled, "final"),
        say.settled(shown.unsettled, "provisional"),
    )
    return tuple(sentence for sentence in said if sentence)


def _years(years: tuple[Yearly, ...], key: str) -> Table:
    """Totals of every year that changes; of a first edition there is nothing to set beside them."""
    before = [side[0] for year in years for side in (year.deaths, year.person_years)]
    if not any(map(math.isfinite, before)):
        return _first(years, key)
    heads = [Column("year", _("year"))]
    for name, label in (("deaths", _("deaths")), ("person_years", _("person-years"))):
        heads += [
            Column(f"{name}_before", _("before"), decimals=0, span=label),
            Column(f"{name}_after", _("after"), decimals=0, span=label),
            Column(f"{name}_change", _("change"), decimals=0, signed=True, span=label),
        ]
    rows = (
        Row((year.period, *_pair(year.deaths), *_pair(year.person_years)))
        for year in reversed(years)
    )
    return Table(key, _("Deaths and person-years by year"), tuple(heads), tuple(rows), _whose())


def _first(years: tuple[Yearly, ...], key: str) -> Table:
    heads = (
        Column("year", _("year")),
        Column("deaths_after", _("deaths"), decimals=0),
        Column("person_years_after", _("person-years"), decimals=0),
    )
    rows = (
        Row((year.period, _pair(year.deaths)[1], _pair(year.person_years)[1]))
        for year in reversed(years)
    )
    return Table(key, _("Deaths and person-years by year"), heads, tuple(rows), _whose())


def _whose() -> str:
    return _("Totals over the whole collection, each person counted once.")


def _pair(pair: tuple[float, float]) -> tuple[Cell, ...]:
    lacking = Gap(GapKind.NOT_AVAILABLE)
    parts = (*pair, pair[1] - pair[0])
    return tuple(one if math.isfinite(one) else lacking for one in parts)
