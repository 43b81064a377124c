"""The files of others are those that were fetched, and their versions are the ones we ask for."""

import hashlib
import json
import re

import plotly.offline
import pytest

from tests.house.tree import ROOT

pytestmark = pytest.mark.house

STATIC = ROOT / "static"
MANIFEST = json.loads((STATIC / "vendor/MANIFEST.json").read_text(encoding="utf-8"))
SPEC = json.loads((ROOT / ".ci/vendor.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize("name", MANIFEST["sha256"])
def test_a_file_is_as_it_was_fetched(name: str) -> None:
    found = hashlib.sha256((STATIC / name).read_bytes()).hexdigest()
    assert found == MANIFEST["sha256"][name], f"{name}: run .ci/vendor_assets.py"


def test_nothing_else_lies_beside_them() -> None:
    found = {
        path.relative_to(STATIC).as_posix()
        for folder in ("vendor", "fonts")
        for path in (STATIC / folder).rglob("*")
        if path.is_file()
    }
    assert found == {*MANIFEST["sha256"], "vendor/MANIFEST.json"}


def test_the_versions_are_those_asked_for() -> None:
    assert MANIFEST["packages"] == SPEC["packages"]


def test_the_schema_our_figures_are_checked_with_is_of_the_version_that_draws_them() -> None:
    assert SPEC["packages"]["plotly.js"] == plotly.offline.get_plotlyjs_version()


def test_every_package_in_the_bundle_has_a_licence_we_may_pass_on() -> None:
    notices = (STATIC / "vendor/THIRD_PARTY.md").read_text(encoding="utf-8")
    licences = dict(re.findall(r"^## (\S+) [\d.]+, (\S+)$", notices, re.MULTILINE))
    assert "plotly.js" in licences
    assert set(licences.values()) <= {"MIT", "ISC", "BSD-3-Clause", "Zlib", "0BSD"}


def test_no_style_or_script_of_ours_loads_anything_from_elsewhere() -> None:
    ours = [*STATIC.glob("css/*.css"), *STATIC.glob("*.js"), *(ROOT / "templates").rglob("*.html")]
    assert ours
    found = [
        f"{path.name}: {hit}"
        for path in ours
        for hit in re.findall(r"(?:https?:)?//[a-z0-9.-]+\.[a-z]{2,}", path.read_text("utf-8"))
    ]
    assert found == []
