"""What stands round a page pinned to an edition: locator, notices, colophon, twins."""

from collections.abc import Iterable

from engine import settings as named
from engine.settings import Settings
from server.pages.page import Caution, Frame, Notice
from server.results.changes import ChangesQuestion
from server.results.questions import Question, address
from server.results.revision import Moved
from server.sentences import standing
from server.sentences.basis import Told
from server.sentences.dates import day
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store.heading import Heading
from server.store.records import Basis


def pinned(
    heading: Heading,
    question: Question,
    *,
    title: str,
    place: Sentence,
    figures: str,
    settings: str,
    notices: tuple[Notice, ...],
) -> Frame:
    """The frame of a view. `place` says what the page is about, in the locator's words."""
    collection, edition = heading.collection, heading.edition
    return Frame(
        title=title,
        address=address(collection.code, edition.number, question),
        locator=phrase(
            _("In {collection}, {edition}: "),
            collection=Piece(collection.name, f"/c/{collection.code}"),
            edition=Piece(
                _("edition {number}", number=edition.number),
                f"/c/{collection.code}/{edition.number}/contents",
            ),
        )
        + place,
        shown=_shown(heading, figures),
        nav="collections",
        notices=notices,
        colophon=(
            (
                _("Edition"),
                _(
                    "{collection}, edition {number}, made on {day} by {by}; content {digest}",
                    collection=collection.name,
                    number=edition.number,
                    day=day(edition.made),
                    by=edition.by,
                    digest=" ".join(edition.digest[at : at + 4] for at in (0, 4, 8)),
                ),
            ),
            (_("Settings"), settings_line(named.find(settings))),
        ),
    )


def _shown(heading: Heading, figures: str) -> str:
    if figures == "released":
        return _("Figures as released")
    if heading.policy is None:
        return _("Figures in full, which are those released: nothing is withheld here")
    return _("Figures in full, nothing withheld: not for release")


def settings_line(settings: Settings) -> str:
    """The named settings in one line."""
    return _(
        "{key}: {label}; intervals of {level} %",
        key=settings.key,
        label=_(settings.label),
        level=round(100 * settings.level),
    )


def notices(
    heading: Heading, question: Question, moved: Moved | None, headline: standing.Headline | None
) -> tuple[Notice, ...]:
    """That the edition was withdrawn, that a newer one stands and by how much it moves the
    headline (`headline` is needed where `moved` is given)."""
    out = []
    if heading.edition.withdrawn:
        event = heading.edition.events[-1]
        instead = None
        if heading.newest is not None:
            instead = Piece(
                _("Edition {number}", number=heading.newest),
                address(heading.collection.code, heading.newest, question),
            )
        text = standing.withdrawn(heading.edition.number, event.at, event.note, instead)
        out.append(Notice(_("Withdrawn"), text))
    if moved is not None and headline is not None:
        newer = Piece(
            _("Edition {number} of {day}", number=moved.number, day=day(moved.made)),
            address(heading.collection.code, moved.number, question),
        )
        told = standing.superseded(heading.edition.number, newer, headline)
        out.append(Notice(_("A newer edition stands"), (*told, *changed(heading, question))))
    return tuple(out)


def changed(heading: Heading, question: Question) -> Sentence:
    """A link to what the newest edition changed since this one."""
    if heading.newest is None:
        return ()
    asked = ChangesQuestion(heading.edition.number, question.figures, question.settings)
    place = address(heading.collection.code, heading.newest, asked)
    return (Piece(" "), Piece(_("What changed"), place), Piece("."))


def cautions(*, beside: Iterable[Told], below: Iterable[Told]) -> tuple[Caution, ...]:
    """What there is to warn of: with the answer, or after the figures."""
    first = [Caution(*told, beside=True) for told in beside if told]
    return (*first, *(Caution(*told) for told in below if told))


def twins(heading: Heading, question: Question) -> dict[str, str]:
    """Addresses of the page's numbers as files."""
    return {
        twin: address(heading.collection.code, heading.edition.number, question, twin=twin)
        for twin in ("csv", "xlsx", "json")
    }


def source(heading: Heading) -> str:
    """The source line of a chart."""
    return _(
        "Source: {source}; edition {number}",
        source=heading.edition.basis.source,
        number=heading.edition.number,
    )


def basis(of: Basis) -> tuple[Sentence, ...]:
    """How the counts were made."""
    return (
        phrase(
            _("{people}, {dated}; {population} ({date}). Source: {source}."),
            people=standing.basis_people(of.people),
            dated=standing.basis_dated(of.dated_by),
            population=standing.basis_population(of.population),
            date=of.population_date,
            source=of.source.rstrip("."),
        ),
        *(
            [phrase(_("Estimate of the population: {vintage}."), vintage=of.vintage.rstrip("."))]
            if of.vintage
            else []
        ),
    )
