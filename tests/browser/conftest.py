"""A real Chromium and real sites. Without Chromium these tests are skipped, saying so; with
EBBLINE_REQUIRE_REAL=1 its lack is a failure."""

import os
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from playwright.sync_api import Browser, sync_playwright

from tests.browser.site import Site
from tests.browser.visitor import Visitor, enter
from tests.conftest import DATABASE

ARGUMENTS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--no-first-run",
    "--disable-default-apps",
    "--disable-extensions",
    "--disable-dev-shm-usage",
]
Enter = Callable[..., Visitor]


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    here = Path(__file__).parent
    for item in items:
        if here in item.path.parents:
            item.add_marker(pytest.mark.browser)


def chromium() -> str | None:
    """Path of the browser's program, where there is one."""
    return shutil.which("chromium") or shutil.which("chromium-browser")


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    """One for a file of tests: its loop of events would be in the way of other tests."""
    program = chromium()
    if program is None:
        why = "Chromium not found; on Debian: apt-get install chromium"
        if os.environ.get("EBBLINE_REQUIRE_REAL"):
            pytest.fail(why)
        pytest.skip(why)
    with sync_playwright() as playwright:
        launched = playwright.chromium.launch(executable_path=program, args=ARGUMENTS)
        yield launched
        launched.close()


@pytest.fixture(scope="session")
def demo_site(demonstration: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Site]:
    """The demonstration collection, served; only read from."""
    site = Site(shutil.copytree(demonstration, tmp_path_factory.mktemp("demo") / "data"))
    site.start()
    yield site
    site.stop()


@pytest.fixture
def empty_site(sqlite_template: Path, tmp_path: Path) -> Iterator[Site]:
    """A site on an empty database, for one test."""
    shutil.copy(sqlite_template, tmp_path / DATABASE)
    site = Site(tmp_path)
    site.start()
    yield site
    site.stop()


@pytest.fixture
def own_demo_site(demonstration: Path, tmp_path: Path) -> Iterator[Site]:
    """The demonstration for one test, which may change it."""
    site = Site(shutil.copytree(demonstration, tmp_path / "data"))
    site.start()
    yield site
    site.stop()


@pytest.fixture
def visit(browser: Browser) -> Iterator[Enter]:
    """Enter a site: visit(site), visit(site, size='narrow'), visit(site, scripts=False). At the
    end no visitor may have a complaint."""
    entered: list[Visitor] = []
    sites: list[Site] = []

    def begin(site: Site, *, size: str = "wide", scripts: bool = True) -> Visitor:
        sites.append(site)
        entered.append(enter(browser, site.address, size=size, scripts=scripts))
        return entered[-1]

    yield begin
    for visitor in entered:
        visitor.context.close()
    complaints = [complaint for visitor in entered for complaint in visitor.complaints]
    assert complaints == [], sites[-1].said()
