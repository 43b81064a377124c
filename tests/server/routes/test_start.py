"""The first page, the templates and the demonstration button."""

import pytest
from starlette.testclient import TestClient

from seed_scenarios import quillmere


def test_an_empty_almanac_says_what_to_do_next(blank: TestClient) -> None:
    answer = blank.get("/")
    assert answer.status_code == 200
    assert "Nothing has been uploaded yet." in answer.text
    for name in ("deaths", "population", "births"):
        assert f'href="/templates/{name}.csv"' in answer.text
    assert 'action="/demonstration" method="post"' in answer.text
    assert 'action="/uploads/new"' in answer.text


def test_with_a_collection_it_leads_to_the_list(reader: TestClient) -> None:
    answer = reader.get("/")
    assert (answer.status_code, answer.headers["location"]) == (302, "/collections")


@pytest.mark.parametrize(
    ("name", "heading"),
    [
        ("deaths", "area,area_name,year,sex,age,deaths,status"),
        ("population", "area,year,sex,age,population"),
        ("births", "area,year,sex,births,stillbirths,neonatal_deaths"),
    ],
)
def test_templates_are_files_to_fill_in(blank: TestClient, name: str, heading: str) -> None:
    answer = blank.get(f"/templates/{name}.csv")
    assert answer.headers["content-disposition"] == f'attachment; filename="{name}.csv"'
    assert answer.text.splitlines()[0] == heading


def test_another_template_is_refused_with_those_there_are(blank: TestClient) -> None:
    answer = blank.get("/templates/rates.csv")
    assert answer.status_code == 404
    assert answer.json()["detail"] == (
        "There is no template rates.csv; there are deaths.csv, population.csv, births.csv, "
        "areas.csv, breaks.csv, causes.csv."
    )


def test_an_unknown_key_is_refused(blank: TestClient) -> None:
    answer = blank.get("/?lang=de")
    assert answer.status_code == 400
    assert "The address has the key “lang”; this page takes none. Remove it." in answer.text


def test_one_button_loads_the_demonstration_once(blank: TestClient) -> None:
    for _again in range(2):
        answer = blank.post("/demonstration")
        assert (answer.status_code, answer.headers["location"]) == (303, "/c/quillmere")
    pinned = blank.get("/c/quillmere").headers["location"]
    assert pinned == "/c/quillmere/3/contents?figures=released&settings=almanac-1"
    assert "All deaths, Quillmere, edition 3: 25 years, 1999 to 2023, 7 areas." in (
        blank.get(pinned).text
    )
    listed = blank.get(f"/c/{quillmere.CODE}/editions.json").json()["figures"]["editions"]["rows"]
    assert [row["edition"] for row in listed] == [3, 2, 1]


def test_another_site_cannot_press_the_button(blank: TestClient) -> None:
    answer = blank.post("/demonstration", headers={"Sec-Fetch-Site": "cross-site"})
    assert answer.status_code == 403
    assert blank.get("/").status_code == 200  # still empty: no redirect to a list
