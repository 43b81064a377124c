"""Areas over time and breaks typed on the upload page, from the form to the pages of an edition."""

from starlette.testclient import TestClient

from server.intake.lists import written
from server.store.connect import Session
from server.store.uploads import file_bytes

BASIS = {
    "people": "residents",
    "dated_by": "death",
    "population_is": "midyear",
    "population_date": "1 July of each year",
    "source": "Statistics desk of the isle",
}
SPLIT = {
    "areas.1.code": "north",
    "areas.1.becomes": "moor",
    "areas.1.share": "1/4",
    "areas.1.name": "The moor",
    "areas.2.code": "north",
    "areas.2.becomes": "fell",
    "areas.2.share": "0.75",
}
SHOCK = {"breaks.1.year": "2013", "breaks.1.kind": "shock", "breaks.1.note": "hard winter"}


def handed_in(client: TestClient, **typed: str) -> str:
    answer = client.post("/uploads", data={"collection": "isle", **typed})
    assert answer.status_code == 303, answer.text
    return answer.headers["location"].removesuffix("/reading")


def committed(client: TestClient, place: str) -> str:
    assert client.post(f"{place}/reading", data=BASIS).status_code == 303
    answer = client.post(f"{place}/commit", data={"note": "as typed"})
    assert answer.status_code == 303, answer.text
    return answer.headers["location"]


def test_what_is_typed_is_kept_as_the_file_it_stands_for(
    reader: TestClient, writer: Session
) -> None:
    place = handed_in(reader, **SPLIT, **SHOCK)
    upload = int(place.rsplit("/", 1)[1])
    assert file_bytes(writer, upload, "areas").decode().splitlines() == [
        "code,becomes,from,to,share,counts,sex,age,name,parent",
        "north,moor,,,1/4,,,,The moor,",
        "north,fell,,,0.75,,,,,",
    ]
    assert file_bytes(writer, upload, "breaks") == written(
        "breaks", [{"year": "2013", "kind": "shock", "note": "hard winter"}]
    )


def test_a_typed_split_and_a_year_of_shock_stand_on_the_pages(reader: TestClient) -> None:
    place = handed_in(reader, **SPLIT, **SHOCK)
    contents = committed(reader, place)
    problems = reader.get(f"{place}/problems").text
    assert "north is shared out to moor, fell, in every year" in problems
    assert "2013: year of shock" in problems
    shown = reader.get(contents, follow_redirects=True).text
    assert "The moor" in shown
    assert "hard winter" in shown
    asked = "of=e0&area=moor&sex=f&from=2012&to=2014&figures=full&settings=almanac-1"
    trend = reader.get(f"/c/isle/2/trend?{asked}").text
    assert "The counts of women of The moor are estimated" in trend
    assert "year of shock" in trend
    whole = reader.get(f"/c/isle/2/trend?{asked.replace('moor', 'cape')}").text
    assert "are estimated" not in whole


def test_a_break_may_speak_of_what_a_heading_could(reader: TestClient) -> None:
    note = "New register of people"
    typed = {"breaks.1.year": "2013", "breaks.1.kind": "population", "breaks.1.note": note}
    place = handed_in(reader, **typed)
    assert "cannot be read" not in reader.get(f"{place}/reading").text
    assert note in reader.get(committed(reader, place), follow_redirects=True).text


def test_a_mistake_in_what_is_typed_is_named_with_its_row(reader: TestClient) -> None:
    place = handed_in(reader, **(SPLIT | {"areas.2.share": "0.7"}))
    assert reader.post(f"{place}/reading", data=BASIS).status_code == 303
    report = reader.get(f"{place}/problems.json").json()["figures"]["problems"]["rows"]
    assert [(row["check"], row["row"]) for row in report] == [("shares_not_one", "3")]
    refused = reader.post(f"{place}/commit", data={"note": "as typed"})
    assert refused.status_code == 409


def test_the_upload_page_offers_both_and_a_new_population(reader: TestClient) -> None:
    page = reader.get("/uploads/new?collection=isle").text
    assert "New population for years already held:" in page
    for field in ("areas.2.becomes", "breaks.2.kind"):
        assert f'name="{field}"' in page
    for name in ("areas", "breaks"):
        assert reader.get(f"/templates/{name}.csv").status_code == 200
