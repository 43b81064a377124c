"""Tags of pages, and the bodies kept under them."""

import hashlib
from collections import OrderedDict
from collections.abc import Iterable
from dataclasses import dataclass
from threading import Lock


@dataclass(frozen=True, slots=True)
class Body:
    """What is sent: bytes, their type, and for a file its name."""

    content: bytes
    media_type: str = "text/html; charset=utf-8"
    name: str = ""
    retarget: str = ""  # where htmx shall put it, if not where it was asked for


def etag(parts: Iterable[object]) -> str:
    """A strong tag over everything that can change the bytes: address, block, state, build."""
    text = "\x1f".join(str(part) for part in parts)
    return f'"{hashlib.sha256(text.encode()).hexdigest()[:32]}"'


def fresh(asked: str | None, tag: str) -> bool:
    """Whether an If-None-Match names this tag."""
    named = [one.strip().removeprefix("W/") for one in (asked or "").split(",")]
    return tag in named or "*" in named


class Bodies:
    """Bodies by tag, the ones longest unused given up beyond `limit` bytes. Safe under threads."""

    def __init__(self, limit: int = 32_000_000) -> None:
        self._limit = limit
        self._held: OrderedDict[str, Body] = OrderedDict()
        self._size = 0
        self._lock = Lock()

    def get(self, tag: str) -> Body | None:
        with self._lock:
            body = self._held.get(tag)
            if body is not None:
                self._held.move_to_end(tag)
            return body

    def put(self, tag: str, body: Body) -> None:
        with self._lock:
            if tag in self._held or len(body.content) > self._limit:
                return
            self._held[tag] = body
            self._size += len(body.content)
            while self._size > self._limit:
                self._size -= len(self._held.popitem(last=False)[1].content)
