"""What cannot be right, handed in or asked for, is answered by one sentence: as a page, as a
problem in JSON, on a terminal. The database stays as it is, and the server goes on serving."""

import html
import re
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path

import pytest
from httpx2 import Response
from starlette.testclient import TestClient

from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.app import create_app
from server.cli import main
from server.config import Config
from server.intake.mapping import COLUMNS
from server.store.connect import make_engine, sessions
from server.store.migrating import migrate
from tests.factories import NOON, checked_upload, counts_csv, stored_collection
from tests.server.web.site import browser

LIMIT = 1_000_000
FILE = "counts.csv"
SOUND = counts_csv().decode()
ROWS = SOUND.split("\n")
CHOICES = "&figures=released&settings=almanac-1"
EDITION = "/c/saltmarsh/1"
GOOD = f"{EDITION}/population-year?of=north.f.2001{CHOICES}"
BASIS = {
    "people": "residents",
    "dated_by": "death",
    "population_is": "midyear",
    "population_date": "1 July of each year",
    "source": "Statistics desk of the isle",
}
DRAFTS = {"upload", "upload_file"}  # a draft with faults is kept, so that it can be corrected
PROBLEM = "application/problem+json"


# ---- the place it happens in ---------------------------------------------------------------------


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A data folder in which edition 1 of a collection stands."""
    made = tmp_path_factory.mktemp("bad-input")
    migrate(Config(data=made).url)
    engine = make_engine(Config(data=made).url)
    with sessions(engine)() as session:
        stored_collection(session)
        upload = checked_upload(session, counts_csv())
        commit_upload(session, upload_id=upload.id, note="First.", by=LOCAL, now=NOON)
    engine.dispose()
    return made


@pytest.fixture(scope="module")
def running(folder: Path) -> Iterator[TestClient]:
    with browser(create_app(Config(data=folder, upload_limit=LIMIT))) as reader:
        yield reader


@pytest.fixture
def reader(running: TestClient, folder: Path) -> Iterator[TestClient]:
    """A browser after whose faults no edition has changed and pages are still served."""
    before = kept(folder)
    yield running
    assert kept(folder) == before
    assert running.get(GOOD, headers={"Cache-Control": "no-cache"}).status_code == 200


def kept(folder: Path) -> dict[str, list[tuple[object, ...]]]:
    """Every row of every table but the drafts'."""
    with closing(sqlite3.connect(folder / "ebbline.db")) as database:
        names = [
            name
            for (name,) in database.execute(
                "SELECT name FROM sqlite_master WHERE type = 'table' AND name NOT LIKE 'sqlite_%'"
            )
        ]
        assert set(names) >= {"collection", "edition", "edition_event", "schedule", "area", "basis"}
        return {
            name: database.execute(f"SELECT * FROM {name} ORDER BY rowid").fetchall()
            for name in names
            if name not in DRAFTS
        }


def words(page: Response) -> str:
    """What a page says, without its marks."""
    text = re.sub(r"<(script|style).*?</\1>", " ", page.text, flags=re.DOTALL)
    return " ".join(html.unescape(re.sub(r"<[^>]+>", " ", text)).split())


@dataclass(frozen=True, slots=True)
class Said:
    code: int
    out: str
    err: str


