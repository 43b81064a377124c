"""Files are taken in byte for byte, or refused with nothing kept."""

import pytest
from sqlalchemy.orm import Session

from server.accounts.viewer import LOCAL, NotAllowed, Right, Viewer
from server.actions.discard_upload import discard_upload
from server.actions.receive_upload import FileTooLarge, receive_upload
from server.store import uploads
from server.store.errors import Missing, Refused
from server.store.records import Upload
from tests.factories import NOON, stored_collection

READER = Viewer("a reader", frozenset({Right.READ}))
STRANGE = b"\xff\x00,\r\n;"


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


def received(session: Session, *files: tuple[str, str, bytes], **options: object) -> Upload:
    chosen = {"collection": "saltmarsh", "by": LOCAL, "now": NOON} | options
    return receive_upload(session, files=files, **chosen)  # type: ignore[arg-type]


def test_bytes_are_kept_as_they_are(session: Session) -> None:
    upload = received(session, ("deaths", "d.csv", STRANGE), ("population", "p.csv", b""))
    assert uploads.file_bytes(session, upload.id, "deaths") == STRANGE
    assert [(file.role, file.name) for file in upload.files] == [
        ("deaths", "d.csv"),
        ("population", "p.csv"),
    ]
    assert (upload.by, upload.received, upload.edition) == ("local analyst", NOON, None)


@pytest.mark.parametrize(
    ("name", "kept"),
    [
        ("C:\\counts\\d.csv", "d.csv"),
        ("../../etc/d.csv", "d.csv"),
        ("Tode 2014 (endgültig).csv", "Tode 2014 (endgültig).csv"),
        ("a\r\nb\x00.csv", "ab.csv"),
        ("x" * 300 + ".csv", "x" * 116 + ".csv"),
        ("/", "deaths.csv"),
    ],
)
def test_a_name_is_shown_and_never_opened(session: Session, name: str, kept: str) -> None:
    assert received(session, ("deaths", name, b"1")).files[0].name == kept


def test_files_over_the_limit_are_refused_together(session: Session) -> None:
    files = (("deaths", "d.csv", b"1" * 60), ("population", "p.csv", b"1" * 41))
    message = "The files have 101 bytes, but an upload may have at most 100. Split them by years"
    with pytest.raises(FileTooLarge, match=message):
        received(session, *files, limit=100)
    assert received(session, *files, limit=101)


@pytest.mark.parametrize(
    ("roles", "message"),
    [
        ([], "No file was handed in. Choose a file of deaths"),
        (["dead"], "handed in as dead, which is no kind of file. It must be one of: counts"),
        (["deaths", "deaths"], "2 files were handed in as deaths, but an upload has one"),
    ],
)
def test_files_without_a_place_are_refused(
    session: Session, roles: list[str], message: str
) -> None:
    with pytest.raises(Refused, match=message):
        received(session, *((role, "a.csv", b"1") for role in roles))
    assert uploads.listing(session, "saltmarsh") == ()


def test_who_may_not_upload_is_refused(session: Session) -> None:
    with pytest.raises(NotAllowed):
        received(session, ("deaths", "d.csv", b"1"), by=READER)
    with pytest.raises(Missing, match="There is no collection marsh"):
        received(session, ("deaths", "d.csv", b"1"), collection="marsh")


def test_a_draft_can_be_thrown_away(session: Session) -> None:
    upload = received(session, ("deaths", "d.csv", b"1"))
    with pytest.raises(NotAllowed):
        discard_upload(session, upload_id=upload.id, by=READER)
    discard_upload(session, upload_id=upload.id, by=LOCAL)
    with pytest.raises(Missing, match=f"There is no upload {upload.id}"):
        discard_upload(session, upload_id=upload.id, by=LOCAL)
    assert uploads.listing(session, "saltmarsh") == ()
