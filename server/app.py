"""Wiring: the application from its settings, and the map from error class to status."""

import datetime as dt
from collections.abc import AsyncIterator, Callable
from contextlib import asynccontextmanager
from functools import partial
from http import HTTPStatus

from fastapi import FastAPI, Request, Response
from fastapi.exceptions import RequestValidationError
from markupsafe import Markup
from starlette.exceptions import HTTPException
from starlette.types import ASGIApp, Receive, Scope, Send

from seed_scenarios import demonstration
from server.accounts.viewer import NotAllowed
from server.actions.works import works
from server.charts.chart import Chart
from server.charts.figure import figure
from server.config import Config
from server.exports import csv, json, xlsx
from server.jobs.executor import Executor, Inline
from server.pages import error as error_page
from server.pages.page import Page
from server.pages.printed import printed
from server.pages.twins import twin
from server.results.holdings import NotInEdition
from server.results.printed_tables import NotLookedUp
from server.results.questions import BadAddress
from server.results.series import TooLarge
from server.routes import ROUTERS
from server.routes.asking import Elsewhere, NoSuchPage
from server.sentences.care import help_line, helped_by
from server.sentences.text import _, language, n_, signs, speaking
from server.store import errors
from server.store.connect import Session, make_engine, sessions
from server.store.jobs import JobBook
from server.store.migrating import schema_state
from server.web import problems, templating
from server.web.build import build
from server.web.etag import Body
from server.web.guard import Guard
from server.web.problem import Problem, Refusal
from server.web.render import PASSING, Web, redirect
from server.web.static import Static, asset

# error class -> status and title; the error's own text is the answer. The nearest class counts.
ERRORS: tuple[tuple[type[Exception], int, str], ...] = (
    (BadAddress, 400, "This address cannot be read"),
    (NotLookedUp, 422, "This table cannot be looked up"),
    (NotAllowed, 403, "Not allowed"),
    (errors.Missing, 404, "No such page"),
    (NotInEdition, 404, "No such page"),
    (NoSuchPage, 404, "No such page"),
    (errors.Unreachable, 503, "Not reachable"),
    (errors.Refused, 409, "Not done"),
    (TooLarge, 422, "Too large a question"),
)
PLAIN = {
    404: ("No such page", "There is nothing at this address."),
    405: ("Not possible here", "This address does not take what was sent to it."),
}
FAILED = (
    "Something failed",
    "This page could not be made, and the fault is not yours. The log of the server says more.",
)


def inline(book: JobBook, new_session: Callable[[], Session]) -> Executor:
    """Long work is done at once, by whoever asks for it."""
    return Inline(book, works(new_session))


def create_app(
    config: Config, executor: Callable[[JobBook, Callable[[], Session]], Executor] = inline
) -> FastAPI:
    """The application on the database of these settings; `executor` does what takes long."""
    engine = make_engine(config.url)

    @asynccontextmanager
    async def lifespan(app: FastAPI) -> AsyncIterator[None]:
        yield
        engine.dispose()

    app = FastAPI(
        title="Ebbline",
        version=build().version,
        lifespan=lifespan,
        docs_url=None,
        redoc_url=None,
        openapi_url=None,
    )
    app.state.config = config
    app.state.sessions = sessions(engine)
    app.state.demonstration = demonstration
    app.state.book = JobBook(app.state.sessions, lambda: dt.datetime.now(dt.UTC))
    app.state.executor = executor(app.state.book, app.state.sessions)
    app.state.web = _web()
    app.mount("/static", Static(build().static), name="static")
    _health(app, lambda: schema_state(engine))
    for router in ROUTERS:
        app.include_router(router)
    _errors(app)
    app.add_middleware(Guard, limit=config.upload_limit, refuse=_refused, failed=_failed)
    app.add_middleware(_Speaking, code=config.language, help_line=config.help_line)
    return app


def _web() -> Web:
    environment = templating.environment(
        filters={
            "printed": printed,
            "figure": _drawn,
            "lang": lambda code: code if code != "pseudo" else "en",
        },
        names={"_": _, "n_": n_},
        asset=partial(asset, build().static),
    )
    return Web(
        environment=environment,
        writers={"csv": _csv, "xlsx": _xlsx, "json": _json},
        build=build(),
        language=language,
        error_page=error_page.build,
        help_line=help_line,
    )


