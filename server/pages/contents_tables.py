"""The tables of a contents page: areas with their newest figures, and the collection's editions."""

from collections.abc import Iterable, Mapping
from dataclasses import asdict, dataclass, field

from engine import settings as named
from engine.indicators import INDICATORS
from server.exports.table import Cell, Column, Row, Table
from server.pages import cause_choices, cells, trend_tables
from server.results.contents import Contents
from server.results.questions import PopulationYear, PopulationYearQuestion, address
from server.results.series import Series
from server.sentences import contents as say
from server.sentences import names
from server.sentences import taking as taking_say
from server.sentences.dates import day
from server.sentences.text import _
from server.store.records import Cause, Collection, Edition, UploadFile


@dataclass(frozen=True, slots=True)
class Listing:
    """A table with twins of its own, for what is no part of the page's figures."""

    tables: tuple[Table, ...]
    twins: dict[str, str] = field(default_factory=dict)


def areas(found: Contents, newest: Series) -> Table:
    """Life expectancy at birth by area and sex in the newest year."""
    period, sexes = newest.periods[0], newest.question.sexes
    heads = [Column("area", _("life expectancy at birth, {year}, years", year=period))]
    for sex in sexes:
        heads += cells.columns(sex, names.sex(sex), INDICATORS["e0"].unit.decimals)
    width = len(sexes)
    return Table(
        "areas",
        _("Life expectancy at birth in {year}, by area", year=period),
        tuple(heads),
        tuple(
            _area(found, newest, at, range(at * width, at * width + width))
            for at in range(len(found.holdings.areas))
        ),
        _("Under each figure its interval, which covers chance in deaths only."),
    )


def _area(found: Contents, newest: Series, at: int, lines: range) -> Row:
    """One area; it leads to the first sex that is held."""
    area, settings = found.holdings.areas[at], named.find(found.question.settings)
    line: list[Cell] = [area.code]
    for index in lines:
        line += cells.triple(newest.estimate[index, 0], INDICATORS["e0"].unit, settings)
    held = [index for index in lines if newest.status[index][0]]
    own = [trend_tables.mark(newest, index, 0) for index in lines for _limit in range(3)]
    return Row(
        tuple(line),
        marks=("", *own),
        provisional=any(newest.status[index][0] == "provisional" for index in held),
        href=_address(found, newest, held[0]) if held else "",
        shown=area.name,
    )


def _address(found: Contents, newest: Series, index: int) -> str:
    of = PopulationYear(*newest.lines[index], newest.periods[0])
    heading, asked = found.heading, found.question
    return address(
        heading.collection.code,
        heading.edition.number,
        PopulationYearQuestion(of, asked.figures, asked.settings),
    )


def causes(listed: Iterable[Cause]) -> Table:
    """The cause list: each before its parts."""
    called = {cause.code: cause_choices.name(cause) for cause in listed}
    return Table(
        "causes",
        _("Causes of death this edition counts"),
        (
            Column("cause", _("cause")),
            Column("part_of", _("part of")),
            Column("codes", _("codes")),
            Column("kind", _("kind")),
        ),
        tuple(
            Row(
                (
                    cause.code,
                    called.get(cause.parent, ""),
                    ", ".join(cause.ranges),
                    say.cause_kind(cause.kind),
                ),
                shown=called[cause.code],
            )
            for cause in listed
        ),
    )


def editions_twins(collection: str) -> dict[str, str]:
    """Addresses of the list of editions as a file."""
    return {twin: f"/c/{collection}/editions.{twin}" for twin in ("csv", "xlsx", "json")}


def editions(
    collection: Collection,
    all_: Iterable[Edition],
    newest: int | None,
    erased: Mapping[int, tuple[UploadFile, ...]],
    *,
    hidden: bool,
) -> Table:
    """All editions of a collection, newest first. It changes as editions are made and withdrawn.
    `hidden`: some counts are, by a policy."""
    return Table(
        "editions",
        _("Editions of {collection}", collection=collection.name),
        (
            Column("edition", _("edition")),
            Column("made", _("made")),
            Column("by", _("by")),
            Column("note", _("what it says")),
            Column("did", _("what it did to the one before")),
            Column("standing", _("standing")),
        ),
        tuple(
            Row(
                (
                    edition.number,
                    day(edition.made),
                    edition.by,
                    edition.note,
                    did(edition, erased=edition.number in erased, hidden=hidden),
                    say.standing(
                        stands=edition.number == newest,
                        withdrawn=edition.events[-1].at if edition.withdrawn else None,
                    ),
                ),
                href=f"/c/{collection.code}/{edition.number}/contents",
            )
            for edition in all_
        ),
        _(
            "An edition never changes. Links keep showing the edition they name. What it did is"
            " counted in columns of ages: one count of an area, sex and year."
        ),
    )


def did(edition: Edition, *, erased: bool, hidden: bool) -> str:
    """What it did to the edition it was built on, and whether its bytes are still kept."""
    taking = edition.taking
    took = taking_say.taken(taking.areas, taking.periods, taking.gives_way)
    effect = asdict(edition.effect) if edition.effect else None
    said = taking_say.did(effect, took, hidden=hidden)
    return _("{said}; bytes erased", said=said) if erased else said
