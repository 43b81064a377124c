"""What all routes share: the session, the right each declares, and an address read and pinned."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Annotated, Any, Generic, TypeVar

from fastapi import APIRouter, Depends, Request, Response

from server.accounts.viewer import LOCAL, Right, Viewer
from server.pages.page import Page
from server.results.holdings import NotInEdition
from server.results.questions import CODE, BadValue, Question, address
from server.results.releasing import FULL
from server.sentences.text import _
from server.store import collections, editions
from server.store.connect import Session
from server.store.heading import Heading, heading
from server.web.render import READ, respond

TWINS = ("csv", "xlsx", "json")

Asks = TypeVar("Asks", bound=Question)


def open_session(request: Request) -> Iterator[Session]:
    """One session a request, from the application's factory."""
    with request.app.state.sessions() as session:
        yield session


async def viewer() -> Viewer:
    """Who asks: on loopback always the one local analyst. Needs no thread of its own, as Need."""
    return LOCAL


SessionDep = Annotated[Session, Depends(open_session)]
ViewerDep = Annotated[Viewer, Depends(viewer)]


@dataclass(frozen=True, slots=True)
class Need:
    """A dependency that refuses viewers without a right. NotAllowed."""

    right: Right

    async def __call__(self, viewer: ViewerDep) -> None:
        viewer.require(self.right)


def needs(right: Right) -> Any:
    """Declares the right a route needs: dependencies=[needs(Right.READ)]."""
    return Depends(Need(right))


class Elsewhere(Exception):
    """The address has another spelling, under which it is pinned (302)."""

    def __init__(self, location: str) -> None:
        self.location = location
        super().__init__(location)


class NoSuchPage(LookupError):
    """The path leads nowhere (404)."""


@dataclass(frozen=True, slots=True)
class Asked(Generic[Asks]):
    """A question under its pinned address."""

    heading: Heading
    question: Asks
    address: str
    form: str  # html, or that of a twin
    table: str  # which table a CSV holds; empty: the page's first


def ask(
    request: Request,
    session: Session,
    view: type[Asks],
    collection: str,
    edition: int | None,
    *,
    twin: str = "",
    complete: Callable[[Session, Heading, Asks], Asks] | None = None,
) -> Asked[Asks]:
    """Read the address; one statement where it is the canonical one.

    `complete` fills in what the question leaves open from what the edition holds.
    Raises: Elsewhere to the canonical spelling; UnknownKey, BadValue; Missing, NotInEdition.
    """
    asked = form(twin)
    items = request.query_params.multi_items()
    tables = [text for key, text in items if twin == "csv" and key == "table"]
    question = view.parse((key, text) for key, text in items if not (tables and key == "table"))
    if len(tables) > 1:
        raise BadValue(_("The address names several tables; a CSV file holds one. Keep one."))
    known = heading(
        session, code(collection), newest(session, collection) if edition is None else edition
    )
    if getattr(question, "figures", "") != FULL:
        known = known.released
    if complete is not None:
        question = complete(session, known, question)
    place = address(
        known.collection.code,
        known.edition.number,
        question,
        twin=twin,
        table=tables[0] if tables else "",
    )
    if place != f"{request.url.path}?{request.url.query}":
        raise Elsewhere(place)
    return Asked(known, question, place, asked, tables[0] if tables else "")


def form(twin: str) -> str:
    """The form that the suffix of an address asks for. NoSuchPage where there is none of it."""
    if twin and twin not in TWINS:
        raise NoSuchPage(
            _("There is no .{twin} of this page; there are .csv, .xlsx and .json.", twin=twin)
        )
    return twin or "html"


def code(text: str) -> str:
    """A collection's code as it stands in the path. NoSuchPage where it cannot be one."""
    if not CODE.fullmatch(text):
        raise NoSuchPage(
            _(
                "“{text}” is no code of a collection: a code has 1 to 32 letters, digits, points,"
                " hyphens or underscores.",
                text=text,
            )
        )
    return text


def newest(session: Session, collection: str) -> int:
    """Number of the edition a visitor without a number is sent to. Missing; NotInEdition."""
    found = editions.newest_standing(session, code(collection))
    if found is not None:
        return found.number
    name = collections.find(session, collection).name
    raise NotInEdition(
        _(
            "{collection} has no edition that stands, so there is nothing to show. Upload files for"
            " a new one, or name a withdrawn edition.",
            collection=name,
        )
    )


def answer(
    request: Request,
    asked: Asked[Asks],
    build: Callable[[], Page],
    *,
    beside: Sequence[Heading] = (),
) -> Response:
    """The page or its twin; `build` is called only where nobody holds the bytes yet. `beside` are
    the headings of other editions that it rests on."""
    return respond(
        request,
        build,
        # all that can change it, beside its address and the build
        tag_parts=(asked.heading, *beside),
        form=asked.form,
        table=asked.table,
    )


def pinned(
    view: type[Asks],
    build: Callable[[Session, Heading, Asks], Page],
    *,
    complete: Callable[[Session, Heading, Asks], Asks] | None = None,
    beside: Callable[[Session, Heading, Asks], Sequence[Heading]] | None = None,
) -> APIRouter:
    """The four addresses of a view: with and without an edition's number, the page and its twins.
    `complete` as in `ask`; `beside` finds the headings of other editions that the page rests on."""
    router = APIRouter(dependencies=[needs(Right.READ)])

    def show(
        request: Request,
        session: SessionDep,
        collection: str,
        edition: int | None = None,
        twin: str = "",
    ) -> Response:
        asked = ask(request, session, view, collection, edition, twin=twin, complete=complete)
        others = beside(session, asked.heading, asked.question) if beside else ()
        return answer(
            request,
            asked,
            lambda: build(session, asked.heading, asked.question),
            beside=others,
        )

    for place in (
        f"/c/{{collection}}/{view.view}",
        f"/c/{{collection}}/{{edition:int}}/{view.view}",
    ):
        router.add_api_route(place, show, methods=READ)
        router.add_api_route(f"{place}.{{twin}}", show, methods=READ)
    return router
