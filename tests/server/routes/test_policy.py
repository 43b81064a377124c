"""The page of a policy: what it withholds, tried and set."""

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from server.accounts.viewer import Right, Viewer
from server.routes.asking import viewer
from server.sentences.taking import did

PLACE = "/c/isle/policy"
TERMS = {"threshold": "5", "persons": "0", "coarse_below": "0", "zeros": "shown"}


def test_without_a_policy_the_page_says_that_everything_is_shown(reader: TestClient) -> None:
    page = reader.get(PLACE)
    assert page.status_code == 200
    assert "has no policy: every count is shown" in page.text


def test_a_trial_sets_nothing(reader: TestClient) -> None:
    tried = reader.get(PLACE, params=TERMS)
    assert "Nothing is set yet." in tried.text
    assert "has no policy" in reader.get(PLACE).text


def test_before_rounding_is_set_it_is_said_that_it_is_for_good(reader: TestClient) -> None:
    assert "For good." not in reader.get(PLACE, params=TERMS).text
    assert "For good." in reader.get(PLACE, params=TERMS | {"base": "5"}).text


def test_what_stays_as_it_was_first_shown_is_told_apart(reader: TestClient) -> None:
    reader.post(PLACE, data=TERMS | {"note": "The old reason."})
    assert "a year keeps the way" not in reader.get(PLACE).text.partition("What it does")[0]
    tried = reader.get(PLACE, params=TERMS | {"base": "5"}).text
    first = tried.partition("<main")[2].partition("What it does")[0].replace("\xa0", " ")
    assert "would change 0 counts of the newest edition." in first
    assert "counts stay withheld: a year keeps the way" in first
    assert "The old reason." not in first


def test_one_form_tries_and_sets_and_keeps_what_was_typed(reader: TestClient) -> None:
    tried = reader.get(PLACE, params=TERMS | {"note": "As was decided."}).text
    main = tried.partition("<main")[2]
    assert main.count('name="threshold"') == 1
    assert 'value="As was decided."' in main
    assert 'formmethod="get" formnovalidate>Say what it would do' in main


def test_a_policy_is_set_and_pages_withhold(reader: TestClient) -> None:
    place = "/c/isle/1/population-year?of=rock.f.2014&figures={}&settings=almanac-1"
    before = reader.get(place.format("released"))
    set_ = reader.post(PLACE, data=TERMS | {"note": "As decided."}, follow_redirects=False)
    assert (set_.status_code, set_.headers["location"]) == (303, PLACE)
    page = reader.get(PLACE).text
    assert "deaths from 1 to 4" in page
    assert "As decided." in page
    after = reader.get(place.format("released"))
    assert after.headers["etag"] != before.headers["etag"]
    assert "blot" in after.text
    assert "blot" not in before.text
    full = reader.get(place.format("full"))
    assert "blot" not in full.text
    assert "not for release" in full.text


def test_counts_are_rounded_instead(reader: TestClient) -> None:
    place = "/c/isle/1/population-year{}?of=rock.f.2014&figures=released&settings=almanac-1"
    tried = reader.get(PLACE, params=TERMS | {"base": "5"}).text
    assert "Rounding all deaths and births to multiples of 5 would change" in tried
    reader.post(PLACE, data=TERMS | {"base": "5", "note": "As decided."})
    page = reader.get(PLACE).text
    assert "rounds all deaths and births to multiples of 5" in page
    assert '<option value="5" selected>' in page
    shown = reader.get(place.format("")).text
    assert "blot" not in shown
    assert "rounded at random, up or down, to multiples of 5" in shown
    figures = reader.get(place.format(".json")).json()["figures"]
    rows = [row for table in figures.values() for row in table["rows"] if "age" in row]
    deaths = [row["deaths"] for row in rows if isinstance(row.get("deaths"), float | int)]
    assert sum(count > 0 for count in deaths) > 3
    assert all(count % 5 == 0 for count in deaths)
    assert {row["obs_status"] for row in rows if "deaths" in row} == {"E"}


@pytest.mark.parametrize("more", [{"persons": "100"}, {"zeros": "withheld"}])
def test_counts_are_not_rounded_and_withheld(reader: TestClient, more: dict[str, str]) -> None:
    answer = reader.post(PLACE, data=TERMS | {"base": "5", "note": "As decided."} | more)
    assert answer.status_code == 409
    assert "Rounded counts cannot also be withheld" in answer.text


def test_a_released_page_does_not_give_the_digest_of_the_counts(reader: TestClient) -> None:
    place = "/c/isle/1/contents?figures={}&settings=almanac-1"
    open_ = reader.get(place.format("released")).text
    reader.post(PLACE, data=TERMS | {"note": "As decided."})
    digest = open_.partition("content ")[2][:14]
    assert digest in reader.get(place.format("full")).text
    assert digest not in reader.get(place.format("released")).text


@pytest.mark.parametrize(
    ("name", "value", "said"),
    [
        ("threshold", "1", "it can be 2 to 100"),
        ("threshold", "many", "it takes a whole number"),
        ("zeros", "hidden", "they can be shown or withheld"),
        ("base", "4", "the base can be 3, 5, 10, or 0 to withhold"),
        ("causes", "some", "they can be shown for the whole, or none"),
        ("note", "", "A policy needs a note"),
    ],
)
def test_terms_that_cannot_be_are_refused(
    reader: TestClient, name: str, value: str, said: str
) -> None:
    answer = reader.post(PLACE, data=TERMS | {"note": "As decided."} | {name: value})
    assert answer.status_code in (409, 422)
    assert said in answer.text
    assert "has no policy" in reader.get(PLACE).text


def test_only_those_who_set_policies_may_try_them(isle: FastAPI, reader: TestClient) -> None:
    """How many counts each threshold withholds tells a count that is withheld."""
    isle.dependency_overrides[viewer] = lambda: Viewer("a reader", frozenset({Right.READ}))
    tried = reader.get(PLACE, params=TERMS)
    assert tried.status_code == 403
    assert "counts" not in tried.text.partition("<main")[2]
    assert reader.get(PLACE).status_code == 200


def test_it_is_not_said_how_many_counts_an_edition_changed() -> None:
    """One of them may be withheld."""
    moved = {"added": 0, "changed": 3, "restated": 1, "dropped": 0}
    assert did(moved, "", hidden=False) == "3 changed and 1 under another status"
    assert did(moved, "", hidden=True) == "none new or dropped"
    assert did(moved | {"added": 2}, "in part", hidden=True) == "2 new; in part"


def test_the_list_of_editions_asks_for_the_policy(reader: TestClient) -> None:
    counted = reader.get("/c/isle/editions.json").json()["figures"]["editions"]["rows"][0]["did"]
    assert "new" in counted
    reader.post(PLACE, data=TERMS | {"note": "As decided."})
    assert reader.get("/c/isle/editions").status_code == 200
