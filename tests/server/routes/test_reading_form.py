"""The page on which a file is explained: what is asked, kept, and shown again."""

import html
import re

import pytest
from httpx2 import Response
from starlette.testclient import TestClient

from server.intake.mapping import Mapping
from tests.factories import counts_csv
from tests.server.intake.workbooks import xlsx
from tests.server.routes.test_uploads import BASIS, NEW, contents, draft

AGES = ("0", "1-4", "5-9", "10+")
DEATHS = (
    ["Table 4. Deaths by age and sex", "Source: civil register", "", "Year;Sex;Age;Deaths"]
    + [
        f"2014;{sex};{age};{count}"
        for sex in (1, 2)
        for age, count in zip(AGES, ("12", "3", "4", "1.204"), strict=True)
    ]
    + ["2014;1;Unknown;5", "2014;1;Total;1.228", "", "Note: provisional."]
)
PEOPLE = (
    "Year\tAge\tMales\tFemales\n" + "".join(f"2014\t{age}\t9000\t8900\n" for age in AGES)
).encode()
ISLE = {"only_area": "isle", "only_area_name": "Isle"}


def received(client: TestClient, *files: tuple[str, bytes], **fields: str) -> Response:
    """Several files in one field, as a browser sends them."""
    sent = [("files", (name, content, "text/csv")) for name, content in files]
    return client.post("/uploads", data=NEW | fields, files=sent or None)


def form_of(page: str) -> dict[str, str]:
    """What a browser would send: the fields of the page's first form as they stand."""
    body = page[page.index("<form action=") :]
    fields: dict[str, str] = {}
    for tag in re.findall(r"<input [^>]*>", body):
        at = dict(re.findall(r'(\w+)="([^"]*)"', tag))
        if at.get("type") in ("radio", "checkbox") and " checked" not in tag:
            continue
        if "name" in at:
            fields[at["name"]] = html.unescape(at.get("value", ""))
    for name, options in re.findall(r'<select [^>]*name="([^"]+)"[^>]*>(.*?)</select>', body, re.S):
        chosen = re.search(r'value="([^"]*)" selected', options) or re.search(
            r'value="([^"]*)"', options
        )
        fields[name] = html.unescape(chosen[1]) if chosen else ""
    return fields


@pytest.fixture
def place(blank: TestClient) -> str:
    deaths = "\r\n".join(DEATHS).encode("latin-1")
    answer = received(blank, ("table2.txt", PEOPLE), ("deaths.csv", deaths))
    assert answer.status_code == 303, answer.text
    return answer.headers["location"]


ANSWERS = {
    "deaths.marks": "comma-point",
    "deaths.sex.0": "m",
    "deaths.sex.1": "f",
    "unstated_age": "spread",
    "population.role": "population",  # no word in the file tells
} | ISLE


def test_an_ugly_pair_of_files_goes_through(blank: TestClient, place: str) -> None:
    page = blank.get(place).text
    assert "how numbers are written; which sex is meant by “1” and “2”" in page
    assert "never counted twice: age “Total”" in page
    assert "Counts whose age is not stated: “Unknown”" in page
    assert "wide: 2 headings hold sexes" in page
    answer = blank.post(place, data=form_of(page) | ANSWERS | BASIS)
    assert answer.status_code == 303, answer.text
    upload = place.removesuffix("/reading")
    answer = blank.post(f"{upload}/commit", data={"note": "as handed in"})
    assert answer.status_code == 303, answer.text
    assert "the one year 2014" in contents(blank, "dk")


def test_each_missing_answer_is_told_beside_its_field_and_the_rest_is_kept(
    blank: TestClient, place: str
) -> None:
    page = blank.get(place).text
    typed = form_of(page) | ISLE | {"source": "The “<register>”", "provisional": "2014"}
    answer = blank.post(place, data=typed)
    assert answer.status_code == 422
    told = answer.text
    assert "9 answers are missing before the files can be checked" in told
    for words in (
        "Say how numbers are written: “1.204” can be read in two ways",
        "Say which sex “1” stands for.",
        "Say what is to become of these counts.",
        "Say what the file holds.",
        "To be answered: whose deaths are counted.",
    ):
        assert words in told
    again = form_of(told)
    assert (again["source"], again["provisional"]) == ("The “<register>”", "2014")
    assert again["only_area_name"] == "Isle"
    assert blank.get(place.replace("reading", "problems")).status_code == 302  # not checked


def test_another_sign_is_shown_before_it_is_checked(blank: TestClient, place: str) -> None:
    sent = form_of(blank.get(place).text) | ANSWERS | BASIS | {"deaths.delimiter": "comma"}
    answer = blank.post(place, data=sent)
    assert answer.status_code == 200
    assert "With this choice the table is another one" in answer.text
    back = form_of(answer.text)
    assert back["deaths.delimiter"] == "comma"
    assert back["source"] == BASIS["source"]


def test_to_show_it_again_asks_for_nothing(blank: TestClient, place: str) -> None:
    sent = form_of(blank.get(place).text) | {"again": "yes", "deaths.heading": "5"}
    answer = blank.post(place, data=sent)
    assert answer.status_code == 200
    assert "missing" not in answer.text
    assert form_of(answer.text)["deaths.heading"] == "5"


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"deaths.heading": "first"}, "a whole number of 1 or more"),
        ({"most_unstated": "half"}, "a whole number from 0 to 100"),
        ({"provisional": "last year"}, "The provisional years hold “last year”"),
        ({"only_area": "", "only_area_name": ""}, "Give the one area that the counts are of"),
        ({"deaths.shown": "{broken"}, ""),  # then the answers are about what is likely
    ],
)
def test_answers_that_cannot_be_understood_are_told(
    blank: TestClient, place: str, changes: dict[str, str], words: str
) -> None:
    answer = blank.post(place, data=form_of(blank.get(place).text) | ANSWERS | BASIS | changes)
    assert answer.status_code == (422 if words else 303)
    assert words in answer.text


