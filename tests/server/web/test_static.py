"""Static files, the build they are part of, and health."""

import re
from pathlib import Path

import pytest
from starlette.testclient import TestClient

from server.config import Config
from server.store.migrating import migrate
from server.web.build import build
from server.web.static import asset
from tests.house.tree import ROOT
from tests.server.web.site import Site, application, browser


def test_a_file_under_its_digest_is_kept_for_ever(reader: TestClient) -> None:
    answer = reader.get(asset(build().static, "css/tokens.css"))
    assert answer.status_code == 200
    assert answer.headers["cache-control"] == "public, max-age=31536000, immutable"
    assert answer.headers["content-type"].startswith("text/css")


def test_under_another_digest_it_is_asked_for_again(reader: TestClient) -> None:
    answer = reader.get("/static/000000000000/css/tokens.css")
    assert (answer.status_code, answer.headers["cache-control"]) == (200, "public, no-cache")


@pytest.mark.parametrize("name", ["css/none.css", "../pyproject.toml", "%2e%2e/pyproject.toml"])
def test_nothing_else_is_found(reader: TestClient, name: str) -> None:
    assert reader.get(f"/static/{build().static}/{name}").status_code == 404


def test_every_file_a_page_names_is_there(reader: TestClient) -> None:
    text = reader.get("/small").text
    names = set(re.findall(r'(?:href|src)="(/static/[^"]+)"', text))
    assert len(names) >= 10
    assert {name: reader.head(name).status_code for name in names} == dict.fromkeys(names, 200)


def test_the_version_is_the_one_of_the_project() -> None:
    assert f'version = "{build().version}"' in (ROOT / "pyproject.toml").read_text("utf-8")


def test_the_server_is_ready_once_the_database_is(tmp_path: Path) -> None:
    with browser(application(Site(), tmp_path)) as reader:
        assert reader.get("/healthz").status_code == 200
        before = reader.get("/readyz")
        assert (before.status_code, "ebbline database" in before.text) == (503, True)
        migrate(Config(data=tmp_path).url)
        assert reader.get("/readyz").status_code == 200
