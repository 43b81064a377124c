"""Every address that a person can ask for declares the right it needs."""

from pathlib import Path

import pytest
from fastapi.dependencies.models import Dependant
from fastapi.routing import APIRoute
from starlette.routing import Mount

from server.accounts.viewer import Right
from server.app import create_app
from server.config import Config
from server.routes import ROUTERS
from server.routes.asking import Need

pytestmark = pytest.mark.house

OPEN_TO_ALL = {"/healthz", "/readyz"}  # asked by machines that watch, and say nothing of the data
ROUTES = [route for router in ROUTERS for route in router.routes if isinstance(route, APIRoute)]
EACH = pytest.mark.parametrize(
    "route", ROUTES, ids=lambda route: " ".join((*sorted(route.methods), route.path))
)


def test_no_address_stands_outside_the_routers(tmp_path: Path) -> None:
    """What the application answers itself is for machines that watch, and files for everyone."""
    own = create_app(Config(data=tmp_path)).routes
    assert {route.path for route in own if isinstance(route, APIRoute)} == OPEN_TO_ALL
    assert {route.path for route in own if isinstance(route, Mount)} == {"/static"}
    assert len(own) == len(OPEN_TO_ALL) + 1 + len(ROUTERS)
    assert len(ROUTES) == sum(len(router.routes) for router in ROUTERS) > 30


def needed(dependant: Dependant) -> list[Right]:
    found = [dependant.call.right] if isinstance(dependant.call, Need) else []
    return found + [right for inner in dependant.dependencies for right in needed(inner)]


@EACH
def test_a_route_declares_a_right(route: APIRoute) -> None:
    assert needed(route.dependant), "add dependencies=[needs(Right....)]"


@EACH
def test_what_writes_needs_more_than_reading(route: APIRoute) -> None:
    assert route.methods is not None
    writes = bool(route.methods - {"GET", "HEAD"})
    assert writes == any(right is not Right.READ for right in needed(route.dependant)), (
        "reading asks for READ alone; writing for a right of its own"
    )


@EACH
def test_what_can_be_read_answers_to_head(route: APIRoute) -> None:
    assert route.methods is not None
    assert ("GET" in route.methods) == ("HEAD" in route.methods)
