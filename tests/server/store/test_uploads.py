"""Uploads: bytes as handed in, a mapping, a report; a draft until an edition names it."""

import hashlib

import pytest
from sqlalchemy.orm import Session

from server.store import uploads
from server.store.connect import transaction
from server.store.errors import Missing, Refused
from server.store.records import Upload
from tests.factories import BASIS, NOON, cells, stored_collection, stored_edition

CONTENT = b"\xef\xbb\xbfyear;deaths\r\n2014;\x00\xff\r\n"


@pytest.fixture
def upload(session: Session) -> Upload:
    stored_collection(session)
    return received(session)


def received(session: Session) -> Upload:
    files = [("population", "p.csv", b"p"), ("deaths", "d.csv", CONTENT)]
    with transaction(session):
        return uploads.receive(session, collection="saltmarsh", files=files, by="me", at=NOON)


def test_the_bytes_are_kept_with_their_digest(session: Session, upload: Upload) -> None:
    assert uploads.file_bytes(session, upload.id, "deaths") == CONTENT
    deaths, population = upload.files
    assert (deaths.role, deaths.name, deaths.size) == ("deaths", "d.csv", len(CONTENT))
    assert deaths.sha256 == hashlib.sha256(CONTENT).hexdigest()
    assert (population.role, population.mapping) == ("population", "")
    assert (upload.collection, upload.received, upload.by) == ("saltmarsh", NOON, "me")
    assert (upload.basis, upload.base, upload.edition, upload.report) == (None, None, None, "")


def test_a_new_mapping_drops_the_report(session: Session, upload: Upload) -> None:
    with transaction(session):
        uploads.set_mapping(session, upload.id, mappings={"deaths": "{}"}, basis=BASIS)
        checked = uploads.set_report(session, upload.id, report="[]", reader="r", base=0)
    assert (checked.report, checked.reader, checked.base) == ("[]", "r", 0)
    assert checked.basis == BASIS
    assert [file.mapping for file in checked.files] == ["{}", ""]
    with transaction(session):
        again = uploads.set_mapping(session, upload.id, mappings={"deaths": "[]"}, basis=BASIS)
    assert (again.report, again.reader, again.base) == ("", "", None)


def test_uploads_are_listed_newest_first(session: Session, upload: Upload) -> None:
    second = received(session)
    assert uploads.listing(session, "saltmarsh") == (second, upload)
    assert uploads.listing(session, "reef") == ()


def test_an_upload_that_is_an_edition_stays_as_it_is(session: Session, upload: Upload) -> None:
    stored_edition(session, cells(), upload=upload.id)
    assert uploads.find(session, upload.id).edition == 1
    for change in (
        lambda: uploads.erase(session, upload.id),
        lambda: uploads.set_report(session, upload.id, report="", reader="", base=0),
        lambda: uploads.set_mapping(session, upload.id, mappings={}, basis=BASIS),
    ):
        with pytest.raises(Refused, match="Upload 1 has become edition 1 and stays as it is"):
            change()
    assert uploads.file_bytes(session, upload.id, "deaths") == CONTENT


def test_an_erased_draft_is_gone_and_its_number_is_not_given_again(
    session: Session, upload: Upload
) -> None:
    with transaction(session):
        uploads.erase(session, upload.id)
    with pytest.raises(Missing, match=r"There is no upload 1\.$"):
        uploads.find(session, upload.id)
    assert received(session).id == 2


def test_an_upload_has_one_file_of_each_role(session: Session, upload: Upload) -> None:
    for files in ([], [("deaths", "a", b""), ("deaths", "b", b"")]):
        with pytest.raises(ValueError, match="one file of each role, at least one"):
            uploads.receive(session, collection="saltmarsh", files=files, by="", at=NOON)
    with pytest.raises(Missing, match="There is no file births; known: deaths, population"):
        uploads.file_bytes(session, upload.id, "births")
    with pytest.raises(Missing, match="There is no file births; known: deaths, population"):
        uploads.set_mapping(session, upload.id, mappings={"births": "{}"}, basis=BASIS)


def test_a_moment_without_a_zone_is_refused(session: Session, upload: Upload) -> None:
    with pytest.raises(Exception, match="has no time zone; give a moment in UTC"):
        uploads.receive(
            session,
            collection="saltmarsh",
            files=[("deaths", "d", b"")],
            by="me",
            at=NOON.replace(tzinfo=None),
        )
