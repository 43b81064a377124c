"""The walk of an analyst with real counts: from an empty database to a link for a colleague."""

import re
from pathlib import Path

import pytest

from tests.browser.conftest import Enter
from tests.browser.site import Site
from tests.browser.visitor import Visitor

DENMARK = Path(__file__).parents[1] / "published" / "denmark_deaths_personyears_1974_2012.csv"
UGLY = Path(__file__).parents[1] / "ugly" / "01-title-rows-and-totals.csv"
SCRIPTS = pytest.mark.parametrize("scripts", [True, False], ids=["scripts", "no-scripts"])


def hand_in(visitor: Visitor, file: Path) -> None:
    """From the first page to the reading of the columns."""
    page = visitor.goto("/")
    page.get_by_role("button", name="Upload files").click()
    page.get_by_label("Code, such as saltmarsh").fill("denmark")
    page.get_by_label("Name, such as All deaths, Saltmarsh").fill("All deaths, Denmark")
    page.get_by_label("Data owner").fill("Statistics Denmark")
    page.get_by_label("Or one file with deaths and population").set_input_files(file)
    page.get_by_role("button", name="Read the files").click()
    page.wait_for_url("**/reading")


def state_the_basis(visitor: Visitor) -> None:
    page = visitor.page
    page.get_by_label("Code of the one area").fill("denmark")
    page.get_by_label("Its name").first.fill("Denmark")
    page.get_by_label("the last age of each series has no upper end").check()
    page.locator("input[name=people][value=residents]").check()
    page.locator("input[name=dated_by][value=death]").check()
    page.get_by_label("What population means").select_option("person_years")
    page.get_by_label("Its date").fill("each whole year")
    page.get_by_label("Where the counts come from").fill("Statistics Denmark")
    page.get_by_role("button", name="Check the files").click()
    page.wait_for_url("**/problems")


def look(visitor: Visitor, scripts: bool) -> None:
    """Nothing on the page as it stands is out of order."""
    if scripts:
        visitor.drawn()
        assert visitor.axe() == []


@SCRIPTS
def test_from_a_file_to_a_comparison(empty_site: Site, visit: Enter, scripts: bool) -> None:
    visitor = visit(empty_site, scripts=scripts)
    page = visitor.goto("/")
    look(visitor, scripts)
    hand_in(visitor, DENMARK)
    look(visitor, scripts)
    assert page.locator("select[name='counts.deaths']").input_value() == "deaths"
    assert page.locator("select[name='counts.population']").input_value() == "person_years"
    state_the_basis(visitor)
    look(visitor, scripts)
    assert (
        "3,900" in page.locator("main").inner_text() or "7,800" in page.locator("main").inner_text()
    )
    page.get_by_label("What this edition says").fill("Deaths and person-years, 1974 to 2012.")
    page.get_by_role("button", name="Make").click()
    page.wait_for_url("**/c/denmark/1/contents**")
    look(visitor, scripts)

    page.locator("select[name=this_sex]").select_option("f")
    page.locator("select[name=this_period]").select_option("2012")
    page.locator("select[name=that_sex]").select_option("f")
    page.locator("select[name=that_period]").select_option("1974")
    page.get_by_role("button", name="Compare the two").click()
    page.wait_for_url("**/c/denmark/1/comparison?this=denmark.f.2012&that=denmark.f.1974**")
    look(visitor, scripts)
    answer = page.locator("h1.answer").inner_text()
    assert re.search(r"\b5\.[0-9]", answer), answer  # 76.53 to 81.9 years

    page.goto(f"{empty_site.address}/c/denmark/population-year?of=denmark.f.2012")
    page.wait_for_url("**/c/denmark/1/population-year?of=denmark.f.2012&figures=**")
    look(visitor, scripts)
    assert "81.9" in page.locator("main").inner_text()

    page.goto(f"{empty_site.address}/c/denmark/trend")
    page.wait_for_url("**/c/denmark/1/trend?of=e0&area=denmark&sex=f&sex=m&from=1974&to=2012&**")
    look(visitor, scripts)


