"""Files that cannot become an edition: one sentence as a page, as a problem in JSON, on a
terminal."""

from dataclasses import dataclass
from pathlib import Path

import pytest
from starlette.testclient import TestClient

from server.intake.mapping import COLUMNS
from tests.factories import counts_csv
from tests.server.bad_input.conftest import LIMIT, PROBLEM, Terminal, words

FILE = "counts.csv"
SOUND = counts_csv().decode()
ROWS = SOUND.split("\n")
BASIS = {
    "people": "residents",
    "dated_by": "death",
    "population_is": "midyear",
    "population_date": "1 July of each year",
    "source": "Statistics desk of the isle",
}


# ---- files ---------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Fault:
    """A file, and what is said of it."""

    key: str
    content: str
    rows: str  # as printed; empty where the whole file is meant
    column: str
    found: str
    expected: str
    remedy: str

    @property
    def sentence(self) -> str:
        word = "row" if self.rows.isdigit() else ""
        place = [FILE, *([f"{word} {self.rows}".strip()] if self.rows else [])]
        place += [f"column {self.column}"] if self.column else []
        return f"{', '.join(place)}: found {self.found}, expected {self.expected}. {self.remedy}"


def changed(old: str, new: str) -> str:
    assert SOUND.count(old) == 1
    return SOUND.replace(old, new)


NUMBER = "a number of at least 0"
FOLLOWING = "each group to begin where the one before ends"
GAP = "Add the missing ages, with 0 where there was none; write wide groups as ranges (15–44)."
FAULTS = (
    Fault(
        "missing_column",
        "\n".join(",".join(row.split(",")[:2] + row.split(",")[3:]) for row in ROWS),
        "1",
        "age",
        "no column for it among year, sex, area, deaths, population",
        "a column mapped to age",
        "Say in the mapping which column it is, or add it to the file.",
    ),
    Fault(
        "negative_count",
        changed("2001,f,5-9,north,23,", "2001,f,5-9,north,-23,"),
        "4",
        "deaths",
        "-23",
        NUMBER,
        "Put the count right; corrections of earlier years belong to those years.",
    ),
    Fault(
        "missing_count",
        changed("north,23,9021", "north,23,"),
        "4",
        "population",
        "an empty field",
        NUMBER,
        "Fill in the count; write 0 where there was none.",
    ),
    Fault(
        "not_a_number",
        changed("north,23,9021", "north,some,9021"),
        "4",
        "deaths",
        "“some”",
        NUMBER,
        "Write the count as plain digits; 0 where there was none.",
    ),
    Fault(
        "gap_of_ages",
        "\n".join(ROWS[:2] + ROWS[3:]),
        "3",
        "age",
        "“0” and then “5-9”",
        FOLLOWING,
        GAP,
    ),
    Fault(
        "gap_of_ages",
        "\n".join(ROWS[:3] + ROWS[4:]),
        "4",
        "age",
        "“1-4” and then “10+”",
        FOLLOWING,
        GAP,
    ),
    Fault(
        "overlap_of_ages",
        changed("2001,f,5-9,north", "2001,f,3-9,north"),
        "4",
        "age",
        "“1-4” and then “3-9”",
        FOLLOWING,
        "Take out the groups that are sums of others.",
    ),
    Fault(
        "no_open_interval",
        changed("2001,f,10+,north", "2001,f,10-14,north"),
        "5",
        "age",
        "“10-14” as the last age",
        "an open group, such as 10+",
        "Mark the open group with +, or say in the mapping that the last age is open.",
    ),
    Fault(
        "duplicate_cell",
        f"{SOUND}\n{ROWS[3]}",
        "34",
        "age",
        "“5-9” a second time (f 2001)",
        "one row for each area, sex, year and age",
        "Take one of the rows out; add up rows that were split by another column.",
    ),
    Fault(
        "unknown_sex",
        SOUND.replace("2001,f,", "2001,heron,"),
        "8 rows between 2 and 21",
        "sex",
        "“heron”",
        "f, m or p (female, male, persons)",
        "Give one row for each sex, or say in the mapping what the code means.",
    ),
    Fault(
        "empty_file",
        "",
        "",
        "",
        "an empty file",
        "a heading and one row for each area, sex, year and age",
        "Upload the file that holds the counts; the templates show the form.",
    ),
)
each_fault = pytest.mark.parametrize(
    "fault", FAULTS, ids=[f"{at}-{fault.key}" for at, fault in enumerate(FAULTS)]
)


