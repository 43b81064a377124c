"""Ratios of what it takes to answer: statements, figures, pages known, kept and made.

    OPENBLAS_NUM_THREADS=1 taskset -c 0 python -m tests.benchmarks.web

The application is called in this process, without a network. Time is the processor's, all threads
together, so that other work on the machine counts less. Sides of a ratio take turns, the one that
begins changing; medians are compared, and the spread is the 90th over the 10th percentile. Nothing
is asserted: machines differ. That the numbers of statements are equal is tested in
tests/server/routes/test_statements.py.
"""

import asyncio
import statistics
import tempfile
import time
from collections.abc import Awaitable, Callable, Mapping
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path
from urllib.parse import urlsplit

import orjson
import plotly.graph_objects as go
from fastapi import FastAPI, Response
from sqlalchemy import Engine, event
from starlette.types import ASGIApp, Message

from seed_scenarios import quillmere
from seed_scenarios.quillmere_counts import WHOLE
from server.app import create_app
from server.charts.chart import Chart
from server.charts.figure import figure
from server.config import Config
from server.pages import population_year
from server.results.questions import (
    ComparisonQuestion,
    PopulationYear,
    PopulationYearQuestion,
    TrendQuestion,
    address,
)
from server.sentences.text import _
from server.store.connect import make_engine, sessions
from server.store.heading import heading
from server.store.migrating import migrate
from server.web.etag import Bodies
from tests.factories import NOON
from tests.server.charts.test_figure import painted
from tests.server.routes.test_statements import LARGE, SMALL, wide_isle

LIFE = PopulationYearQuestion(PopulationYear(WHOLE.code, "f", "2022"))
PAGES = (
    LIFE,
    ComparisonQuestion(
        PopulationYear("tollbay", "m", "2022"), PopulationYear(WHOLE.code, "m", "2022")
    ),
    TrendQuestion("e0", (WHOLE.code,), ("f", "m"), "1999", "2023"),
)
Side = Callable[[], Awaitable[object]]


@dataclass(frozen=True)
class Answer:
    status: int
    headers: dict[str, str]
    content: bytes


async def ask(app: ASGIApp, place: str, headers: Mapping[str, str] | None = None) -> Answer:
    """One GET, by calling the application."""
    parts, sent = urlsplit(place), list[Message]()
    given = {"host": "127.0.0.1:8000", **(headers or {})}
    scope = {
        "type": "http",
        "asgi": {"version": "3.0"},
        "http_version": "1.1",
        "method": "GET",
        "scheme": "http",
        "path": parts.path,
        "raw_path": parts.path.encode(),
        "query_string": parts.query.encode(),
        "headers": [(name.encode(), text.encode()) for name, text in given.items()],
        "client": ("127.0.0.1", 50000),
        "server": ("127.0.0.1", 8000),
    }

    async def receive() -> Message:
        return {"type": "http.request", "body": b"", "more_body": False}

    async def send(message: Message) -> None:
        sent.append(message)

    await app(scope, receive, send)
    told = {name.decode(): text.decode() for name, text in sent[0]["headers"]}
    return Answer(sent[0]["status"], told, b"".join(one.get("body", b"") for one in sent))


async def turns(sides: Mapping[str, Side], rounds: int) -> dict[str, tuple[float, float]]:
    """Median seconds of the processor and spread of each side, in rotated order."""
    seconds: dict[str, list[float]] = {name: [] for name in sides}
    names = list(sides)
    for number in range(rounds + 1):
        start = number % len(names)
        for name in (*names[start:], *names[:start]):
            begun = time.process_time()
            await sides[name]()
            if number:  # the first round warms up
                seconds[name].append(time.process_time() - begun)
    found = {}
    for name, spent in seconds.items():
        low, *_between, high = statistics.quantiles(spent, n=10)
        found[name] = (statistics.median(spent), high / low)
    return found


