"""The application on an edition of its own, and a reader of it."""

import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from engine.ages import AgeGrid
from engine.panel import Panel
from server.app import create_app
from server.config import Config
from server.store.connect import Session
from tests.conftest import DATABASE, opened
from tests.factories import GRIDS, edition, gompertz_panel
from tests.once import once
from tests.server.web.site import browser

FIVE = GRIDS["abridged"]
SHORT = AgeGrid(FIVE.starts[: FIVE.position(85) + 1])


def counted(sex: str, seed: int, level: float = 2.6e-5, people: float = 2e6) -> Panel:
    return gompertz_panel(sex=sex, seed=seed, level=level, people=people)


@pytest.fixture(scope="session")
def stood(shared: Path, sqlite_template: Path) -> Path:
    """A data folder in which edition 1 of the isle stands; to be copied, not changed."""

    def fill(folder: Path) -> None:
        shutil.copy(sqlite_template, folder / DATABASE)
        with opened(folder) as session:
            panels = {}
            for seed, year in enumerate(("2012", "2013", "2014")):
                for sex in "fm":
                    panels[f"north.{sex}.{year}"] = counted(sex, seed, 2.8e-5 - 1e-6 * seed)
                    panels[f"cape.{sex}.{year}"] = counted(sex, seed, people=3e4).regroup(SHORT)
                    panels[f"rock.{sex}.{year}"] = counted(sex, seed, people=3e3)
            edition(session, panels, provisional=("2014",))

    return once(shared, "routes", fill)


@pytest.fixture
def writer(stood: Path, sqlite_url: str) -> Iterator[Session]:
    """A session on the application's database, on which edition 1 of the isle stands."""
    place = Path(sqlite_url.removeprefix("sqlite:///"))
    shutil.copy(stood / DATABASE, place)
    with opened(place.parent) as session:
        yield session


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
