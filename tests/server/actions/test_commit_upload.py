"""From kept bytes to an edition: what comes out, and what is refused with nothing written."""

import datetime as dt
from dataclasses import replace
from threading import Barrier, Thread

import pytest
from sqlalchemy.orm import Session, sessionmaker

from server.accounts.viewer import LOCAL, NotAllowed, Right, Viewer
from server.actions.commit_upload import commit_upload
from server.actions.reinstate_edition import reinstate_edition
from server.actions.withdraw_edition import withdraw_edition
from server.store import areas, editions, rows, schedules, uploads
from server.store.connect import transaction
from server.store.errors import Missing, Refused, Stale
from server.store.records import ALL_OF_IT, Edition, Key, Selection, Taking
from tests.factories import BASIS, COLUMNS, NOON, checked_upload, counts_csv, stored_collection

WHOLE = replace(COLUMNS, whole="isle", whole_name="The isle")


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


def commit(
    session: Session, upload_id: int, *, note: str = "", taking: Taking = ALL_OF_IT
) -> Edition:
    return commit_upload(session, upload_id=upload_id, note=note, by=LOCAL, now=NOON, taking=taking)


def handed(session: Session, content: bytes, **options: object) -> Edition:
    return commit(session, checked_upload(session, content, **options).id)  # type: ignore[arg-type]


def deaths(session: Session, number: int, area: str, sex: str, year: int = 2001) -> list[float]:
    found = schedules.load(session, "saltmarsh", number, Selection(areas=(area,), sexes=(sex,)))
    return found[Key(area, sex, str(year), "deaths")].values.tolist()


def test_an_upload_becomes_an_edition(session: Session) -> None:
    upload = checked_upload(session, counts_csv())
    edition = commit(session, upload.id, note=" first counts ")
    assert (edition.number, edition.base, edition.by) == (1, 0, "local analyst")
    assert (edition.note, edition.upload, edition.basis) == ("first counts", upload.id, BASIS)
    assert uploads.find(session, upload.id).edition == 1
    assert deaths(session, 1, "north", "f") == [21.0, 22.0, 23.0, 24.0]
    assert deaths(session, 1, "north", "p") == [46.0, 48.0, 50.0, 52.0]
    found = schedules.contents(session, "saltmarsh", 1)
    assert (found.areas, found.periods) == (("north", "south"), ("2001", "2002"))
    assert found.measures == ("deaths", "person_years")


def test_the_whole_is_summed_over_what_was_handed_in_and_what_stood(session: Session) -> None:
    handed(session, counts_csv(), mapping=WHOLE)
    before = deaths(session, 1, "isle", "p")
    handed(session, counts_csv(["north"], years=[2001], times=3), mapping=WHOLE)
    north, south, whole = (deaths(session, 2, area, "p") for area in ("north", "south", "isle"))
    assert whole == [one + other for one, other in zip(north, south, strict=True)] != before
    assert deaths(session, 1, "isle", "p") == before
    assert deaths(session, 2, "isle", "p", 2002) == deaths(session, 1, "isle", "p", 2002)


def test_one_region_handed_in_alone_stays_part_of_the_whole(session: Session) -> None:
    handed(session, counts_csv(), mapping=WHOLE)
    handed(session, counts_csv(["north"], times=2))
    tree = [(area.code, area.name, area.parent) for area in areas.listing(session, "saltmarsh", 2)]
    assert tree == [
        ("isle", "The isle", ""),
        ("north", "north", "isle"),
        ("south", "south", "isle"),
    ]
    north, south = deaths(session, 2, "north", "m"), deaths(session, 2, "south", "m")
    assert deaths(session, 2, "isle", "m") == [a + b for a, b in zip(north, south, strict=True)]


def test_replacing_leaves_nothing_of_the_base(session: Session) -> None:
    handed(session, counts_csv(), mapping=WHOLE)
    upload = checked_upload(session, counts_csv(["east"]))
    edition = commit(session, upload.id, taking=Taking(gives_way="all"))
    assert (edition.base, edition.replaces) == (1, True)
    assert schedules.contents(session, "saltmarsh", 2).areas == ("east",)


def test_the_same_counts_again_give_the_same_content_hash(session: Session) -> None:
    first = handed(session, counts_csv())
    assert handed(session, counts_csv(times=2)).digest != first.digest
    assert handed(session, counts_csv()).digest == first.digest


