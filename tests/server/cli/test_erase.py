"""`ebbline erase`: the bytes go, the edition stays, and `rebuild` says so."""

from pathlib import Path

from tests.factories import counts_csv
from tests.server.cli.conftest import Ebbline
from tests.server.cli.test_hand_in import NEW


def test_the_bytes_of_an_upload_go(ebbline: Ebbline, tmp_path: Path) -> None:
    path = tmp_path / "counts.csv"
    path.write_bytes(counts_csv())
    assert ebbline("hand-in", "--collection", "salt", "--counts", path, *NEW).code == 0
    said = ebbline("erase", "1", "--why", "Names stood in it.")
    assert (said.code, said.out) == (0, "The bytes of upload 1 were erased.\n")
    rebuilt = ebbline("rebuild")
    assert rebuilt.code == 0
    assert "salt, edition 1: as recorded in the database" in rebuilt.out
    assert "cannot be made anew" in rebuilt.out
    assert "Names stood in it." in rebuilt.out
    assert "bytes erased" in ebbline("editions", "--collection", "salt", "--as", "csv").out
    assert ebbline("erase", "7", "--why", "x").code == 2
