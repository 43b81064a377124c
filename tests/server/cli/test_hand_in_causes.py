"""Deaths by cause from the terminal, and what of them stands for the checks of the next upload."""

from pathlib import Path

from server.actions.standing import standing
from server.intake.causes.lists import SHORT
from server.store.connect import make_engine, sessions
from tests.server.cli.conftest import Ebbline
from tests.server.intake.by_cause import NAMES, parted, totals
from tests.server.intake.tables import csv, rows

TABLE = rows(years=range(2010, 2016))
DEATHS = csv([*totals(TABLE), *parted(TABLE)], NAMES)
PEOPLE = csv(TABLE, ("area", "year", "sex", "age", "population"))


def test_the_terminal_asks_for_the_list_and_takes_it(
    ebbline: Ebbline, tmp_path: Path, sqlite_url: str
) -> None:
    deaths, people = tmp_path / "deaths.csv", tmp_path / "people.csv"
    deaths.write_bytes(DEATHS)
    people.write_bytes(PEOPLE)
    told = ("hand-in", "--collection", "salt", "--deaths", deaths, "--population", people)
    basis = ("--people", "residents", "--dated-by", "death", "--population-is", "midyear")
    new = ("--name", "All", "--owner", "O", *basis, "--population-date", "1 July", "--source", "S")
    said = ebbline(*told, *new)
    assert "which list its causes of death fall into. Say it with --cause-list" in said.err
    assert "expected one of chapters, short, own" in ebbline(*told, *new, "--cause-list", "x").err
    said = ebbline(*told, *new, "--cause-list", "short", "--note", "By cause")
    assert said.code == 0, said.err
    engine = make_engine(sqlite_url)
    with sessions(engine)() as session:
        stood = standing(session, "salt", 1)
    engine.dispose()
    assert {cause.code for cause in stood.causes} == {cause.code for cause in SHORT}
    by_cause = {key.period for key in stood.cells if key.cause}
    assert by_cause == {"2013", "2014", "2015"}
    assert {key.period for key in stood.cells} == {str(year) for year in range(2010, 2016)}
