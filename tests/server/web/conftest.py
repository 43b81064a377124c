"""The small site and a reader of it."""

from collections.abc import Iterator
from pathlib import Path

import pytest
from starlette.testclient import TestClient

from tests.server.web.site import Site, application, browser


@pytest.fixture
def site() -> Site:
    return Site()


@pytest.fixture
def reader(site: Site, tmp_path: Path) -> Iterator[TestClient]:
    with browser(application(site, tmp_path)) as client:
        yield client