def printed(title: str, found: dict[str, tuple[float, float]], base: str) -> None:
    """Each side's time as a multiple of the base's."""
    print(f"\n{title}\n{'':38}{'ms':>10}{'x ' + base:>16}{'spread':>8}")
    for name, (median, spread) in found.items():
        ratio = median / found[base][0]
        print(f"{name:38}{1e3 * median:10.3f}{ratio:16.2f}{spread:8.2f}")


async def statements(folder: Path) -> None:
    url = f"sqlite:///{folder / 'wide.db'}"
    migrate(url)
    app, seen = wide_isle(url), list[str]()

    def note(_c: object, _cursor: object, statement: str, *_rest: object) -> None:
        if not statement.startswith("BEGIN"):
            seen.append(statement)

    event.listen(Engine, "before_cursor_execute", note)
    print("statements of a trend:")
    for name, place in (("1 x 2", SMALL), ("20 x 50", LARGE)):
        seen.clear()
        begun = time.process_time()
        answer = await ask(app, place)
        spent = time.process_time() - begun
        print(f"  {name:8} {len(seen)} statements, {answer.status}, {1e3 * spent:.0f} ms")
    event.remove(Engine, "before_cursor_execute", note)


def charts(folder: Path) -> tuple[Chart, ...]:
    """The pictures of one population-year page."""
    engine = make_engine(Config(data=folder).url)
    with sessions(engine)() as session:
        found = population_year.build(session, heading(session, quillmere.CODE, 2), LIFE).charts
    engine.dispose()
    return found


async def figures(drawn: tuple[Chart, ...]) -> None:
    ready = [figure(chart, _) for chart in drawn]
    coloured = [painted(one) for one in ready]

    async def plain() -> None:
        for chart in drawn:
            orjson.dumps(figure(chart, _))

    async def written() -> None:
        for one in ready:
            orjson.dumps(one)

    async def objects() -> None:
        for one in coloured:
            go.Figure(data=one["data"], layout=one["layout"]).to_json()

    size = sum(len(orjson.dumps(one)) for one in ready)
    found = await turns(
        {"Chart to dict and orjson": plain, "dict to orjson": written, "graph_objects": objects}, 15
    )
    printed(f"{len(drawn)} figures, {size / 1e3:.0f} KB", found, "graph_objects")
    for name in ("Chart to dict and orjson", "dict to orjson"):
        print(f"  graph_objects over {name}: {found['graph_objects'][0] / found[name][0]:.0f}")


async def pages(folder: Path) -> None:
    app, forgetful, bare = (
        create_app(Config(data=folder)),
        create_app(Config(data=folder)),
        FastAPI(),
    )
    forgetful.state.web = replace(forgetful.state.web, bodies=Bodies(limit=0))

    @bare.get("/hello")
    def hello() -> Response:
        return Response("hello")

    places = {one.view: address(quillmere.CODE, 2, one) for one in PAGES}
    life = places[LIFE.view]
    known = {"if-none-match": (await ask(app, life)).headers["etag"]}
    quick: dict[str, Side] = {
        "hello": lambda: ask(bare, "/hello"),
        "hello behind the guard (/healthz)": lambda: ask(app, "/healthz"),
        "pinned page, known to its reader: 304": lambda: ask(app, life, known),
        "pinned page, body kept": lambda: ask(app, life),
    }
    printed("answers", await turns(quick, 300), "hello")
    slow: dict[str, Side] = {"hello": quick["hello"]}
    slow |= {f"{view}, made": partial(ask, forgetful, place) for view, place in places.items()}
    printed("pages made anew", await turns(slow, 15), "hello")


async def main() -> None:
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        migrate(Config(data=folder).url)
        engine = make_engine(Config(data=folder).url)
        with sessions(engine)() as session:
            quillmere.build(session, now=NOON)
        engine.dispose()
        await statements(folder)
        await figures(charts(folder))
        await pages(folder)


if __name__ == "__main__":
    asyncio.run(main())
