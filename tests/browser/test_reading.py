"""Every page as it is read: drawn, quiet, accessible, no wider than the screen."""

import pytest

from tests.browser.conftest import Enter
from tests.browser.order import in_order
from tests.browser.site import Site
from tests.browser.tour import READ, REFUSED


@pytest.mark.parametrize("name", READ)
def test_a_page_is_drawn_and_accessible_and_stands_without_scripts(
    demo_site: Site, visit: Enter, name: str
) -> None:
    page = in_order(visit(demo_site), READ[name])
    plain = visit(demo_site, scripts=False).goto(READ[name])
    assert plain.locator("h1.answer").is_visible()
    assert plain.locator("h1.answer").inner_text() == page.locator("h1.answer").inner_text()
    assert plain.locator("table").count() == page.locator("table").count()


@pytest.mark.parametrize("name", ["population-year", "comparison", "trend", "upload-new"])
def test_a_page_is_accessible_on_the_dark_ground(demo_site: Site, visit: Enter, name: str) -> None:
    visitor = visit(demo_site)
    visitor.page.emulate_media(color_scheme="dark")
    visitor.goto(READ[name])
    visitor.drawn()
    assert visitor.axe() == []


@pytest.mark.parametrize("name", REFUSED)
def test_a_refusal_says_what_to_do(demo_site: Site, visit: Enter, name: str) -> None:
    visitor = visit(demo_site)
    visitor.refusals_expected = True
    page = visitor.goto(REFUSED[name])
    assert page.locator("h1.answer").inner_text().strip()
    assert visitor.axe() == []


def test_the_charts_of_a_page_keep_one_age_axis(demo_site: Site, visit: Enter) -> None:
    """Age 65 lies on one vertical from the top of the page to its bottom."""
    visitor = visit(demo_site)
    page = visitor.goto(READ["population-year"])
    visitor.drawn()
    places = page.evaluate(
        """() => [...document.querySelectorAll('.plot')].map(plot => {
             const axis = plot._fullLayout.xaxis, box = plot.getBoundingClientRect();
             return Math.round(box.left + axis._offset + axis.l2p(65)); })"""
    )
    assert len(places) >= 4
    assert len(set(places)) == 1


def test_a_picture_of_a_chart_can_be_taken_away(demo_site: Site, visit: Enter) -> None:
    visitor = visit(demo_site)
    page = visitor.goto(READ["trend"])
    visitor.drawn()
    with page.expect_download() as taken:
        page.get_by_role("link", name="picture").first.click()
    assert taken.value.suggested_filename.endswith(".svg")
    assert "<svg" in taken.value.path().read_text(encoding="utf-8")


@pytest.mark.parametrize("twin", ["csv", "xlsx"])
def test_the_numbers_of_a_page_can_be_taken_away(demo_site: Site, visit: Enter, twin: str) -> None:
    visitor = visit(demo_site)
    page = visitor.goto(READ["comparison"])
    with page.expect_download() as taken:
        page.get_by_role("link", name=twin, exact=True).first.click()
    assert taken.value.suggested_filename.endswith(f".{twin}")
    assert taken.value.path().stat().st_size > 500