def _drawn(chart: Chart) -> Markup:
    """A picture for the page's script, its numbers in the signs of the language."""
    own = signs()
    return templating.json_block(figure(chart, _, separators=own.decimal + own.thousands))


def _csv(page: Page, key: str, name: str) -> Body:
    known = [table.key for table in page.tables]
    if key not in known and (key or len(known) != 1):
        raise Refusal(
            400,
            "This address cannot be read",
            "This page has no table “{key}”; it has {known}.",
            key=key,
            known=", ".join(known),
        )
    key = key or known[0]
    return Body(csv.write(page.table(key)), csv.MEDIA_TYPE, f"{name}-{key}.csv")


def _xlsx(page: Page, key: str, name: str) -> Body:
    return Body(xlsx.write(twin(page)), xlsx.MEDIA_TYPE, f"{name}.xlsx")


def _json(page: Page, key: str, name: str) -> Body:
    return Body(json.write(twin(page)), json.MEDIA_TYPE)


def _health(app: FastAPI, state: Callable[[], str]) -> None:
    @app.api_route("/healthz", methods=["GET", "HEAD"])
    def alive() -> Response:
        return Response("alive\n", media_type="text/plain", headers={"Cache-Control": PASSING})

    @app.api_route("/readyz", methods=["GET", "HEAD"])
    def ready() -> Response:
        found = state()
        return Response(
            "ready\n" if found == "head" else f"the database is {found}; run: ebbline database\n",
            200 if found == "head" else 503,
            media_type="text/plain",
            headers={"Cache-Control": PASSING},
        )


def _errors(app: FastAPI) -> None:
    for kind, status, title in ERRORS:
        app.add_exception_handler(kind, partial(_known, status=status, title=title))
    app.add_exception_handler(Elsewhere, _elsewhere)
    app.add_exception_handler(Refusal, _refused)
    app.add_exception_handler(HTTPException, _plain)
    app.add_exception_handler(RequestValidationError, _unreadable)


def _known(request: Request, error: Exception, *, status: int, title: str) -> Response:
    return _told(request, status, title, _sentence(error))


def _sentence(error: Exception) -> str:
    """What an error says: its catalogue text where it keeps one, else its words as they are."""
    text = getattr(error, "text", None)
    return _(text, **getattr(error, "values", {})) if text else str(error)


def _refused(request: Request, error: Exception) -> Response:
    assert isinstance(error, Refusal)
    return _told(request, error.status, error.title, _sentence(error))


def _elsewhere(request: Request, error: Exception) -> Response:
    assert isinstance(error, Elsewhere)
    return redirect(error.location)


def _plain(request: Request, error: Exception) -> Response:
    """Where no route answers."""
    assert isinstance(error, HTTPException)
    phrase = HTTPStatus(error.status_code).phrase
    title, detail = PLAIN.get(error.status_code, (phrase, str(error.detail)))
    response = _told(request, error.status_code, title, _(detail))
    response.headers.update(error.headers or {})
    return response


def _unreadable(request: Request, error: Exception) -> Response:
    """A form or path that lacks a part or holds one of the wrong kind."""
    assert isinstance(error, RequestValidationError)
    found = tuple(
        _("{field}: {message}.", field=".".join(map(str, one["loc"][1:])), message=one["msg"])
        for one in error.errors()
    )
    return _told(
        request,
        422,
        "Not understood",
        n_(
            "One part of what was sent cannot be read.", "{count} parts cannot be read.", len(found)
        ),
        found,
    )


def _failed(request: Request) -> Response:
    title, detail = FAILED
    return _told(request, 500, title, _(detail))


def _told(
    request: Request, status: int, title: str, detail: str, found: tuple[str, ...] = ()
) -> Response:
    problem = Problem(
        status=status,
        title=_(title),
        detail=detail,
        asked=problems.asked(request),
        request_id=problems.request_id(request),
        errors=found,
    )
    return problems.answer(request, problem)


class _Speaking:
    """Everything inside speaks the language of the settings, and names their help line."""

    def __init__(self, app: ASGIApp, code: str, help_line: str) -> None:
        self.app, self.code, self.help_line = app, code, help_line

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        with speaking(self.code), helped_by(self.help_line):
            await self.app(scope, receive, send)
