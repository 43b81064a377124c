"""What holds of every page at every width."""

from playwright.sync_api import Page

from tests.browser.visitor import Visitor

OPEN_FOLDS = "() => document.querySelectorAll('details').forEach(fold => { fold.open = true })"
TOO_WIDE = "() => document.documentElement.scrollWidth - document.documentElement.clientWidth"
FITS = f"() => ({TOO_WIDE})() <= 0"


def in_order(visitor: Visitor, path: str) -> Page:
    """The page, drawn, accessible and no wider than the screen, with its folds closed and open."""
    page = visitor.goto(path)
    visitor.drawn()
    assert page.locator("h1.answer").inner_text().strip()
    assert page.evaluate(TOO_WIDE) <= 0
    assert visitor.axe() == []
    page.evaluate(OPEN_FOLDS)
    assert visitor.axe() == []
    assert page.evaluate(TOO_WIDE) <= 0
    return page
