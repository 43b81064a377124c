"""`ebbline hand-in`: an edition, or every problem and nothing written."""

import sqlite3
from contextlib import closing
from pathlib import Path

import pytest

from tests.factories import counts_csv
from tests.server.cli.conftest import Ebbline

DENMARK = Path(__file__).parents[2] / "published" / "denmark_deaths_personyears_1974_2012.csv"
BASIS = (
    *("--people", "residents", "--dated-by", "death", "--population-is", "person_years"),
    *("--population-date", "each year", "--source", "civil register"),
)
NEW = ("--name", "All deaths", "--owner", "The office", *BASIS)


@pytest.fixture
def counts(tmp_path: Path) -> Path:
    path = tmp_path / "counts.csv"
    path.write_bytes(counts_csv())
    return path


def test_a_country_in_one_command(ebbline: Ebbline) -> None:
    said = ebbline(
        *("hand-in", "--collection", "dk", "--counts", DENMARK, "--area", "dk=Denmark"),
        *("--open-age", "--note", "1974 to 2012", *NEW),
    )
    assert said.code == 0, said.err
    assert "7,800 rows were read; 7,800 are sound." in said.out
    assert "Edition 1 of dk was made" in said.out
    figures = ebbline("figure", "e0", "--collection", "dk", "--from", "2012").out
    assert "82.0 (81.9 to 82.2)" in figures


def test_errors_are_all_printed_and_nothing_is_written(ebbline: Ebbline, counts: Path) -> None:
    faulty = counts_csv().replace(b"2001,f,0,north,21", b"2001,f,0,north,minus two")
    counts.write_bytes(faulty.replace(b"2001,f,5-9", b"2001,q,5-9"))
    said = ebbline("hand-in", "--collection", "salt", "--counts", counts, *NEW)
    assert said.code == 2
    assert "counts.csv, row 2, column deaths: found" in said.out
    assert "minus two" in said.out
    assert "column sex" in said.out
    assert said.err.startswith("Nothing was written.\n")
    assert "--open-age" in said.err
    assert "salt" not in ebbline("editions").out


def test_warnings_want_a_note_and_leave_nothing_behind_without_it(
    ebbline: Ebbline, counts: Path, sqlite_url: str
) -> None:
    told = ("hand-in", "--collection", "salt", "--counts", counts)
    doubtful = counts_csv(years=(2003,)).replace(
        b"2003,f,5-9,north,23,9021", b"2003,f,5-9,north,23,0"
    )
    counts.write_bytes(doubtful)
    said = ebbline(*told, *NEW)
    assert said.code == 2
    assert "There is one warning and no note. Look at it; then say with --note why" in said.err
    assert "salt" not in ebbline("editions").out
    counts.write_bytes(counts_csv())
    assert ebbline(*told, *NEW).code == 0
    counts.write_bytes(doubtful)
    said = ebbline(*told)
    assert said.code == 2
    assert "and no note" in said.err
    assert ebbline(*told, "--note", "The district moved away.").code == 0
    last = ebbline("editions", "--collection", "salt", "--as", "csv").out.splitlines()
    assert [line.split(",")[0] for line in last] == ["edition", "2", "1"]
    with closing(sqlite3.connect(sqlite_url.removeprefix("sqlite:///"))) as database:
        assert database.execute("SELECT count(*) FROM upload").fetchone() == (2,)


def test_what_a_dash_means_must_be_said(ebbline: Ebbline, counts: Path) -> None:
    content = counts_csv().replace(b"2001,f,0,north,21", b"2001,f,0,north,-")
    counts.write_bytes(content)
    told = ("hand-in", "--collection", "salt", "--counts", counts, *NEW)
    said = ebbline(*told)
    assert said.code == 2
    assert "what is meant by “-” in place of a number. Say it with --sign" in said.err
    assert "--sign -=none: expected one of nil, not-available, withheld, mistake." in (
        ebbline(*told, "--sign=-=none").err
    )
    nil = ebbline(*told, "--sign=-=nil").out
    counts.write_bytes(content.replace(b",-,", b",0,"))
    nought = ebbline("hand-in", "--collection", "salt", "--counts", counts).out
    digests = [said.partition("content ")[2][:12] for said in (nil, nought)]
    assert digests[0] == digests[1] != ""


