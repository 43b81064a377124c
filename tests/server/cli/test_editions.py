"""`ebbline editions`, `withdraw`, `reinstate` and `rebuild`."""

import json
from pathlib import Path

import pytest
from sqlalchemy import text

from server.store.connect import make_engine
from tests.factories import counts_csv
from tests.server.cli.conftest import Ebbline
from tests.server.cli.test_hand_in import NEW


@pytest.fixture
def salt(ebbline: Ebbline, tmp_path: Path) -> Ebbline:
    """Two editions of one collection."""
    path = tmp_path / "counts.csv"
    for number, times in enumerate((1, 2), start=1):
        path.write_bytes(counts_csv(times=times))
        note = ("--note", f"delivery {number}")
        assert ebbline("hand-in", "--collection", "salt", "--counts", path, *NEW, *note).code == 0
    return ebbline


def standing(ebbline: Ebbline) -> dict[int, str]:
    told = json.loads(ebbline("editions", "--collection", "salt", "--as", "json").out)
    rows = told["figures"]["editions"]["rows"]
    return {row["edition"]: row["standing"].split()[0] for row in rows}


def test_an_edition_is_withdrawn_and_stands_again(salt: Ebbline) -> None:
    assert standing(salt) == {1: "superseded", 2: "stands"}
    which = ("--collection", "salt", "--edition", "2")
    said = salt("withdraw", *which, "--note", "wrong file")
    assert (said.code, said.out) == (0, "Edition 2 was withdrawn.\n")
    assert standing(salt) == {1: "stands", 2: "withdrawn"}
    assert salt("withdraw", *which, "--note", "again").code == 2
    assert salt("reinstate", *which, "--note", "right after all").code == 0
    assert standing(salt) == {1: "superseded", 2: "stands"}


def test_a_withdrawal_without_a_reason_is_refused(salt: Ebbline) -> None:
    said = salt("withdraw", "--collection", "salt", "--edition", "2")
    assert said.code == 2
    assert "cannot be withdrawn without a note" in said.err
    assert standing(salt)[2] == "stands"


def test_the_list_of_collections(salt: Ebbline) -> None:
    lines = salt("editions").out.splitlines()
    assert lines[0].startswith("code")
    assert lines[1].split()[0] == "salt"


def test_a_collection_that_is_not_there(salt: Ebbline) -> None:
    said = salt("editions", "--collection", "reef")
    assert (said.code, said.out) == (2, "")
    assert said.err == "ebbline: There is no collection reef; known: salt.\n"


def test_every_edition_can_be_made_anew(salt: Ebbline) -> None:
    said = salt("rebuild")
    assert said.code == 0
    assert [line.split(":")[0] for line in said.out.splitlines()] == [
        "salt, edition 1",
        "salt, edition 2",
    ]
    assert said.out.count("the same") == 2


def test_a_damaged_file_is_found(salt: Ebbline, sqlite_url: str) -> None:
    engine = make_engine(sqlite_url)
    with engine.begin() as connection:
        connection.execute(text("UPDATE upload_file SET content = x'00' WHERE upload_id = 1"))
    engine.dispose()
    said = salt("rebuild", "--collection", "salt")
    assert said.code == 1
    assert "salt, edition 1: cannot be made anew. The kept file counts.csv" in said.out
    assert "salt, edition 2: " in said.out
