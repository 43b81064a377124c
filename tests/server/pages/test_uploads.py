"""The pages of an upload as data: reading, problems, what was understood."""

import pytest

from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.actions.receive_upload import receive_upload
from server.intake.mapping import Mapping
from server.pages import upload_new, upload_problems, upload_reading, uploads
from server.sentences.pieces import plain
from server.store.connect import Session
from server.store.errors import Missing, Refused
from tests.factories import BASIS, COLUMNS, NOON, checked_upload, counts_csv, stored_collection

DEATHS = b"q1,sex,age,area,deaths\n2001,f,0,north,3\n2001,f,1+,north,9\n"


@pytest.fixture
def salt(session: Session) -> Session:
    stored_collection(session)
    return session


def received(session: Session, content: bytes, role: str = "deaths") -> int:
    files = [(role, f"{role}.csv", content)]
    return receive_upload(session, collection="saltmarsh", files=files, by=LOCAL, now=NOON).id


def test_a_single_collection_is_proposed(salt: Session) -> None:
    assert upload_new.build(salt, "", limit=1_000_000).chosen == "saltmarsh"
    with pytest.raises(Missing, match="no collection reef"):
        upload_new.build(salt, "reef", limit=1_000_000)


def test_columns_are_proposed_with_how_sure_that_is(salt: Session) -> None:
    built = upload_reading.build(salt, received(salt, DEATHS))
    (file,) = built.files
    fields = {field.name: field for field in file.fields}
    assert fields["deaths.sex"].chosen == "sex"
    assert fields["deaths.sex"].why == "sure: its heading says so"
    assert fields["deaths.year"].chosen == "q1"
    assert fields["deaths.year"].why == "likely: its values look like it"
    assert (fields["deaths.status"].chosen, fields["deaths.status"].why) == ("", "")
    assert built.table("deaths").rows[0].cells == ("2001", "f", "0", "north", "3")
    assert plain(built.answer).startswith("The file was read.")


def test_a_file_that_is_no_table_is_not_said_to_be_read(salt: Session) -> None:
    built = upload_reading.build(salt, received(salt, b""))
    assert plain(built.answer).startswith("deaths.csv cannot be read as it stands.")
    assert not built.readable


def test_what_was_stated_for_a_file_goes_before_its_headings(salt: Session) -> None:
    upload = checked_upload(salt, counts_csv(), mapping=Mapping(year="age", whole="isle"))
    built = upload_reading.build(salt, upload.id)
    fields = {field.name: field.chosen for field in built.files[0].fields}
    assert fields["counts.year"] == "age"
    assert built.asked.mapping.whole == "isle"
    assert built.asked.basis == BASIS


def test_the_last_edition_proposes_reading_and_basis_but_no_provisional_years(
    salt: Session,
) -> None:
    own = Mapping(
        **{field: COLUMNS.column(field) for field in ("year", "sex", "age", "area")},
        deaths="deaths",
        population="population",
        whole="isle",
        provisional_years=("2002",),
    )
    upload = checked_upload(salt, counts_csv(), mapping=own)
    commit_upload(salt, upload_id=upload.id, note="first", by=LOCAL, now=NOON)
    built = upload_reading.build(salt, received(salt, counts_csv(years=(2003,)), "counts"))
    assert (built.asked.mapping.whole, built.asked.provisional) == ("isle", "")
    assert built.asked.basis == BASIS
    other = upload_reading.build(salt, received(salt, DEATHS, "deaths"))
    assert other.asked.mapping.whole == ""  # no file of deaths alone was read before


def test_an_edition_has_no_reading_to_correct(salt: Session) -> None:
    upload = checked_upload(salt, counts_csv())
    commit_upload(salt, upload_id=upload.id, note="first", by=LOCAL, now=NOON)
    with pytest.raises(Refused, match="has become edition 1 and stays as it is"):
        upload_reading.build(salt, upload.id)
    built = upload_problems.build(salt, upload.id)
    assert built.making is None
    assert plain(built.answer) == "counts.csv became edition 1."


def test_problems_are_parted_by_severity_and_listed_together(salt: Session) -> None:
    content = counts_csv().replace(b"9007", b"0", 1).replace(b",30,", b",-1,", 1)
    built = upload_problems.build(salt, checked_upload(salt, content).id)
    (errors,), (warnings,) = built.errors.tables, built.warnings.tables
    listed = built.table("problems").rows
    assert len(listed) == len(errors.rows) + len(warnings.rows)
    assert {row.cells[0] for row in listed} == {"must be put right", "wants a second look"}
    assert [column.key for column in errors.columns] == [
        *("row", "column", "found", "expected", "remedy")
    ]
    assert built.making is not None
    assert not built.making.possible
    assert built.making.role == "counts"


def test_a_sound_upload_says_what_was_understood(salt: Session) -> None:
    built = upload_problems.build(salt, checked_upload(salt, counts_csv()).id)
    assert dict(built.holds) == {
        "Counts": "deaths and person-years",
        "Areas": "north and south",
        "Sexes": "women and men",
        "Years": "2, 2001 to 2002",
        "Ages": "0, 1–4, 5–9 ... 10+ (4 groups)",
        "Provisional": "none",
        "Summed": "persons, of women and men",
    }
    assert built.making is not None
    assert built.making.possible
    assert (built.making.button, built.making.may_replace) == ("Make edition 1", False)


def test_the_list_says_where_each_upload_stands(salt: Session) -> None:
    upload = checked_upload(salt, counts_csv())
    commit_upload(salt, upload_id=upload.id, note="first", by=LOCAL, now=NOON)
    received(salt, DEATHS)
    checked_upload(salt, counts_csv().replace(b",22,", b",-1,", 1))
    built = uploads.build(salt)
    states = {row.cells[0]: row.cells[-1] for table in built.tables for row in table.rows}
    assert states == {
        1: "edition 1",
        2: "draft, not checked",
        3: "draft, one thing to be put right",
    }
