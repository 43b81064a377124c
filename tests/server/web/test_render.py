"""Pages and twins: sent once, known again, whole or in part."""

from dataclasses import replace
from pathlib import Path

import orjson
import pytest
from starlette.testclient import TestClient

from server.web.build import Build
from server.web.etag import Bodies, Body, etag, fresh
from server.web.templating import json_block, of_table, symbols
from tests.server.web.site import Site, application, browser

PARTIAL = {"HX-Request": "true", "HX-Request-Type": "partial", "HX-Target": "div#trend"}


def test_a_repeat_is_answered_without_building_the_page(reader: TestClient, site: Site) -> None:
    first = reader.get("/small?of=e0")
    assert (first.status_code, site.built) == (200, 1)
    assert first.headers["cache-control"] == "private, no-cache"
    tag = first.headers["etag"]
    again = reader.get("/small?of=e0", headers={"If-None-Match": f'W/"x", {tag}'})
    assert (again.status_code, again.content, again.headers["etag"]) == (304, b"", tag)
    assert reader.get("/small?of=e0").content == first.content
    assert site.built == 1


def test_head_has_the_headers_of_get(reader: TestClient, site: Site) -> None:
    got, headed = reader.get("/small?of=e0"), reader.head("/small?of=e0")
    assert headed.status_code == 200
    for name in ("etag", "content-length", "content-type", "vary"):
        assert headed.headers[name] == got.headers[name]


def test_the_tag_follows_state_address_block_and_form(reader: TestClient, site: Site) -> None:
    tags = [
        reader.get("/small?of=e0").headers["etag"],
        reader.get("/small?of=e1").headers["etag"],
        reader.get("/small?of=e0", headers=PARTIAL).headers["etag"],
        reader.get("/small.json?of=e0").headers["etag"],
    ]
    site.state = "2"
    tags.append(reader.get("/small?of=e0").headers["etag"])
    assert len(set(tags)) == len(tags)


def test_the_tag_follows_language_and_build(tmp_path: Path) -> None:
    apps = [application(Site(), tmp_path, language=code) for code in ("en", "pseudo", "en")]
    apps[2].state.web = replace(apps[2].state.web, build=Build("0.1.0", "another", "static"))
    tags = set()
    for app in apps:
        with browser(app) as client:
            tags.add(client.head("/small?of=e0").headers["etag"])
    assert len(tags) == len(apps)


def test_the_tag_is_the_same_in_another_process(tmp_path_factory: pytest.TempPathFactory) -> None:
    tags = set()
    for _ in range(2):
        with browser(application(Site(), tmp_path_factory.mktemp("data"))) as client:
            tags.add(client.head("/small?of=e0").headers["etag"])
    assert len(tags) == 1


def test_htmx_gets_its_block_and_what_goes_along(reader: TestClient) -> None:
    answer = reader.get("/small?of=e0", headers=PARTIAL)
    assert answer.headers["vary"] == "HX-Request-Type, HX-Target"
    text = answer.text
    assert text.startswith("<title>Small &amp; &lt;bold&gt; | Ebbline</title>")
    assert "<!doctype" not in text
    main, *others = text.split("<hx-partial ")
    assert "trend of &lt;small&gt;" in main
    assert 'id="table-first"' in main
    assert [one.partition('"')[2].partition('"')[0] for one in others] == [
        "#locator",
        "#notices",
        "#answer",
        "#colophon",
        "#aside",
    ]
    assert "The answer" in text
    assert "beside &lt;small&gt;" in text


def test_a_block_alone_is_the_one_of_the_whole_page(reader: TestClient) -> None:
    whole = reader.get("/small?of=e0").text
    alone = reader.get("/small?of=e0", headers=PARTIAL).text
    block = alone.partition("</title>\n")[2].partition("<hx-partial")[0].strip()
    assert block
    assert f'<div id="trend">{block}' in whole


@pytest.mark.parametrize("target", ["div#nothing", "body", ""])
def test_a_block_that_is_not_there_brings_the_whole_page(reader: TestClient, target: str) -> None:
    answer = reader.get("/small", headers=PARTIAL | {"HX-Target": target})
    assert answer.text.startswith("<!doctype html>")
    assert answer.headers.get("hx-retarget") == ("body" if "#" in target else None)


def test_twins_come_with_type_and_name(reader: TestClient) -> None:
    csv = reader.get("/small.csv?table=second")
    assert csv.headers["content-type"] == "text/csv; charset=utf-8"
    assert csv.headers["content-disposition"] == 'attachment; filename="small-second.csv"'
    assert csv.text == "v\r\n1.25\r\n"
    xlsx = reader.get("/small.xlsx")
    assert xlsx.headers["content-disposition"] == 'attachment; filename="small.xlsx"'
    assert xlsx.content[:2] == b"PK"
    json = orjson.loads(reader.get("/small.json?of=e0").content)
    assert json["figures"]["first"]["rows"] == [{"v": 1.25}]


def test_a_csv_without_table_leads_to_the_first(reader: TestClient, site: Site) -> None:
    answer = reader.get("/small.csv?of=e0")
    assert answer.status_code == 302
    assert answer.headers["location"] == "/small.csv?of=e0&table=first"
    site.tables, site.state = ("only",), "one table"
    assert reader.get("/small.csv?of=e0").status_code == 200


def test_an_unknown_table_is_refused_with_those_there_are(reader: TestClient) -> None:
    answer = reader.get("/small.csv?table=third")
    assert answer.status_code == 400
    assert answer.json()["detail"] == "This page has no table “third”; it has first, second."


def test_a_page_that_follows_from_a_form_is_not_kept(reader: TestClient) -> None:
    answer = reader.post("/form", headers={"Sec-Fetch-Site": "same-origin"})
    assert (answer.status_code, answer.headers["cache-control"]) == (422, "private, no-store")


def test_a_redirect_spells_what_an_address_may_hold(reader: TestClient) -> None:
    answer = reader.get("/elsewhere")
    assert (answer.status_code, answer.headers["location"]) == (302, "/small?of=e0&text=%C3%BCber")


def test_texts_are_escaped_and_symbols_set(reader: TestClient) -> None:
    assert symbols("m_x < 1 & l_x") == "m<sub>x</sub> &lt; 1 &amp; l<sub>x</sub>"
    for name in ("death_rate", "m_2020.csv", "c_max_x", "f_xy"):
        assert symbols(name) == name
    assert json_block({"a": "</script>&"}) == '{"a":"\\u003c/script\\u003e\\u0026"}'
    assert of_table("/x.csv", "a") == "/x.csv?table=a"
    assert of_table("/x.csv?of=e0", "a") == "/x.csv?of=e0&table=a"


def test_bodies_longest_unused_are_given_up() -> None:
    bodies = Bodies(limit=10)
    bodies.put("a", Body(b"12345"))
    bodies.put("b", Body(b"12345"))
    assert bodies.get("a") is not None
    bodies.put("c", Body(b"1"))
    assert bodies.get("b") is None
    assert bodies.get("a") is not None
    bodies.put("d", Body(b"x" * 11))
    assert bodies.get("d") is None


def test_a_tag_is_matched_weakly_and_by_a_star() -> None:
    tag = etag(("a", 1))
    assert tag != etag(("a1",))
    assert fresh(f"W/{tag}", tag)
    assert fresh("*", tag)
    assert not fresh(None, tag)
    assert not fresh('"other"', tag)
