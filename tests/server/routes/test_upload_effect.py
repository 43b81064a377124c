"""What the edition would change stands on the page before it is made; choices are shown first."""

import re

from starlette.testclient import TestClient

from tests.factories import counts_csv
from tests.server.routes.test_uploads import AREAS, committed, contents, draft


def second(reader: TestClient, times: int = 2, **said: str) -> str:
    """Address of a sound draft on top of edition 1."""
    committed(reader, counts_csv(), code="salt")
    place = draft(reader, counts_csv(times=times), collection="salt")
    reader.post(f"{place}/reading", data=AREAS | said)
    return place


def test_the_first_edition_is_all_new(blank: TestClient) -> None:
    place = draft(blank, counts_csv(), code="salt")
    blank.post(f"{place}/reading", data=AREAS)
    page = blank.get(f"{place}/problems").text
    assert "Edition 1 will be the first, with 96 counts." in page
    assert 'name="gives_way"' not in page


def test_what_changes_is_told_by_year(blank: TestClient) -> None:
    place = second(blank)
    page = blank.get(f"{place}/problems").text
    assert "Edition 2 will change edition 1: 48 counts changed." in page
    row = re.search(r'<th scope="row">\s*2002.*?</tr>', page, re.DOTALL)
    assert row is not None
    before = sum(20 + n for n in (*range(9, 17), *range(25, 33)))
    after = 2 * before
    for number in (f"{before:,}", f"{after:,}", f"+{after - before:,}"):
        assert f">{number}<" in row[0]


def test_choices_are_shown_before_they_are_carried_out(blank: TestClient) -> None:
    place = second(blank, times=3)
    sent = {"note": "2001 anew", "years": "2001", "gives_way": "years", "shown": ""}
    shown = blank.post(f"{place}/commit", data=sent)
    where = shown.headers["location"]
    assert where == f"{place}/problems?years=2001&gives_way=years#effect"
    page = blank.get(where.partition("#")[0]).text
    assert "24 counts changed" in page
    seen = re.search(r'name="shown" value="([^"]*)"', page)
    assert seen is not None
    made = blank.post(f"{place}/commit", data=sent | {"shown": seen[1].replace("&amp;", "&")})
    assert made.headers["location"] == "/c/salt/2/contents"


def test_a_look_makes_nothing(blank: TestClient) -> None:
    place = second(blank)
    answer = blank.post(f"{place}/commit", data={"note": "n", "do": "look", "area": "north"})
    assert answer.headers["location"] == f"{place}/problems?area=north&gives_way=cells#effect"
    assert "2 editions" not in blank.get("/c/salt/editions").text


def test_a_year_that_becomes_provisional_is_named(blank: TestClient) -> None:
    place = second(blank, times=1, provisional="2002")
    page = blank.get(f"{place}/problems").text
    assert "Edition 2 will hold the same numbers as edition 1." in page
    assert "2002 becomes provisional with no number moving." in page


def test_choices_that_cannot_be_read_are_refused(blank: TestClient) -> None:
    place = second(blank)
    assert blank.get(f"{place}/problems?years=soon").status_code == 400
    assert blank.get(f"{place}/problems?gives_way=much").status_code == 400
    blank.post(f"{place}/commit", data={"do": "look", "years": "1950"})
    page = blank.get(f"{place}/problems?years=1950&gives_way=cells")
    assert page.status_code == 200
    assert "The years 1950 were not handed in" in page.text


def test_choices_that_were_not_worked_out_are_said_and_never_carried_out(
    blank: TestClient,
) -> None:
    place = second(blank)
    page = blank.get(f"{place}/problems?years=2001&gives_way=all").text
    assert "What these choices would change has not been worked out yet." in page
    checked = r'value="all"[^>]*checked|checked[^>]*value="all"'
    assert re.search(checked, page)
    seen = re.search(r'name="shown" value="([^"]*)"', page)
    assert seen is not None
    sent = {"note": "n", "years": "2001", "gives_way": "all", "shown": seen[1]}
    answer = blank.post(f"{place}/commit", data=sent)
    assert answer.headers["location"] == f"{place}/problems?years=2001&gives_way=all#effect"
    page = blank.get(f"{place}/problems?years=2001&gives_way=all").text
    assert "Edition 2 will change edition 1" in page


def test_a_base_that_moved_is_said(blank: TestClient) -> None:
    place = second(blank, times=3)
    other = draft(blank, counts_csv(times=2), collection="salt")
    blank.post(f"{other}/reading", data=AREAS)
    blank.post(f"{other}/commit", data={"note": "between"})
    page = blank.get(f"{place}/problems").text
    assert "The checks ran against edition 1, but edition 2 stands now." in page
    assert "Edition 2 will change" not in page


def test_all_may_be_replaced(blank: TestClient) -> None:
    committed(blank, counts_csv(), code="salt")
    place = draft(blank, counts_csv(years=(2003,)), collection="salt")
    blank.post(f"{place}/reading", data=AREAS)
    sent = {"note": "only 2003", "gives_way": "all", "shown": "gives_way=all"}
    blank.post(f"{place}/commit", data=sent)
    assert "the one year 2003" in contents(blank, "salt")
