"""From a page to an answer: whole or one block of it, HTML or a twin, sent once and known again.

`respond` is for what can be read: it asks for the page only where neither the reader nor this
process holds the bytes already. `render` is for a page that follows from what was just done.
"""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, ClassVar, Protocol, cast
from urllib.parse import quote

from fastapi import Request, Response
from jinja2 import Environment

from server.web import templating
from server.web.build import Build
from server.web.etag import Bodies, Body, etag, fresh
from server.web.problem import Problem

FRAME_BLOCKS = ("locator", "notices", "answer", "colophon")  # come along with any block
VARY = "HX-Request-Type, HX-Target"
READ = ["GET", "HEAD"]  # methods of every address that can be read: a link preview asks by HEAD
PINNED = "private, no-cache"
PASSING = "private, no-store"


class Keyed(Protocol):
    @property
    def key(self) -> str: ...


class Shown(Protocol):
    """A page: its template, and its tables for the twins. `out_of_band` names further blocks that
    go along when one block is asked for alone."""

    template: ClassVar[str]
    out_of_band: ClassVar[tuple[str, ...]]

    @property
    def tables(self) -> Sequence[Keyed]: ...


Writer = Callable[[Any, str, str], Body]  # page, key of a table, name of the file -> a twin


@dataclass(frozen=True, slots=True)
class Web:
    """What answering needs; made once by `app.py` and held in the app's state."""

    environment: Environment
    writers: Mapping[str, Writer]  # by suffix: csv, xlsx, json
    build: Build
    language: Callable[[], str]
    error_page: Callable[[Problem], Shown]
    help_line: Callable[[], str] = str  # what else of the settings pages say
    bodies: Bodies = field(default_factory=Bodies)


def of(request: Request) -> Web:
    return cast(Web, request.app.state.web)


def respond(
    request: Request,
    build: Callable[[], Shown],
    *,
    tag_parts: Sequence[object],
    form: str = "html",
    table: str = "",
) -> Response:
    """The page at this address, or a twin in another `form` that there is (csv of one `table`).

    `tag_parts` are all that can change the page beside its address and the build: for a page of an
    edition the records of both it and its collection. A repeat does not call `build`. A csv that
    names no table is redirected to the page's first.
    """
    web = of(request)
    asked = asked_block(request) if form == "html" else ""
    place = (request.url.path, request.url.query, asked)
    tag = etag((*place, *tag_parts, web.build.digest, web.language(), web.help_line()))
    headers = {"ETag": tag, "Cache-Control": PINNED, "Vary": VARY}
    if fresh(request.headers.get("if-none-match"), tag):
        return Response(status_code=304, headers=headers)
    body = web.bodies.get(tag)
    if body is None:
        page = build()
        if form == "csv" and not table and len(page.tables) > 1:
            here = f"{request.url.path}?{request.url.query}".rstrip("?")
            return redirect(templating.of_table(here, page.tables[0].key))
        if form == "html":
            body = _html(web, page, asked)
        else:
            body = web.writers[form](page, table, _file_name(request.url.path))
        web.bodies.put(tag, body)
    return _answer(body, headers)


def render(
    request: Request,
    page: Shown,
    *,
    tag: str | None = None,
    status: int = 200,
    block: str | None = None,
) -> Response:
    """A page that is at hand; the block htmx asks for, or the one named."""
    asked = asked_block(request) if block is None else block
    headers = {"Vary": VARY, "Cache-Control": PINNED if tag else PASSING}
    if tag:
        headers["ETag"] = tag
        if fresh(request.headers.get("if-none-match"), tag):
            return Response(status_code=304, headers=headers)
    return _answer(_html(of(request), page, asked), headers, status)


def redirect(address: str, *, status: int = 302) -> Response:
    """To another address: 302 to a canonical one, 303 after something was done."""
    return Response(
        status_code=status,
        headers={"Location": quote(address, safe="/?&=%:;,.+~-_!*'()@#"), "Cache-Control": PINNED},
    )


def asked_block(request: Request) -> str:
    """The id htmx wants replaced ("trend" of "section#trend"); empty: the whole page."""
    if request.headers.get("hx-request-type") != "partial":
        return ""
    return request.headers.get("hx-target", "").partition("#")[2]


def _html(web: Web, page: Shown, asked: str) -> Body:
    template = web.environment.get_template(page.template)
    values = {"page": page, "language": web.language(), "build": web.build}
    if not asked:
        return Body(template.render(values).encode())
    if asked not in template.blocks:
        return Body(template.render(values).encode(), retarget="body")
    context = templating.context(web.environment, template, values)
    parts = [f"<title>{templating.block(context, 'title')}</title>"]
    parts.append(templating.block(context, asked))
    for name in (*FRAME_BLOCKS, *page.out_of_band):
        inner = templating.block(context, name)
        parts.append(f'<hx-partial hx-target="#{name}" hx-swap="innerHTML">{inner}</hx-partial>')
    return Body("\n".join(parts).encode())


def _file_name(path: str) -> str:
    """/c/quillmere/2/trend.csv -> quillmere-2-trend"""
    return "-".join(path.rpartition(".")[0].removeprefix("/c/").strip("/").split("/"))


def _answer(body: Body, headers: dict[str, str], status: int = 200) -> Response:
    if body.name:
        headers["Content-Disposition"] = f'attachment; filename="{body.name}"'
    if body.retarget:
        headers["HX-Retarget"] = body.retarget
    return Response(body.content, status, headers, body.media_type)
