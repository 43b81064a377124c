"""What of small counts a collection shows: /c/{collection}/policy."""

import datetime as dt
from dataclasses import replace

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.actions.set_policy import effect_of, set_policy
from server.pages import policy as page
from server.pages.policy import Trial
from server.results.keys import BadValue
from server.routes.asking import SessionDep, ViewerDep, code, needs
from server.routes.forms import FormDep, text
from server.routes.plain import keys, show
from server.sentences.text import _
from server.store import collections
from server.store.records import Terms
from server.web.problem import Refusal
from server.web.render import READ, redirect, respond

router = APIRouter()
NUMBERS = ("threshold", "persons", "coarse_below", "base")
FIELDS = (*NUMBERS, "zeros", "causes")


@router.api_route("/c/{collection}/policy", methods=READ, dependencies=[needs(Right.READ)])
@router.api_route("/c/{collection}/policy.{twin}", methods=READ, dependencies=[needs(Right.READ)])
def show_policy(
    request: Request, session: SessionDep, viewer: ViewerDep, collection: str, twin: str = ""
) -> Response:
    """The policy, or what others would do: how many counts each would withhold tells the counts
    themselves, so that only those who set policies may try them."""
    known = collections.find(session, code(collection))
    if twin or not request.query_params:
        return show(request, lambda: page.build(session, known.code), tag_parts=(known,), twin=twin)
    viewer.require(Right.ADMINISTER)
    given = keys(request, *FIELDS, "note")
    try:
        terms = read(given)
    except ValueError as error:
        raise BadValue(str(error)) from error
    trial = Trial(terms, effect_of(session, known.code, terms), given.get("note", ""))
    return respond(request, lambda: page.build(session, known.code, trial), tag_parts=(known,))


@router.post("/c/{collection}/policy", dependencies=[needs(Right.ADMINISTER)])
def set_terms(session: SessionDep, viewer: ViewerDep, collection: str, form: FormDep) -> Response:
    try:
        terms = read({name: text(form, name) for name in FIELDS})
    except ValueError as error:
        raise Refusal(422, "Not understood", "{why}", why=str(error)) from error
    now = dt.datetime.now(dt.UTC)
    set_policy(
        session,
        collection=code(collection),
        terms=terms,
        note=text(form, "note"),
        by=viewer,
        now=now,
    )
    return redirect(f"/c/{collection}/policy", status=303)


def read(given: dict[str, str]) -> Terms:
    """Terms as they stand in a form or an address; what is left out is as usual. ValueError."""
    usual = Terms()
    numbers = {name: _number(name, given.get(name, ""), getattr(usual, name)) for name in NUMBERS}
    zeros, causes = (given.get(name) or getattr(usual, name) for name in ("zeros", "causes"))
    return replace(usual, **numbers, zeros=zeros, causes=causes)


def _number(name: str, text: str, otherwise: int) -> int:
    if not text:
        return otherwise
    if not (text.isascii() and text.isdecimal() and len(text) < 9):
        raise ValueError(
            _("“{name}” is “{text}”; it takes a whole number, such as 5.", name=name, text=text)
        )
    return int(text)