def test_what_a_file_holds_can_be_put_right(blank: TestClient, place: str) -> None:
    sent = form_of(blank.get(place).text)
    exchanged = {"deaths.role": "population", "population.role": "deaths"}
    answer = blank.post(place, data=sent | exchanged | {"source": "The register"})
    assert answer.status_code == 200
    page = answer.text
    assert "population: deaths.csv" in page
    assert "deaths: table2.txt" in page
    assert "The files do not say by themselves: what it holds" not in page  # it was just said
    kept = form_of(page)
    assert (kept["deaths.role"], kept["population.role"]) == ("deaths", "population")
    assert kept["source"] == "The register"
    both = blank.post(place, data=form_of(page) | {"deaths.role": "population"})
    assert both.status_code == 409
    assert "2 files were handed in as population" in both.text


def test_a_table_may_be_pasted(blank: TestClient) -> None:
    pasted = "\tMales\t\tFemales\t\r\n" + "Age\tDeaths\tPopulation\tDeaths\tPopulation\r\n"
    pasted += "".join(f"{age}\t3\t900\t4\t901\r\n" for age in AGES)
    answer = received(blank, pasted=pasted)
    assert answer.status_code == 303
    page = blank.get(answer.headers["location"]).text
    assert "deaths and population: pasted.tsv" in page
    assert "wide: 4 headings hold sexes and the kind of count" in page


def test_a_workbook_with_two_sheets_is_two_files(blank: TestClient) -> None:
    row = (2014, "f", "0", 3)
    book = xlsx(
        [("Year", "Sex", "Age", "Deaths"), row],
        name="D",
        more={"P": [("Population in thousands",), ("Year", "Sex", "Age", "Population"), row]},
    )
    answer = received(blank, ("book.xlsx", book))
    page = blank.get(answer.headers["location"]).text
    assert "deaths: book.xlsx › D" in page
    assert "population: book.xlsx › P" in page
    assert "a heading or title speaks of it; likely thousands" in page


def test_two_files_of_the_same_kind_are_refused_by_name(blank: TestClient) -> None:
    answer = received(blank, ("a.txt", PEOPLE), ("b.txt", PEOPLE.replace(b"Males", b"Males pop")))
    assert answer.status_code == 303  # the first does not tell what it holds
    deaths = "\n".join(DEATHS).encode()
    answer = received(blank, ("a.csv", deaths), ("b.csv", deaths), code="other")
    assert answer.status_code == 422
    assert "b.csv seems to hold the same as another file: deaths." in answer.text


def test_people_of_1_january_are_averaged_as_the_basis_says(
    blank: TestClient, place: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    kept: dict[str, Mapping] = {}

    def keep(*_session: object, mappings: dict[str, Mapping], **_more: object) -> None:
        kept.update(mappings)

    monkeypatch.setattr("server.routes.upload_reading.map_upload", keep)
    sent = form_of(blank.get(place).text) | ANSWERS | BASIS | {"population_is": "january"}
    blank.post(place, data=sent)
    assert {mapping.population_is for mapping in kept.values()} == {"january"}
    blank.post(place, data=sent | {"population_is": "midyear"})
    assert {mapping.population_is for mapping in kept.values()} == {""}


def test_a_file_that_moves_is_recognised_anew(blank: TestClient, place: str) -> None:
    sent = form_of(blank.get(place).text) | ANSWERS | BASIS
    assert blank.post(place, data=sent).status_code == 303
    assert blank.get(f"{place.removesuffix('/reading')}/problems").status_code == 200
    exchanged = {"deaths.role": "population", "population.role": "deaths"}
    assert blank.post(place, data=sent | exchanged).status_code == 200
    page = form_of(blank.get(place).text)
    assert page["population.sex.0"] == ""  # what was said of it as deaths holds no longer
    assert blank.get(f"{place.removesuffix('/reading')}/problems").status_code == 302


def test_a_mapped_draft_shows_what_was_said(blank: TestClient, place: str) -> None:
    blank.post(place, data=form_of(blank.get(place).text) | ANSWERS | BASIS)
    kept = form_of(blank.get(place).text)
    for name, value in (ANSWERS | BASIS).items():
        assert kept[name] == value


def test_what_a_dash_means_is_asked_and_nothing_is_chosen(blank: TestClient) -> None:
    content = counts_csv().replace(b"2001,f,0,north,21", "2001,f,0,north,–".encode())
    place = f"{draft(blank, content, code='salt')}/reading"
    page = blank.get(place).text
    assert "what is meant by “–” in place of a number" in page
    assert "“–” in place of a number means" in page
    sent = form_of(page) | BASIS
    assert (sent["counts.sign.0"], sent["counts.sign_text.0"]) == ("", "–")
    answer = blank.post(place, data=sent)
    assert answer.status_code == 422
    assert "Say what “–” in place of a number means." in answer.text
    answer = blank.post(place, data=sent | {"counts.sign.0": "not_available"})
    assert answer.status_code == 303, answer.text
    told = blank.get(answer.headers["location"]).text
    assert "said to mean not available" in told
    assert form_of(blank.get(place).text)["counts.sign.0"] == "not_available"  # it is kept