def test_checking_alone_writes_nothing(ebbline: Ebbline, counts: Path) -> None:
    said = ebbline("hand-in", "--check-only", "--counts", counts)
    assert (said.code, said.err) == (0, "")
    assert "To be put right: 0" in said.out
    assert "salt" not in ebbline("editions").out


def test_a_later_edition_takes_over_the_basis(
    ebbline: Ebbline, counts: Path, tmp_path: Path
) -> None:
    assert ebbline("hand-in", "--collection", "salt", "--counts", counts, *NEW).code == 0
    later = tmp_path / "2003.csv"
    later.write_bytes(counts_csv(years=(2003,)))
    said = ebbline(
        *("hand-in", "--collection", "salt", "--counts", later, "--provisional", "2003"),
        *("--note", "2003 added"),
    )
    assert said.code == 0, said.err
    assert "Edition 2 of salt was made" in said.out
    assert "2003 added" in ebbline("editions", "--collection", "salt").out


def test_columns_can_be_named(ebbline: Ebbline, counts: Path) -> None:
    counts.write_bytes(counts_csv().replace(b"year,sex,age,area,deaths", b"a,b,c,d,e"))
    plain = ebbline("hand-in", "--check-only", "--counts", counts)
    named = ebbline(
        *("hand-in", "--check-only", "--counts", counts, "--column", "counts.area=d"),
        *("--column", "year=a", "--column", "sex=b", "--column", "age=c", "--column", "deaths=e"),
    )
    assert (plain.code, named.code) == (2, 0)


UGLY = (
    b"Table 4; deaths\n\nYear;Sex;Age;Deaths;Population\n"
    + b"".join(
        b"2014;%d;%s;%s;9.000\n" % (sex, age, deaths)
        for sex in (1, 2)
        for age, deaths in ((b"0", b"12"), (b"1-4", b"3"), (b"5+", b"1.204"))
    )
    + b"2014;1;Unknown;5;0\n"
)
SAID = (
    *("--numbers", "comma-point", "--sex-code", "1=m", "--sex-code", "2=f"),
    *("--not-stated", "age=share", "--area", "isle=Isle"),
)


def test_a_file_is_sorted_out_and_what_it_does_not_say_is_asked(
    ebbline: Ebbline, tmp_path: Path
) -> None:
    path = tmp_path / "ugly.txt"
    path.write_bytes(UGLY)
    said = ebbline("hand-in", "--check-only", "--files", path)
    assert said.code == 2
    assert (
        "ugly.txt does not say by itself: how numbers are written; which sex is meant" in said.err
    )
    assert "Say it with --numbers, --sex-code" in said.err
    done = ebbline("hand-in", "--check-only", "--files", path, *SAID)
    assert (done.code, "To be put right: 0" in done.out) == (0, True), done.out
    left = ebbline("hand-in", "--check-only", "--files", path, *SAID[:-4], *SAID[-2:])
    assert (left.code, "To be put right: 1" in left.out) == (2, True), left.out
    assert (
        "found 5 of unknown age" in left.out
    )  # whether counts without an age are shared was not said


def test_a_later_file_is_read_as_before(ebbline: Ebbline, tmp_path: Path) -> None:
    path = tmp_path / "ugly.txt"
    path.write_bytes(UGLY)
    first = ebbline(
        *("hand-in", "--collection", "salt", "--files", path, *SAID, "--note", "first", *NEW)
    )
    assert first.code == 0, first.err
    path.write_bytes(UGLY.replace(b"2014;", b"2015;").replace(b"1.204", b"999"))
    told = ("hand-in", "--collection", "salt", "--files", path, "--check-only")
    assert ebbline(*told).code == 2
    again = ebbline(*told, "--as-before", "--numbers", "comma-point")
    assert (again.code, "To be put right: 0" in again.out) == (0, True), again.out + again.err


