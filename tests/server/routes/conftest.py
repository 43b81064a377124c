"""The application on an edition of its own, and a reader of it."""

from collections.abc import Iterator

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from engine.ages import AgeGrid
from engine.panel import Panel
from server.app import create_app
from server.config import Config
from server.store.connect import Session, make_engine, sessions
from tests.factories import GRIDS, edition, gompertz_panel
from tests.server.web.site import browser

FIVE = GRIDS["abridged"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])


def counted(sex: str, seed: int, level: float = 2.6e-5, people: float = 2e6) -> Panel:
    return gompertz_panel(sex=sex, seed=seed, level=level, people=people)


@pytest.fixture
def writer(sqlite_url: str) -> Iterator[Session]:
    """A session on the application's database, on which edition 1 of the isle stands."""
    engine = make_engine(sqlite_url)
    with sessions(engine)() as session:
        panels = {}
        for seed, year in enumerate(("2012", "2013", "2014")):
            for sex in "fm":
                panels[f"north.{sex}.{year}"] = counted(sex, seed, 2.8e-5 - 1e-6 * seed)
                panels[f"cape.{sex}.{year}"] = counted(sex, seed, people=3e4).regroup(SHORT)
                panels[f"rock.{sex}.{year}"] = counted(sex, seed, people=3e3)
        edition(session, panels, provisional=("2014",))
        yield session
    engine.dispose()


@pytest.fixture
def isle(sqlite_url: str, writer: Session) -> FastAPI:
    return create_app(Config(database_url=sqlite_url))


@pytest.fixture
def reader(isle: FastAPI) -> Iterator[TestClient]:
    with browser(isle) as client:
        yield client


@pytest.fixture
def blank(sqlite_url: str) -> Iterator[TestClient]:
    """A reader of an almanac in which nothing stands yet."""
    with browser(create_app(Config(database_url=sqlite_url))) as client:
        yield client
