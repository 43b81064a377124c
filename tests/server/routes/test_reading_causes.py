"""Deaths by cause through the browser's pages: which list they fall into is asked, and shown."""

from starlette.testclient import TestClient

from tests.server.intake.by_cause import NAMES, parted, totals
from tests.server.intake.tables import csv, rows
from tests.server.routes.test_reading_form import form_of, received
from tests.server.routes.test_uploads import BASIS

TABLE = rows(years=range(2010, 2016))
DEATHS = csv([*totals(TABLE), *parted(TABLE)], NAMES)
PEOPLE = csv(TABLE, ("area", "year", "sex", "age", "population"))


def test_a_file_by_cause_goes_through_the_pages(blank: TestClient) -> None:
    answer = received(blank, ("deaths.csv", DEATHS), ("people.csv", PEOPLE))
    place = answer.headers["location"]
    page = blank.get(place).text
    assert "which list its causes of death fall into" in page
    refused = blank.post(place, data=form_of(page) | BASIS)
    assert "Say which list the causes fall into." in refused.text
    shown = blank.post(place, data=form_of(page) | {"deaths.cause_list": "short", "again": "yes"})
    assert "6 codes or names fall into 6 causes of the list." in shown.text
    assert "Sums, compared with the causes that stand beside them: “all causes”." in shown.text
    answer = blank.post(place, data=form_of(shown.text) | BASIS)
    assert answer.status_code == 303, answer.text
    problems = blank.get(place.replace("/reading", "/problems"))
    died = sum(int(str(row["deaths"])) for row in TABLE)
    assert f"{died:,} deaths fall into 6 causes of the list." in problems.text
    assert "Chronic lung disease" in problems.text
    assert "shared out" not in problems.text


def test_codes_in_no_cause_are_named_before_the_check(blank: TestClient) -> None:
    strange = DEATHS.replace(b"W19", b"E95")
    place = received(blank, ("deaths.csv", strange), ("p.csv", PEOPLE)).headers["location"]
    sent = form_of(blank.get(place).text) | {"deaths.cause_list": "short", "again": "yes"}
    assert "In no cause of the list, and refused: “E95”." in blank.post(place, data=sent).text


def test_the_template_of_a_list_is_one(blank: TestClient) -> None:
    assert "/templates/causes.csv" in blank.get("/uploads/new").text
    assert blank.get("/templates/causes.csv").text.startswith("code,name,part of,codes,kind")