def test_warnings_need_a_note(session: Session) -> None:
    content = counts_csv().replace(b",9007", b",0", 1)  # deaths where nobody lives
    upload = checked_upload(session, content)
    assert '"warning"' in upload.report
    with pytest.raises(Refused, match=r"Upload 1 has \d+ warnings and no note"):
        commit(session, upload.id, note="  ")
    assert editions.listing(session, "saltmarsh") == ()
    assert commit(session, upload.id, note="an empty village").note == "an empty village"


def test_errors_are_refused_with_the_first_of_them(session: Session) -> None:
    upload = checked_upload(session, counts_csv().replace(b"21,", b"-21,", 1))
    with pytest.raises(Refused, match=r"has 1 errors and cannot become an edition.*row 2") as said:
        commit(session, upload.id, note="never mind")
    assert "Correct the file" in str(said.value)
    assert editions.listing(session, "saltmarsh") == ()


def test_a_report_does_not_outlive_the_bytes_it_was_made_of(session: Session) -> None:
    """A forged or outdated report does not let errors through: the file is read again."""
    upload = checked_upload(session, counts_csv().replace(b"21,", b"-21,", 1))
    forged = checked_upload(session, counts_csv()).report
    with transaction(session):
        reader = upload.reader
        uploads.set_report(session, upload.id, report=forged, reader=reader, base=0)
    with pytest.raises(Refused, match="cannot become an edition"):
        commit(session, upload.id)


def test_an_unchecked_upload_is_refused(session: Session) -> None:
    upload = checked_upload(session, counts_csv())
    mappings = {"counts": COLUMNS.to_json()}
    with transaction(session):
        uploads.set_mapping(session, upload.id, mappings=mappings, basis=BASIS)
    with pytest.raises(Refused, match="has not been checked as it stands now"):
        commit(session, upload.id)
    with transaction(session):
        uploads.set_report(session, upload.id, report=upload.report, reader="reader-0", base=0)
    with pytest.raises(Refused, match="has not been checked as it stands now"):
        commit(session, upload.id)


def test_an_upload_becomes_one_edition_only(session: Session) -> None:
    upload = checked_upload(session, counts_csv())
    commit(session, upload.id)
    with pytest.raises(Refused, match="Upload 1 is edition 1 already"):
        commit(session, upload.id)


def test_checks_against_another_edition_are_stale(session: Session) -> None:
    first, second = (checked_upload(session, counts_csv(times=times)) for times in (1, 2))
    commit(session, first.id)
    with pytest.raises(Stale, match="against no edition, but edition 1 stands now"):
        commit(session, second.id)
    withdraw_edition(session, collection="saltmarsh", number=1, note="x", by=LOCAL, now=NOON)
    assert commit(session, second.id).number == 2


def test_an_edition_made_between_the_reading_and_the_writing_is_noticed(
    session: Session, new_session: sessionmaker[Session], monkeypatch: pytest.MonkeyPatch
) -> None:
    first, second = (checked_upload(session, counts_csv(times=times)) for times in (1, 2))
    prepare = editions.prepare

    def overtaken(own: Session, change: object) -> editions.Prepared:
        monkeypatch.setattr(editions, "prepare", prepare)
        prepared = prepare(own, change)  # type: ignore[arg-type]
        with new_session() as other:
            commit(other, second.id)
        return prepared

    monkeypatch.setattr(editions, "prepare", overtaken)
    with pytest.raises(Stale):
        commit(session, first.id)
    assert [one.upload for one in editions.listing(session, "saltmarsh")] == [second.id]


def test_a_draft_changed_between_the_reading_and_the_writing_is_noticed(
    session: Session, new_session: sessionmaker[Session], monkeypatch: pytest.MonkeyPatch
) -> None:
    """An edition is what its own mapping makes of its bytes, or it is not made."""
    draft = checked_upload(session, counts_csv())
    swapped = replace(COLUMNS, deaths="population", population="deaths")
    prepare = editions.prepare

    def overtaken(own: Session, change: object) -> editions.Prepared:
        prepared = prepare(own, change)  # type: ignore[arg-type]
        with new_session() as other, transaction(other):
            mappings = {"counts": swapped.to_json()}
            uploads.set_mapping(other, draft.id, mappings=mappings, basis=BASIS)
        return prepared

    monkeypatch.setattr(editions, "prepare", overtaken)
    with pytest.raises(Refused, match="Upload 1 was changed while it was being committed"):
        commit(session, draft.id)
    assert editions.listing(session, "saltmarsh") == ()


