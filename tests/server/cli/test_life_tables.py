"""`ebbline life-tables` writes every table of an edition."""

import csv
import io
from pathlib import Path

import pytest

from server.store.connect import make_engine, sessions
from tests.factories import GRIDS, edition, gompertz_panel
from tests.server.cli.conftest import Ebbline


@pytest.fixture
def isle(sqlite_url: str) -> str:
    """Two grids; the rock is too small for a table."""
    engine = make_engine(sqlite_url)
    with sessions(engine)() as session:
        panels = {
            f"north.{sex}.{year}": gompertz_panel(sex=sex, seed=year, people=1e6)
            for sex in "fm"
            for year in (2013, 2014)
        }
        panels["cape.f.2014"] = gompertz_panel(GRIDS["single"], seed=3, people=1e6)
        panels["rock.f.2014"] = gompertz_panel(seed=1, people=2_000)
        edition(session, panels, provisional=("2014",))
    engine.dispose()
    return sqlite_url


@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-kannisto", "almanac-2"])
def test_every_table_is_the_one_its_figures_are_read_off(
    ebbline: Ebbline, isle: str, settings: str
) -> None:
    said = ebbline("life-tables", "--collection", "isle", "--settings", settings)
    rows = list(csv.DictReader(io.StringIO(said.out)))
    births = {(r["area"], r["sex"], r["year"]): float(r["ex"]) for r in rows if r["age"] == "0"}
    assert len(births) == 7  # persons of the north are summed; the rock is left out
    assert "7 life tables, one left out (" in said.err
    asked = ["figure", "e0", "--collection", "isle", "--settings", settings, "--as", "csv"]
    for area in ("north", "cape"):
        asked += ["--area", area]
    for sex in "fmp":
        asked += ["--sex", sex]
    figures = csv.DictReader(io.StringIO(ebbline(*asked).out))
    known = {(r["area"], r["sex"], r["year"]): r["value"] for r in figures if r["value"]}
    assert births == pytest.approx({key: float(value) for key, value in known.items()}, rel=1e-10)


def test_they_go_to_a_file_with_their_status(ebbline: Ebbline, isle: str, tmp_path: Path) -> None:
    place = tmp_path / "tables.csv"
    said = ebbline("life-tables", "--collection", "isle", "--to", str(place))
    assert said.out == ""
    rows = list(csv.DictReader(io.StringIO(place.read_text(encoding="utf-8-sig"))))
    assert {row["status"] for row in rows if row["year"] == "2014"} == {"provisional"}
    assert {row["status"] for row in rows if row["year"] == "2013"} == {"final"}
    assert [row["age"] for row in rows if row["area"] == "cape"][-1] == "100+"
