"""Another choice: in place with scripts, by plain form without."""

from urllib.parse import parse_qs, urlsplit

import pytest
from playwright.sync_api import Page

from tests.browser.conftest import Enter
from tests.browser.site import Site
from tests.browser.tour import READ

SCRIPTS = pytest.mark.parametrize("scripts", [True, False], ids=["scripts", "no-scripts"])


def asked(page: Page) -> dict[str, list[str]]:
    """The choices spelled in the address bar."""
    return parse_qs(urlsplit(page.url).query)


def choose_harrowfen(page: Page) -> None:
    page.get_by_label("Indicator").select_option("5q0")
    page.get_by_role("checkbox", name="Northlade").uncheck()
    page.get_by_role("checkbox", name="Harrowfen").check()
    page.get_by_role("button", name="Draw it").click()


@SCRIPTS
def test_a_trend_follows_the_choice_and_so_does_the_address(
    demo_site: Site, visit: Enter, scripts: bool
) -> None:
    visitor = visit(demo_site, scripts=scripts)
    page = visitor.goto(READ["trend"])
    before = page.locator("h1.answer").inner_text()
    choose_harrowfen(page)
    page.wait_for_url("**of=5q0**")
    assert asked(page) == {
        "of": ["5q0"],
        "area": ["harrowfen", "tollbay"],
        "sex": ["m"],
        "from": ["1999"],
        "to": ["2023"],
        "figures": ["released"],
        "settings": ["almanac-1"],
    }
    page.get_by_role("columnheader", name="Harrowfen").first.wait_for(state="attached")
    assert page.locator("h1.answer").inner_text() != before
    if scripts:
        visitor.drawn()
        assert visitor.axe() == []


def test_with_scripts_the_trend_changes_in_place(demo_site: Site, visit: Enter) -> None:
    visitor = visit(demo_site)
    page = visitor.goto(READ["trend"])
    visitor.drawn()
    page.evaluate("() => { window.stillHere = true }")
    choose_harrowfen(page)
    page.wait_for_url("**of=5q0**")
    visitor.drawn()
    assert page.evaluate("() => window.stillHere") is True
    assert page.evaluate("() => document.activeElement.textContent.trim()") == "Draw it"
    chosen = page.url
    with page.expect_event("domcontentloaded"):  # the page is asked for again
        page.go_back()
    page.wait_for_url("**of=e0**")
    visitor.drawn()
    assert page.get_by_label("Indicator").input_value() == "e0"
    page.goto(chosen)
    assert page.get_by_role("checkbox", name="Harrowfen").is_checked()


def test_what_is_copied_from_the_address_bar_shows_the_same(demo_site: Site, visit: Enter) -> None:
    visitor = visit(demo_site)
    page = visitor.goto(READ["trend"])
    choose_harrowfen(page)
    page.wait_for_url("**of=5q0**")
    page.get_by_role("columnheader", name="Harrowfen").first.wait_for(state="attached")
    swapped = page.locator("main").inner_text()
    other = visit(demo_site)
    other.page.goto(page.url)
    assert other.page.locator("main").inner_text() == swapped


@SCRIPTS
def test_two_others_are_compared_by_form(demo_site: Site, visit: Enter, scripts: bool) -> None:
    visitor = visit(demo_site, scripts=scripts)
    page = visitor.goto(READ["comparison"])
    page.get_by_label("This area").select_option("elderwick")
    page.get_by_label("Against the year").select_option("2018")
    page.get_by_role("button", name="Compare").click()
    page.wait_for_url("**this=elderwick.m.2017&that=tollbay.m.2018**")
    assert "Elderwick" in page.locator("h1.answer").inner_text()


@SCRIPTS
def test_another_area_sex_and_year_by_form(demo_site: Site, visit: Enter, scripts: bool) -> None:
    visitor = visit(demo_site, scripts=scripts)
    page = visitor.goto(READ["population-year"])
    page.get_by_label("Another area").select_option("quillmere")
    page.get_by_label("Year", exact=True).select_option("2005")
    page.get_by_role("button", name="Show it").click()
    page.wait_for_url("**of=quillmere.m.2005**")
    assert "Quillmere" in page.locator("h1.answer").inner_text()
