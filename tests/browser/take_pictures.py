"""Pictures of the pages: `python -m tests.browser.take_pictures` renews those of README, and with a
folder it takes every page of the tour there, whole, at both widths and in print."""

import sys
import tempfile
from pathlib import Path

from playwright.sync_api import Browser, sync_playwright

from tests.browser.conftest import ARGUMENTS, chromium
from tests.browser.site import Site
from tests.browser.tour import READ, REFUSED
from tests.browser.visitor import enter
from tests.house.tree import ROOT

README = {"population-year": 1500, "comparison": 1720, "trend": 1300}  # heights of the pictures


def for_readme(browser: Browser, site: Site, folder: Path) -> None:
    for name, height in README.items():
        visitor = enter(browser, site.address)
        visitor.page.set_viewport_size({"width": 1280, "height": height})
        visitor.goto(READ[name])
        visitor.drawn()
        visitor.page.screenshot(path=folder / f"{name}.png")
        visitor.context.close()


def everything(browser: Browser, site: Site, folder: Path) -> None:
    for size in ("wide", "narrow"):
        visitor = enter(browser, site.address, size=size)
        for name, address in {**READ, **REFUSED}.items():
            visitor.goto(address)
            visitor.drawn()
            visitor.page.screenshot(path=folder / f"{name}-{size}.png", full_page=True)
            if size == "wide" and name in README:
                visitor.page.pdf(path=folder / f"{name}.pdf", prefer_css_page_size=True)
        visitor.context.close()


def main(folder: Path | None) -> None:
    with tempfile.TemporaryDirectory() as data, sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=chromium(), args=ARGUMENTS)
        site = Site(Path(data)).start("demo")
        try:
            if folder is None:
                for_readme(browser, site, ROOT / ".pictures")
            else:
                everything(browser, site, folder)
        finally:
            site.stop()
            browser.close()


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else None)
