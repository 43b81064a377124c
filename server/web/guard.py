"""What stands before every route: who may ask, how much may be sent, the headers of each answer.

Pure ASGI. Until there are accounts only this computer is answered, under its own names.
"""

import ipaddress
import logging
import re
import secrets
import time
from collections.abc import Callable

from fastapi import Request, Response
from starlette.datastructures import Headers, MutableHeaders
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from server.web.problem import Refusal

CONTENT_SECURITY_POLICY = "; ".join(
    (
        "default-src 'none'",
        "script-src 'self'",
        "style-src 'self'",
        "style-src-attr 'unsafe-inline'",  # drawn charts carry style attributes
        "img-src 'self' data: blob:",  # heatmaps are data: images, exported pictures blob: ones
        "font-src 'self'",
        "connect-src 'self'",
        "form-action 'self'",
        "base-uri 'none'",
        "frame-ancestors 'none'",
        "object-src 'none'",
        "manifest-src 'self'",
    )
)
FIXED = {
    "Content-Security-Policy": CONTENT_SECURITY_POLICY,
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "same-origin",
    "Cross-Origin-Opener-Policy": "same-origin",
    "Cross-Origin-Resource-Policy": "same-origin",
    "Permissions-Policy": "camera=(), geolocation=(), microphone=()",
}
SAFE = frozenset(("GET", "HEAD", "OPTIONS"))
OWN_NAME = re.compile(r"(localhost|127\.0\.0\.1|\[::1\])(:[0-9]{1,5})?", re.IGNORECASE)
PASSED_ON = ("forwarded", "x-forwarded-for", "x-forwarded-host", "x-real-ip")  # said by proxies
LONGEST = 2_000  # characters of a path; no page's has a tenth of them
DRAINED = 8  # times the limit: an answer reaches a browser only once it has sent what it wanted to

log = logging.getLogger("ebbline")


class Guard:
    """`refuse` makes the answer to a Refusal, `failed` the one to an error nobody foresaw."""

    def __init__(
        self,
        app: ASGIApp,
        *,
        limit: int,
        refuse: Callable[[Request, Refusal], Response],
        failed: Callable[[Request], Response],
    ) -> None:
        self.app, self.limit, self.refuse, self.failed = app, limit, refuse, failed

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        answer, body = _Answer(scope, send), _Body(receive, self.limit)
        request = Request(scope)
        try:
            _judge(scope)
            await self.app(scope, body.receive, body.unless_too_large(answer.send))
            if body.refusal is not None:
                raise body.refusal
        except Exception as error:
            refusal = error if isinstance(error, Refusal) else body.refusal
            if refusal is not None:
                await body.drain()
                response = self.refuse(request, refusal)
            else:
                log.exception("request %s to %r failed", answer.request_id, scope["path"])
                if answer.begun:
                    raise
                response = self.failed(request)
            await response(scope, receive, answer.send)


class _Answer:
    """What goes out: gets the fixed headers, the request's id and the time it took."""

    def __init__(self, scope: Scope, send: Send) -> None:
        self._send, self._start = send, time.perf_counter()
        digits = secrets.token_hex(4)
        self.request_id = f"{digits[:4]}-{digits[4:]}"
        self.begun = False
        scope.setdefault("state", {})["request_id"] = self.request_id

    async def send(self, message: Message) -> None:
        if message["type"] == "http.response.start":
            self.begun = True
            headers = MutableHeaders(scope=message)
            for name, value in FIXED.items():
                headers.setdefault(name, value)
            headers["X-Request-ID"] = self.request_id
            took = (time.perf_counter() - self._start) * 1000
            headers["Server-Timing"] = f"total;dur={took:.1f}"
        await self._send(message)


class _Body:
    """What comes in, counted."""

    def __init__(self, receive: Receive, limit: int) -> None:
        self._receive, self._limit = receive, limit
        self._seen = 0
        self._more = True
        self.refusal: Refusal | None = None

    async def receive(self) -> Message:
        message = await self._next()
        if self._seen > self._limit:
            self.refusal = Refusal(
                413,
                "Too large",
                "What was sent is larger than {limit} MB. Send fewer years at a time, or raise "
                "EBBLINE_UPLOAD_LIMIT.",
                limit=self._limit // 1_000_000,
            )
            raise self.refusal
        return message

    def unless_too_large(self, send: Send) -> Send:
        """FastAPI makes an error met while it reads a body into an answer of its own; drop that."""

        async def sent(message: Message) -> None:
            if self.refusal is None:
                await send(message)

        return sent

    async def drain(self) -> None:
        """Read what is still to come, within reason, so that the sender gets to see the answer."""
        while self._more and self._seen <= DRAINED * self._limit:
            await self._next()

    async def _next(self) -> Message:
        message = await self._receive()
        self._seen += len(message.get("body", b""))
        self._more = message["type"] == "http.request" and message.get("more_body", False)
        return message


def _judge(scope: Scope) -> None:
    headers = Headers(scope=scope)
    passed_on = any(name in headers for name in PASSED_ON)  # from whom is not known
    if passed_on or not _is_this_computer(scope.get("client")):
        raise Refusal(
            403,
            "Not answered",
            "Ebbline answers only the computer it runs on until it has accounts.",
        )
    host = headers.get("host", "")
    if not OWN_NAME.fullmatch(host):
        raise Refusal(
            403,
            "Not answered",
            "This address names the host “{host}”. Ebbline answers to localhost, 127.0.0.1 and "
            "[::1] only.",
            host=host,
        )
    if len(scope["path"]) > LONGEST:
        raise Refusal(414, "Too long", "This address is longer than that of any page. Shorten it.")
    if scope["method"] not in SAFE and not _same_origin(headers):
        raise Refusal(
            403,
            "Not answered",
            "This form came from another site. Open the page in Ebbline and send it from there.",
        )


def _is_this_computer(client: tuple[str, int] | None) -> bool:
    try:
        address = ipaddress.ip_address(client[0] if client else "")
    except ValueError:
        return False
    mapped = getattr(address, "ipv4_mapped", None)
    return (mapped or address).is_loopback


def _same_origin(headers: Headers) -> bool:
    site = headers.get("sec-fetch-site")
    if site is not None:
        return site in ("same-origin", "none")
    origin = headers.get("origin")
    if origin is not None:
        return origin in (f"{scheme}://{headers['host']}" for scheme in ("http", "https"))
    return "cookie" not in headers  # no browser: no one's rights ride along
