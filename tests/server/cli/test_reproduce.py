"""`ebbline reproduce`: the same from a terminal."""

import json
from pathlib import Path

from tests.server.cli.conftest import Ebbline
from tests.server.cli.test_hand_in import DENMARK, NEW

HEAD = "area,sex,year,indicator,value\n"


def test_a_printed_table(ebbline: Ebbline, tmp_path: Path) -> None:
    made = ebbline(
        *("hand-in", "--collection", "dk", "--counts", DENMARK, "--area", "dk=Denmark"),
        *("--open-age", "--note", "1974 to 2012", *NEW),
    )
    assert made.code == 0, made.err
    path = tmp_path / "printed.csv"
    path.write_text(HEAD + "Denmark,women,2012,e0,82.0\n", encoding="utf-8")
    said = ebbline("reproduce", path, "--collection", "dk")
    assert (said.code, said.err) == (0, "")
    assert "The one figure of printed.csv is matched." in said.out
    path.write_text(HEAD + "dk,f,2012,e0,82.0\ndk,f,2012,e0,83.9\n", encoding="utf-8")
    said = ebbline("reproduce", path, "--as", "json")
    assert said.code == 1
    rows = json.loads(said.out)["figures"]["figures"]["rows"]
    assert [row["verdict"] for row in rows] == ["matched", "not found"]
    assert ebbline("reproduce", tmp_path / "none.csv").code == 2