def handed_in(reader: TestClient, content: str, name: str = FILE) -> str:
    """The walk of somebody who hands a file in and leaves the columns as they were recognised; the
    address of the draft."""
    files = {"counts": (name, content.encode(), "text/csv")}
    answer = reader.post("/uploads", data={"collection": "saltmarsh"}, files=files)
    assert answer.status_code == 303, words(answer)
    place = answer.headers["location"].removesuffix("/reading")
    assert reader.get(f"{place}/reading").status_code == 200
    columns = content.split("\n")[0].split(",")
    fields = {f"counts.{field}": field if field in columns else "" for field in COLUMNS}
    answer = reader.post(f"{place}/reading", data={**fields, **BASIS})
    assert answer.headers["location"] == f"{place}/problems"
    return place


@each_fault
def test_a_faulty_file_as_a_page(reader: TestClient, fault: Fault) -> None:
    place = handed_in(reader, fault.content)
    said = words(reader.get(f"{place}/problems"))
    assert f"{FILE} cannot become an edition yet: one thing must be put right" in said
    rows = (fault.rows or "all").replace(" rows", "")
    row = " ".join(
        part for part in (rows, fault.column, fault.found, fault.expected, fault.remedy) if part
    )
    assert row in said
    refused = reader.post(f"{place}/commit", data={"note": "All the same."})
    assert refused.status_code == 409
    assert fault.sentence in words(refused)


@each_fault
def test_a_faulty_file_in_json(reader: TestClient, fault: Fault) -> None:
    place = handed_in(reader, fault.content)
    listed = reader.get(f"{place}/problems.json").json()["figures"]["problems"]["rows"]
    errors = [row for row in listed if row["severity"] == "must be put right"]
    assert [(row["check"], row["file"], row["column"]) for row in errors] == [
        (fault.key, FILE, fault.column)
    ]
    assert [errors[0][name] for name in ("found", "expected", "remedy")] == [
        fault.found,
        fault.expected,
        fault.remedy,
    ]
    refused = reader.post(
        f"{place}/commit", data={"note": "All the same."}, headers={"Accept": "application/json"}
    )
    assert (refused.status_code, refused.headers["content-type"]) == (409, PROBLEM)
    assert fault.sentence in refused.json()["detail"]


@each_fault
def test_a_faulty_file_on_the_terminal(ebbline: Terminal, tmp_path: Path, fault: Fault) -> None:
    path = tmp_path / FILE
    path.write_text(fault.content, encoding="utf-8")
    said = ebbline("hand-in", "--collection", "saltmarsh", "--counts", path, "--note", "Second.")
    assert said.code == 2
    assert said.out.split("\n")[0] == fault.sentence
    assert "To be put right: 1;" in said.out
    assert said.err.startswith("Nothing was written.\n")


# ---- uploads as such -----------------------------------------------------------------------------

LARGE = SOUND + "\n" * LIMIT
SENT = {"counts": (FILE, LARGE.encode(), "text/csv")}
NONE_CHOSEN = (
    "No file was chosen. Go back and choose a file of deaths and one of population, or one that "
    "holds both; or paste a table."
)


@pytest.mark.parametrize(
    ("status", "title", "sentence", "form"),
    [
        (
            413,
            "Too large",
            "What was sent is larger than 1 MB. Send fewer years at a time, or raise "
            "EBBLINE_UPLOAD_LIMIT.",
            {"data": {"collection": "saltmarsh"}, "files": SENT},
        ),
        (422, "Not understood", NONE_CHOSEN, {"data": {"collection": "saltmarsh"}}),
        (
            422,
            "Not understood",
            NONE_CHOSEN,
            {
                "data": {"collection": "saltmarsh"},
                "files": {"counts": ("", b"", "application/octet-stream")},
            },
        ),
        (
            404,
            "No such page",
            "There is no collection reef; known: saltmarsh.",
            {"data": {"collection": "reef"}, "files": {"counts": (FILE, SOUND, "text/csv")}},
        ),
    ],
    ids=["too large", "no file", "a browser's empty field", "no such collection"],
)
def test_an_upload_that_is_not_taken(
    reader: TestClient,
    folder: Path,
    status: int,
    title: str,
    sentence: str,
    form: dict[str, object],
) -> None:
    page = reader.post("/uploads", **form)  # type: ignore[arg-type]
    assert page.status_code == status
    assert title in words(page)
    assert sentence in words(page)
    json = reader.post("/uploads", **form, headers={"Accept": "application/json"})  # type: ignore[arg-type]
    assert (json.status_code, json.headers["content-type"]) == (status, PROBLEM)
    assert json.json()["title"] == title
    assert sentence in json.json()["detail"]


def test_a_file_over_the_limit_on_the_terminal(ebbline: Terminal, tmp_path: Path) -> None:
    path = tmp_path / FILE
    path.write_text(LARGE, encoding="utf-8")
    said = ebbline("hand-in", "--collection", "saltmarsh", "--counts", path)
    assert (said.code, said.out) == (2, "")
    assert said.err == (
        f"ebbline: The file {path} is larger than 1 MB. Send fewer years at a time, or raise "
        "EBBLINE_UPLOAD_LIMIT.\n"
    )
