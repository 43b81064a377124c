"""Pages whose address has no choices in it."""

from collections.abc import Callable, Sequence

from fastapi import Request, Response

from server.pages.page import Page
from server.results.questions import Keys, UnknownKey
from server.routes.asking import form
from server.sentences.text import _
from server.web.render import respond


def keys(request: Request, *known: str) -> dict[str, str]:
    """The keys of the address. UnknownKey lists those the page knows; BadValue: one is doubled."""
    given = request.query_params.multi_items()
    if given and not known:
        raise UnknownKey(
            _("The address has the key “{key}”; this page takes none. Remove it.", key=given[0][0])
        )
    read = Keys(given, once=known)
    return {key: read.one(key) for key in known}


def show(
    request: Request, build: Callable[[], Page], *, tag_parts: Sequence[object], twin: str = ""
) -> Response:
    """The page or its twin, of which a CSV names its table. NoSuchPage; as `keys`."""
    asked = form(twin)
    given = keys(request, *(("table",) if twin == "csv" else ()))
    return respond(request, build, tag_parts=tag_parts, form=asked, table=given.get("table", ""))
