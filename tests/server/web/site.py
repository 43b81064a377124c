"""A site of one small page, to ask how pages are answered."""

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import ClassVar

from fastapi import APIRouter, FastAPI, Request, Response
from jinja2 import BaseLoader, ChoiceLoader, DictLoader
from starlette.testclient import TestClient

from server.app import create_app
from server.config import Config
from server.exports.table import Column, Row, Table
from server.pages.page import Frame, Page
from server.sentences.pieces import Piece
from server.store.errors import Missing
from server.web.render import READ, redirect, render, respond

TEMPLATE = """{% extends "base.html" %}
{% block body %}
<div id="trend">{% block trend %}<p>trend of {{ page.name }}</p>
{{ ui.table(page, "first") }}{% endblock %}</div>
<div id="aside">{% block aside %}<p>beside {{ page.name }}</p>{% endblock %}</div>
{% endblock %}"""
HERE = ("127.0.0.1", 50000)


@dataclass(frozen=True, slots=True, kw_only=True)
class SmallPage(Page):
    template: ClassVar[str] = "small/page.html"
    out_of_band: ClassVar[tuple[str, ...]] = ("aside",)
    name: str


def table(key: str) -> Table:
    return Table(key, f"Table {key}", (Column("v", "value", decimals=1),), (Row((1.25,)),))


class Site:
    """Counts how often its page was built; `state` stands for all that can change it."""

    def __init__(self) -> None:
        self.built = 0
        self.state = "1"
        self.tables = ("first", "second")

    def page(self) -> SmallPage:
        self.built += 1
        return SmallPage(
            frame=Frame(title="Small & <bold>", address="/small?of=e0", locator=(Piece("here"),)),
            answer=(Piece("The answer"),),
            tables=tuple(map(table, self.tables)),
            name="<small>",
            twins={"csv": "/small.csv?of=e0", "json": "/small.json?of=e0"},
        )

    def router(self) -> APIRouter:
        router = APIRouter()

        @router.api_route("/small", methods=READ)
        def small(request: Request) -> Response:
            return respond(request, self.page, tag_parts=(self.state,))

        @router.api_route("/small.{form}", methods=READ)
        def twin(request: Request, form: str, table: str = "") -> Response:
            return respond(request, self.page, tag_parts=(self.state,), form=form, table=table)

        @router.api_route("/elsewhere", methods=READ)
        def elsewhere() -> Response:
            return redirect("/small?of=e0&text=über")

        @router.api_route("/missing", methods=READ)
        @router.api_route("/missing.json", methods=READ)
        @router.api_route("/missing.csv", methods=READ)
        @router.api_route("/missing.xlsx", methods=READ)
        def missing() -> Response:
            raise Missing("edition", 7, (1, 3))

        @router.api_route("/broken", methods=READ)
        def broken() -> Response:
            raise RuntimeError("a fault")

        @router.api_route("/counted/{number}", methods=READ)
        def counted(number: int) -> Response:
            return Response(str(number))

        @router.post("/done")
        async def done(request: Request) -> Response:
            return Response(str(len(await request.body())))

        @router.post("/form")
        def form(request: Request) -> Response:
            return render(request, self.page(), status=422)

        return router


def application(site: Site, folder: Path, **settings: object) -> FastAPI:
    app = create_app(Config(data=folder, **settings))  # type: ignore[arg-type]
    environment = app.state.web.environment
    loaders: list[BaseLoader] = [environment.loader, DictLoader({"small/page.html": TEMPLATE})]
    environment.loader = ChoiceLoader(loaders)
    app.include_router(site.router())
    return app


@contextmanager
def browser(
    app: FastAPI, *, client: tuple[str, int] = HERE, host: str = "127.0.0.1:8000"
) -> Iterator[TestClient]:
    with TestClient(
        app, base_url=f"http://{host}", client=client, follow_redirects=False
    ) as reader:
        yield reader
