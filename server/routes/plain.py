"""Pages whose address has no choices in it."""

from fastapi import Request

from server.results.questions import UnknownKey
from server.routes.asking import TWINS, NoSuchPage
from server.sentences.text import _


def keys(request: Request, *known: str) -> dict[str, str]:
    """The keys of the address, each at most once read. UnknownKey lists those the page knows."""
    given = dict(request.query_params)
    for key in given:
        if key not in known:
            text = (
                _(
                    "The address has the key “{key}”, which this page does not know. It knows "
                    "{known}. Remove it or correct its spelling.",
                    key=key,
                    known=", ".join(known),
                )
                if known
                else _("The address has the key “{key}”; this page takes none. Remove it.", key=key)
            )
            raise UnknownKey(text)
    return given


def form(twin: str) -> str:
    """The form asked for by a suffix; NoSuchPage where there is none of it."""
    if twin and twin not in TWINS:
        raise NoSuchPage(
            _("There is no .{twin} of this page; there are .csv, .xlsx and .json.", twin=twin)
        )
    return twin or "html"
