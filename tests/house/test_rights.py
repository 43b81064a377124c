"""Every address that a person can ask for declares the right it needs."""

import pytest
from fastapi.dependencies.models import Dependant
from fastapi.routing import APIRoute

from server.accounts.viewer import Right
from server.app import create_app
from server.config import Config
from server.routes.asking import Need

pytestmark = pytest.mark.house

OPEN_TO_ALL = {"/healthz", "/readyz"}  # asked by machines that watch, and say nothing of the data
ROUTES = [route for route in create_app(Config()).routes if isinstance(route, APIRoute)]


def needed(dependant: Dependant) -> list[Right]:
    found = [dependant.call.right] if isinstance(dependant.call, Need) else []
    return found + [right for inner in dependant.dependencies for right in needed(inner)]


@pytest.mark.parametrize("route", ROUTES, ids=lambda route: f"{route.path} {route.methods}")
def test_a_route_declares_a_right(route: APIRoute) -> None:
    rights = needed(route.dependant)
    if route.path in OPEN_TO_ALL:
        assert rights == []
    else:
        assert rights, "add dependencies=[needs(Right....)]"


@pytest.mark.parametrize("route", ROUTES, ids=lambda route: f"{route.path} {route.methods}")
def test_what_writes_needs_more_than_reading(route: APIRoute) -> None:
    assert route.methods is not None
    writes = bool(route.methods - {"GET", "HEAD"})
    assert writes == any(right is not Right.READ for right in needed(route.dependant)), (
        "reading asks for READ alone; writing for a right of its own"
    )


@pytest.mark.parametrize("route", ROUTES, ids=lambda route: f"{route.path} {route.methods}")
def test_what_can_be_read_answers_to_head(route: APIRoute) -> None:
    assert route.methods is not None
    assert ("GET" in route.methods) == ("HEAD" in route.methods)
