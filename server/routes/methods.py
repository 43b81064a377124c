"""How figures are made, and what the words mean."""

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.pages import checks, methods, words
from server.routes.asking import needs
from server.routes.plain import show
from server.web.render import READ

router = APIRouter(dependencies=[needs(Right.READ)])


@router.api_route("/methods", methods=READ)
@router.api_route("/methods.{twin}", methods=READ)
def show_methods(request: Request, twin: str = "") -> Response:
    return show(request, methods.build, tag_parts=(), twin=twin)


@router.api_route("/words", methods=READ)
def show_words(request: Request) -> Response:
    return show(request, words.build, tag_parts=())


@router.api_route("/checks", methods=READ)
@router.api_route("/checks.{twin}", methods=READ)
def show_checks(request: Request, twin: str = "") -> Response:
    return show(request, checks.build, tag_parts=(), twin=twin)
