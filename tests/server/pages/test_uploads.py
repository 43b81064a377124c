"""The pages of an upload as data: reading, problems, what was understood."""

from collections.abc import Iterable

import pytest

from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.actions.preview_upload import preview_upload
from server.actions.receive_upload import receive_upload
from server.exports.table import Table
from server.intake.mapping import Mapping
from server.pages import upload_new, upload_problems, upload_reading, uploads
from server.pages.form_fields import Field
from server.sentences.pieces import plain
from server.store.connect import Session
from server.store.errors import Missing, Refused
from server.store.records import Taking
from tests.factories import BASIS, COLUMNS, NOON, checked_upload, counts_csv, stored_collection
from tests.server.intake.workbooks import xlsx

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


def lines(fields: Iterable[Field]) -> dict[str, Field]:
    return {field.name: field for field in fields}


def asked(built: upload_reading.UploadReadingPage) -> tuple[Field, ...]:
    return (*built.asked.here, *built.asked.more)


def basis_of(built: upload_reading.UploadReadingPage) -> tuple[str, str]:
    fields = lines(built.asked.basis)
    return fields["people"].value, fields["source"].value


def test_columns_are_proposed_with_samples_and_how_sure_that_is(salt: Session) -> None:
    built = upload_reading.build(salt, received(salt, DEATHS))
    (file,) = built.files
    fields = lines(file.columns)
    assert fields["deaths.sex"].value == "sex"
    assert fields["deaths.sex"].hint == "f; sure: its heading says so"
    assert fields["deaths.year"].value == "q1"
    assert fields["deaths.year"].hint == "2001; likely: its values look like it"
    assert lines(file.others)["deaths.status"].value == ""
    assert built.table("deaths").rows[0].cells == ("2001", "f", "0", "north", "3")
    assert plain(built.answer).startswith("The file was read.")
    assert built.lead == ()


def test_what_a_file_does_not_say_is_told_first_and_nothing_is_chosen(salt: Session) -> None:
    content = DEATHS.replace(b",f,", b",1,").replace(b",9\n", b",1.209\n")
    built = upload_reading.build(salt, received(salt, content))
    assert plain(built.lead[0]) == (
        "The files do not say by themselves: how numbers are written; which sex is meant by “1”."
    )
    asked = lines(built.files[0].asked)
    assert {name: asked[name].value for name in ("deaths.marks", "deaths.sex.0")} == {
        "deaths.marks": "",
        "deaths.sex.0": "",
    }
    assert "“1.209” can be read in two ways" in asked["deaths.marks"].hint
    assert "1.234,5" in asked["deaths.marks"].hint


def test_totals_and_counts_without_an_age_are_shown_with_the_choice(salt: Session) -> None:
    more = b"2001,f,Total,north,12\n2001,f,Unknown,north,1\n"
    built = upload_reading.build(salt, received(salt, DEATHS + more))
    assert "never counted twice: age “Total”." in built.files[0].found
    choice = lines(built.asked.here)["unstated_age"]
    assert "“Unknown”" in choice.label
    assert (choice.value, [value for value, _ in choice.options]) == ("", ["spread", "left_out"])


def test_a_workbook_shows_its_sheets(salt: Session) -> None:
    row = (2001, "f", "0", "north", 3)
    table = [("year", "sex", "age", "area", "deaths"), row]
    book = xlsx([("by hand",)], name="Notes", more={"Table 2": table})
    built = upload_reading.build(salt, received(salt, book))
    sheet = lines(built.files[0].form)["deaths.sheet"]
    assert [value for value, _ in sheet.options] == ["Notes", "Table 2"]
    assert sheet.value == "Table 2"
    assert "deaths.encoding" not in lines(built.files[0].form)


def test_a_file_that_is_no_table_is_not_said_to_be_read(salt: Session) -> None:
    built = upload_reading.build(salt, received(salt, b""))
    assert plain(built.answer).startswith("deaths.csv cannot be read as it stands.")
    assert not built.readable


def test_what_was_stated_for_a_file_goes_before_its_headings(salt: Session) -> None:
    upload = checked_upload(salt, counts_csv(), mapping=Mapping(year="age", whole="isle"))
    built = upload_reading.build(salt, upload.id)
    assert lines(built.files[0].columns)["counts.year"].value == "age"
    assert lines(asked(built))["whole"].value == "isle"
    assert basis_of(built) == (BASIS.people, BASIS.source)


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
    fields = lines(asked(built))
    assert (fields["whole"].value, fields["provisional"].value) == ("isle", "")
    assert basis_of(built) == (BASIS.people, BASIS.source)
    assert built.files[0].notes[0].startswith("Proposed as it was read for edition 1.")
    other = upload_reading.build(salt, received(salt, DEATHS, "deaths"))
    assert lines(asked(other))["whole"].value == ""  # no file of deaths alone was read before
    assert other.files[0].notes == ()
    changed = counts_csv(years=(2003,)).replace(b"area", b"district", 1)
    lost = upload_reading.build(salt, received(salt, changed, "counts"))
    assert "edition 1, which had area, code in “area”." in lost.files[0].notes[0]


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
    assert built.making.button == "Make edition 1"


def _effect(session: Session, upload: int) -> Table:
    shown = preview_upload(session, upload_id=upload, taking=Taking(), by=LOCAL)
    making = upload_problems.build(session, upload, Taking(), shown).making
    assert making is not None
    assert making.effect is not None
    (years,) = making.effect.years.tables
    return years


def test_nothing_stands_before_a_first_edition(salt: Session) -> None:
    upload = checked_upload(salt, counts_csv())
    years = _effect(salt, upload.id)
    assert [one.key for one in years.columns] == ["year", "deaths_after", "person_years_after"]
    commit_upload(salt, upload_id=upload.id, note="first", by=LOCAL, now=NOON)
    later = checked_upload(salt, counts_csv().replace(b",30,", b",31,", 1))
    assert len(_effect(salt, later.id).columns) == 7


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