@SCRIPTS
def test_an_ugly_file_goes_through(empty_site: Site, visit: Enter, scripts: bool) -> None:
    """Titles, foot notes, decimal commas, Latin-1, totals of ages, sexes and areas."""
    visitor = visit(empty_site, scripts=scripts)
    page = visitor.goto("/")
    page.get_by_role("button", name="Upload files").click()
    page.get_by_label("Code, such as saltmarsh").fill("kueste")
    page.get_by_label("Name, such as All deaths, Saltmarsh").fill("Alle Gestorbenen")
    page.get_by_label("Data owner").fill("Amt")
    page.get_by_label("One file or several at once").set_input_files(UGLY)
    page.get_by_role("button", name="Read the files").first.click()
    page.wait_for_url("**/reading")
    look(visitor, scripts)
    assert page.locator("select[name='counts.marks']").input_value() == "comma-point"
    assert page.locator("select[name='counts.deaths']").input_value() == "Gestorbene"
    assert page.locator("input[name=whole_name]").input_value() == "Insgesamt"
    visitor.refusals_expected = True
    page.evaluate("document.querySelectorAll('[required]').forEach(one => one.required = false)")
    page.get_by_role("button", name="Check the files").click()
    page.wait_for_load_state()
    look(visitor, scripts)
    assert "answers are missing" in page.locator("h1.answer").inner_text()
    page.locator("input[name=people][value=residents]").check()
    page.locator("input[name=dated_by][value=death]").check()
    page.get_by_label("What population means").select_option("midyear")
    page.get_by_label("Its date").fill("30 June")
    page.get_by_label("Where the counts come from").fill("Amt")
    page.get_by_role("button", name="Check the files").click()
    page.wait_for_url("**/problems")
    look(visitor, scripts)
    assert "can become an edition" in page.locator("h1.answer").inner_text()


@SCRIPTS
def test_a_faulty_file_is_told_row_by_row_and_becomes_nothing(
    empty_site: Site, visit: Enter, scripts: bool, tmp_path: Path
) -> None:
    lines = DENMARK.read_text(encoding="utf-8").splitlines()
    lines[211] = lines[211].replace(lines[211].split(",")[3], "minus two", 1)
    faulty = tmp_path / "faulty.csv"
    faulty.write_text("\n".join(lines) + "\n", encoding="utf-8")
    visitor = visit(empty_site, scripts=scripts)
    hand_in(visitor, faulty)
    state_the_basis(visitor)
    page = visitor.page
    look(visitor, scripts)
    told = page.locator("main").inner_text()
    assert "212" in told
    assert "minus two" in told
    assert page.get_by_role("button", name="Make").is_disabled()
    with page.expect_download() as taken:
        page.get_by_role("link", name="csv", exact=True).first.click()
    assert "minus two" in taken.value.path().read_text(encoding="utf-8-sig")

    page.get_by_label("The corrected file").set_input_files(DENMARK)
    page.get_by_role("button", name="Read it again").click()
    page.wait_for_url("**/uploads/2/problems")
    assert page.get_by_role("button", name="Make").is_enabled()
    page.goto(empty_site.address + "/uploads")
    look(visitor, scripts)


def test_the_demonstration_is_loaded_by_one_button(empty_site: Site, visit: Enter) -> None:
    visitor = visit(empty_site)
    page = visitor.goto("/")
    page.get_by_role("button", name="Load the demonstration").click(timeout=180_000)  # it is built
    page.wait_for_url("**/c/quillmere/3/contents**")
    assert "Quillmere" in page.locator("main").inner_text()
    look(visitor, scripts=True)


def test_an_edition_is_withdrawn_and_reinstated(own_demo_site: Site, visit: Enter) -> None:
    visitor = visit(own_demo_site)
    page = visitor.goto("/c/quillmere/3/contents")
    page.get_by_label("Why, in a sentence").fill("A file was sent twice.")
    page.get_by_role("button", name="Withdraw").click()
    page.wait_for_load_state("load")
    assert "A file was sent twice." in page.locator("main").inner_text()
    page.goto(own_demo_site.address + "/c/quillmere/trend")
    page.wait_for_url("**/c/quillmere/2/trend**")  # the newest that stands
    page.goto(own_demo_site.address + "/c/quillmere/3/trend?of=e0")
    visitor.drawn()
    assert "withdrawn" in page.locator("#notices").inner_text().lower()
    look(visitor, scripts=True)
    page.goto(own_demo_site.address + "/c/quillmere/3/contents")
    page.get_by_label("Why, in a sentence").fill("It was right after all.")
    page.get_by_role("button", name="Reinstate").click()
    page.goto(own_demo_site.address + "/c/quillmere/trend")
    page.wait_for_url("**/c/quillmere/3/trend**")
