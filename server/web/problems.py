"""How a problem is told: as a page, as a notice beside what htmx left in place, or as JSON."""

from urllib.parse import quote

import orjson
from fastapi import Request, Response

from server.web.guard import SAFE
from server.web.problem import Problem
from server.web.render import PASSING, VARY, of, render
from server.web.templating import block, context

MEDIA_TYPE = "application/problem+json"
_MACHINE = (".json", ".csv", ".xlsx")


def answer(request: Request, problem: Problem) -> Response:
    """The problem in the form its reader can use."""
    if wants_json(request):
        return Response(
            as_json(problem), problem.status, {"Cache-Control": PASSING}, media_type=MEDIA_TYPE
        )
    if request.headers.get("hx-request-type") == "partial":
        return _alert(request, problem)
    return render(request, of(request).error_page(problem), status=problem.status, block="")


def wants_json(request: Request) -> bool:
    """Twins and the API speak JSON; a form does where its sender asks for it first."""
    path = request.url.path
    if path.endswith(_MACHINE) or path.startswith("/api/"):
        return True
    first = request.headers.get("accept", "").partition(",")[0]
    return request.method not in SAFE and "json" in first


def as_json(problem: Problem) -> bytes:
    """RFC 9457, with the request's id and the errors one by one."""
    return orjson.dumps(
        {
            "type": "about:blank",
            "title": problem.title,
            "status": problem.status,
            "detail": problem.detail,
            "instance": problem.asked,
            "request": problem.request_id,
            "errors": [{"detail": error} for error in problem.errors],
        }
    )


def request_id(request: Request) -> str:
    """The id the guard gave to this request; empty where none stands before it."""
    return str(request.scope.get("state", {}).get("request_id", ""))


def asked(request: Request) -> str:
    """The address as it came, which is what may stand in a link."""
    path = quote(request.scope.get("raw_path") or request.url.path, safe="/%:;,+~!*'()@=&$")
    return f"{path}?{request.url.query}".rstrip("?")


def _alert(request: Request, problem: Problem) -> Response:
    """A notice above the page, which stays as it was."""
    web = of(request)
    page = web.error_page(problem)
    template = web.environment.get_template(page.template)
    values = {"page": page, "language": web.language(), "build": web.build}
    content = block(context(web.environment, template, values), "alert")
    headers = {
        "HX-Retarget": "#notices",
        "HX-Reswap": "innerHTML show:top",
        "HX-Push-Url": "false",
        "Cache-Control": PASSING,
        "Vary": VARY,
    }
    return Response(content, problem.status, headers, "text/html; charset=utf-8")