@pytest.mark.parametrize(
    ("option", "value", "sentence"),
    [
        ("--parted-by", "dots", "expected one of comma, semicolon"),
        ("--headings", "first", "expected a row such as 3, or two such as 3-4"),
        ("--headings", "4-3", "expected a row such as 3"),
        ("--numbers", "counts=plain", "expected one of point, point-comma"),
        ("--not-stated", "age=guess", "expected sex, age or area, and share or leave-out"),
    ],
)
def test_answers_that_are_none_are_told(
    ebbline: Ebbline, counts: Path, option: str, value: str, sentence: str
) -> None:
    said = ebbline("hand-in", "--check-only", "--counts", counts, option, value)
    assert (said.code, sentence in said.err) == (2, True), said.err


def test_the_form_may_be_said_of_one_kind_of_file_alone(ebbline: Ebbline, counts: Path) -> None:
    told = ("hand-in", "--check-only", "--counts", counts, "--headings")
    assert ebbline(*told, "deaths=2").code == 0  # of no file here
    assert ebbline(*told, "counts=2").code == 2


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        ((), "No file was given. Give --counts FILE"),
        (("--counts", "nowhere.csv"), "The file nowhere.csv cannot be opened: No such file"),
        (("--counts", "HERE"), "Say which collection the edition is for: --collection CODE"),
        (
            ("--counts", "HERE", "--collection", "reef"),
            "The basis of the counts is not stated. Give --people, --dated-by",
        ),
        (
            ("--counts", "HERE", "--collection", "reef", *BASIS),
            "There is no collection reef; there are: none.",
        ),
        (
            ("--counts", "HERE", "--collection", "no code", *NEW),
            "expected 1 to 32 of the letters",
        ),
        (("--counts", "HERE", "--column", "county=x"), "there is no field county"),
    ],
)
def test_what_cannot_be_done_is_said_in_a_sentence(
    ebbline: Ebbline, counts: Path, words: tuple[str, ...], sentence: str
) -> None:
    said = ebbline("hand-in", *(str(counts) if word == "HERE" else word for word in words))
    assert said.code == 2
    assert sentence in said.err
    assert "Traceback" not in said.err


def test_a_file_over_the_limit_is_not_read(
    ebbline: Ebbline, counts: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("EBBLINE_UPLOAD_LIMIT", "100")
    said = ebbline("hand-in", "--check-only", "--counts", counts)
    assert said.code == 2
    assert "is larger than" in said.err


def test_a_pair_without_its_sign_is_refused(
    ebbline: Ebbline, counts: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(SystemExit, match="2"):
        ebbline("hand-in", "--counts", counts, "--area", "denmark")
    assert "“denmark” is not of the form A=B" in capsys.readouterr().err


def test_some_years_in_place_of_all_that_stood(ebbline: Ebbline, counts: Path) -> None:
    told = ("hand-in", "--collection", "salt", "--counts", counts)
    assert "It holds 24 columns of ages." in ebbline(*told, *NEW).out
    counts.write_bytes(counts_csv(["north"], times=2))
    took = ("--take-years", "2002", "--gives-way", "years", "--note", "counted twice")
    said = ebbline(*told, *took)
    assert said.code == 0, said.err
    assert "Of the columns of ages of edition 1: 3 changed and 6 dropped." in said.out
    listed = ebbline("editions", "--collection", "salt", "--as", "csv").out
    assert "3 changed and 6 dropped; only 2002, in place of all of these years" in listed
    wrong = ebbline(*told, "--take-years", "soon")
    assert (wrong.code, "are no years" in wrong.err) == (2, True)
    assert ebbline(*told, "--take-area", "atlantis").code == 2
    assert ebbline("rebuild").code == 0
