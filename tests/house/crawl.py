"""Walk a site by its own links, as a reader would, and read what every page says."""

import re
from collections import Counter
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field
from html.parser import HTMLParser
from typing import Any
from urllib.parse import urljoin, urlsplit

import orjson
from httpx2 import Response
from starlette.testclient import TestClient

READ_ALOUD = {"alt", "aria-label", "aria-description", "placeholder", "title", "data-h"}


@dataclass(slots=True)
class Read:
    """What a page says to people, and where its links lead."""

    running: list[str] = field(default_factory=list)  # text between tags, in order
    texts: list[str] = field(default_factory=list)  # each for itself: read aloud, drawn
    links: list[str] = field(default_factory=list)


class _Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.read = Read()
        self._inside = ""

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        given = dict(attrs)
        self._inside = "json" if given.get("type") == "application/json" else tag
        self.read.texts += [given[name] or "" for name in READ_ALOUD & given.keys()]
        if tag == "input" and given.get("type") in ("submit", "button"):
            self.read.texts.append(given.get("value") or "")
        if tag == "a" and given.get("href"):
            self.read.links.append(given["href"] or "")

    def handle_endtag(self, tag: str) -> None:
        self._inside = ""

    def handle_data(self, data: str) -> None:
        if self._inside == "json":
            self.read.texts += _drawn(orjson.loads(data))
        elif self._inside not in ("script", "style"):
            self.read.running.append(data)


def _drawn(value: Any, key: str = "") -> Iterator[str]:
    """Texts of a figure that people see: titles, labels, ticks, hover."""
    if isinstance(value, dict):
        for name, inner in value.items():
            yield from _drawn(inner, name)
    elif isinstance(value, list):
        for inner in value:
            yield from _drawn(inner, key)
    elif isinstance(value, str) and key in ("text", "ticktext", "hovertemplate", "customdata"):
        yield value


def read(html: str) -> Read:
    reader = _Reader()
    reader.feed(html)
    reader.close()
    return reader.read


def walk(
    client: TestClient, starts: Iterable[str], *, each: int = 2
) -> Iterator[tuple[str, Response]]:
    """Every page that can be reached from these: at most `each` addresses of one path."""
    waiting, seen, taken = list(starts), set(starts), Counter[str]()
    while waiting:
        address = waiting.pop(0)
        answer = client.get(address)
        yield address, answer
        if not answer.headers.get("content-type", "").startswith("text/html"):
            continue
        here = str(answer.url)
        for link in read(answer.text).links:
            there = urlsplit(urljoin(here, link))
            path = re.sub(r"\d+", "0", there.path)
            place = there._replace(scheme="", netloc="", fragment="").geturl()
            inside = there.netloc == urlsplit(here).netloc and not path.startswith("/static/")
            if inside and place not in seen and taken[path] < each:
                taken[path] += 1
                seen.add(place)
                waiting.append(place)