def test_a_draft_cannot_be_changed_while_it_is_written(
    session: Session, new_session: sessionmaker[Session], monkeypatch: pytest.MonkeyPatch
) -> None:
    draft, ends = checked_upload(session, counts_csv()), []
    write = editions.write

    def change() -> None:
        with new_session() as other:
            try:
                with transaction(other):
                    uploads.erase(other, draft.id)
            except Refused as refused:
                ends.append(str(refused))

    thread = Thread(target=change)

    def overtaken(*arguments: object, **said: object) -> Edition:
        thread.start()
        thread.join(timeout=0.3)
        return write(*arguments, **said)  # type: ignore[arg-type]

    monkeypatch.setattr(editions, "write", overtaken)
    assert commit(session, draft.id).upload == draft.id
    thread.join()
    assert ends == [
        "Upload 1 has become edition 1 and stays as it is. Hand the corrected file in as a new "
        "upload."
    ]


def test_an_upload_without_names_leaves_the_names_there_are(session: Session) -> None:
    named = replace(COLUMNS, area="", only_area="north", only_area_name="North Shore")
    handed(session, counts_csv(["north"]), mapping=named)
    handed(session, counts_csv(["north", "south"], times=2))
    names = [area.name for area in areas.listing(session, "saltmarsh", 2)]
    assert names == ["North Shore", "south"]


def test_of_commits_at_the_same_moment_one_is_made(
    session: Session, new_session: sessionmaker[Session]
) -> None:
    drafts = [checked_upload(session, counts_csv(times=times)).id for times in (1, 2, 3, 4)]
    start, ends = Barrier(len(drafts)), []

    def work(upload_id: int) -> None:
        with new_session() as own:
            start.wait()
            try:
                ends.append(commit(own, upload_id, note="n").number)
            except Exception as error:
                ends.append(type(error))

    threads = [Thread(target=work, args=(upload_id,)) for upload_id in drafts]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert sorted(ends, key=str) == [1, Stale, Stale, Stale]
    session.rollback()  # let go what it saw before
    assert len(editions.listing(session, "saltmarsh")) == 1


def test_a_failure_in_the_middle_leaves_nothing(
    session: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    def failing(*_arguments: object) -> None:
        raise OSError("no space left")

    upload = checked_upload(session, counts_csv())
    with monkeypatch.context() as patch:
        patch.setattr(rows, "name_areas", failing)
        with pytest.raises(OSError, match="no space left"):
            commit(session, upload.id)
    assert editions.listing(session, "saltmarsh") == ()
    assert schedules.load(session, "saltmarsh", 1) == {}
    assert commit(session, upload.id).number == 1


def test_an_action_needs_its_right(session: Session) -> None:
    reader = Viewer("a reader", frozenset({Right.READ}))
    upload = checked_upload(session, counts_csv())
    with pytest.raises(NotAllowed, match="a reader may not commit here"):
        commit_upload(session, upload_id=upload.id, note="", by=reader, now=NOON)
    commit(session, upload.id)
    for action in (withdraw_edition, reinstate_edition):
        with pytest.raises(NotAllowed, match="a reader may not withdraw here"):
            action(session, collection="saltmarsh", number=1, note="x", by=reader, now=NOON)
    assert not editions.listing(session, "saltmarsh")[0].withdrawn


def test_a_withdrawal_needs_a_reason_and_can_be_taken_back(session: Session) -> None:
    handed(session, counts_csv())
    later = NOON + dt.timedelta(hours=1)
    with pytest.raises(Refused, match="Edition 1 cannot be withdrawn without a note"):
        withdraw_edition(session, collection="saltmarsh", number=1, note=" ", by=LOCAL, now=later)
    gone = withdraw_edition(
        session, collection="saltmarsh", number=1, note="boundary wrong", by=LOCAL, now=later
    )
    assert gone.withdrawn
    assert (gone.events[0].note, gone.events[0].at) == ("boundary wrong", later)
    back = reinstate_edition(
        session, collection="saltmarsh", number=1, note="", by=LOCAL, now=later
    )
    assert not back.withdrawn
    with pytest.raises(Missing, match="There is no edition 4; known: 1"):
        withdraw_edition(session, collection="saltmarsh", number=4, note="x", by=LOCAL, now=later)
