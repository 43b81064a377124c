"""Static files under addresses that hold their digest, and so never change."""

from collections.abc import MutableMapping
from typing import Any

from fastapi import Response
from starlette.staticfiles import StaticFiles

from server.paths import folder

FOREVER = "public, max-age=31536000, immutable"
CHECKED = "public, no-cache"


def asset(digest: str, name: str) -> str:
    """The address of a static file; relative addresses in a style sheet stay under the digest."""
    return f"/static/{digest}/{name}"


class Static(StaticFiles):
    """/static/{digest}/{name}: kept for ever under the digest in force, checked under another."""

    def __init__(self, digest: str) -> None:
        super().__init__(directory=folder("static"))
        self._digest = digest

    async def get_response(self, path: str, scope: MutableMapping[str, Any]) -> Response:
        digest, _, name = path.partition("/")
        response = await super().get_response(name, scope)
        current = digest == self._digest and response.status_code in (200, 304)
        response.headers["Cache-Control"] = FOREVER if current else CHECKED
        return response