@pytest.fixture
def ebbline(
    folder: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Iterator["Terminal"]:
    """A terminal after whose faults no table has changed, drafts' neither."""
    monkeypatch.setenv("EBBLINE_DATA", str(folder))
    monkeypatch.setenv("EBBLINE_UPLOAD_LIMIT", str(LIMIT))
    before = kept(folder)
    yield Terminal(capsys)
    assert kept(folder) == before


class Terminal:
    def __init__(self, capsys: pytest.CaptureFixture[str]) -> None:
        self._capsys = capsys

    def __call__(self, *arguments: str | Path) -> Said:
        self._capsys.readouterr()
        try:
            code = main([str(one) for one in arguments])
        except SystemExit as ended:
            code = int(ended.code or 0)
        return Said(code, *self._capsys.readouterr())


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
        SOUND.replace("2001,f,", "2001,girls,"),
        "8 rows between 2 and 21",
        "sex",
        "“girls”",
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
    assert said.err == "Nothing was written.\n"


# ---- uploads as such -----------------------------------------------------------------------------

LARGE = SOUND + "\n" * LIMIT
SENT = {"counts": (FILE, LARGE.encode(), "text/csv")}
NONE_CHOSEN = (
    "No file was chosen. Go back and choose a file of deaths and one of population, or one that "
    "holds both."
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


# ---- addresses -----------------------------------------------------------------------------------

VIEWS = {
    "population-year": f"of=north.f.2001{CHOICES}",
    "comparison": f"this=north.f.2001&that=north.m.2001&of=e0{CHOICES}",
    "trend": f"of=e0&area=north&sex=f&from=2001&to=2002{CHOICES}",
    "contents": CHOICES.removeprefix("&"),
}
each_view = pytest.mark.parametrize("view", VIEWS)


def told(reader: TestClient, view: str, query: str, status: int, sentence: str, at: str) -> None:
    """As a page, and as a problem under the address of each twin."""
    page = reader.get(f"{at}/{view}?{query}")
    assert page.status_code == status
    assert page.headers["content-type"].startswith("text/html")
    assert sentence in words(page)
    for twin in ("json", "csv", "xlsx"):
        problem = reader.get(f"{at}/{view}.{twin}?{query}")
        assert (problem.status_code, problem.headers["content-type"]) == (status, PROBLEM)
        content = problem.json()
        assert content["status"] == status
        assert sentence in content["detail"]
        assert content["instance"].startswith(f"{at}/{view}.{twin}?")


@each_view
def test_an_unknown_key(reader: TestClient, view: str) -> None:
    sentence = "The address has the key “colour”, which this page does not know. It knows "
    told(reader, view, f"{VIEWS[view]}&colour=blue", 400, sentence, EDITION)


@each_view
def test_a_collection_that_is_not_there(reader: TestClient, view: str) -> None:
    sentence = "There is no collection reef; known: saltmarsh."
    told(reader, view, VIEWS[view], 404, sentence, "/c/reef/1")


@each_view
def test_an_edition_that_is_not_there(reader: TestClient, view: str) -> None:
    sentence = "There is no edition 7; known: 1."
    told(reader, view, VIEWS[view], 404, sentence, "/c/saltmarsh/7")


@pytest.mark.parametrize(
    ("view", "old", "new", "sentence"),
    [
        (
            "population-year",
            "2001",
            "1950",
            "This edition does not hold north.f.1950, or not both its deaths and its",
        ),
        ("population-year", "north", "east", "Its areas are north and south;"),
        ("population-year", "north.f.2001", "north", "“north” is not an area, sex and year."),
        (
            "comparison",
            "north.m.2001",
            "north.m.1950",
            "does not hold north.m.1950, or not both its deaths",
        ),
        ("comparison", "of=e0", "of=joy", "The key “of” has the value “joy”; it can be e0, e65,"),
        ("trend", "area=north", "area=east", "This edition has no area east. Its areas are north"),
        (
            "trend",
            "from=2001&to=2002",
            "from=1950&to=1951",
            "from 1950 to 1951. Its years are 2001",
        ),
        ("trend", "sex=f", "sex=girls", "The key “sex” has the value “girls”; it can be f, m, p."),
        ("contents", "almanac-1", "best", "The key “settings” has the value “best”; it can be"),
    ],
)
def test_a_question_the_edition_cannot_answer(
    reader: TestClient, view: str, old: str, new: str, sentence: str
) -> None:
    query = VIEWS[view].replace(old, new, 1)
    status = reader.get(f"{EDITION}/{view}?{query}").status_code
    assert status in (400, 404)
    told(reader, view, query, status, sentence, EDITION)


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        (("e0", "--collection", "reef"), "There is no collection reef; known: saltmarsh."),
        (("e0", "--edition", "7"), "There is no edition 7; known: 1."),
        (("e0", "--area", "east"), "This edition has no area east. Its areas are north and south."),
        (("e0", "--from", "1950", "--to", "1951"), "Its years are 2001 to 2002."),
        (("joy",), "The key “of” has the value “joy”; it can be e0, e65,"),
        (("e0", "--colour", "blue"), "unrecognized arguments: --colour blue"),
        (("e0", "--sex", "girls"), "invalid choice: 'girls' (choose from"),
    ],
)
def test_a_question_that_cannot_be_answered_on_the_terminal(
    ebbline: Terminal, arguments: tuple[str, ...], sentence: str
) -> None:
    collection = () if "--collection" in arguments else ("--collection", "saltmarsh")
    said = ebbline("figure", *arguments, *collection)
    assert (said.code, said.out) == (2, "")
    assert sentence in said.err
    assert len(said.err.strip().split("\n")) == 1 or said.err.startswith("usage: ")


def test_a_draft_that_is_not_there(reader: TestClient) -> None:
    page = reader.get("/uploads/999/problems")
    assert page.status_code == 404
    assert "There is no upload 999" in words(page)
    json = reader.get("/uploads/999/problems.json")
    assert (json.status_code, json.headers["content-type"]) == (404, PROBLEM)
    assert "There is no upload 999" in json.json()["detail"]
