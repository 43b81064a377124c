"""Deaths by cause from files to editions: committed, looked ahead at, made anew."""

from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy.orm import Session

from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.actions.preview_upload import foresee_upload, preview_upload
from server.actions.rebuild_editions import rebuild_editions
from server.intake.report import Report
from server.results.causes import CauseChoice
from server.results.keys import PopulationYear
from server.results.loading import Beside, load
from server.store import causes, schedules
from server.store.errors import Refused
from server.store.records import ALL_OF_IT, Edition, Key, Selection, Taking, Upload, Vector
from tests.factories import COLUMNS, NOON, checked_upload, counts_csv, stored_collection

LIST = (
    "code,name,part of,codes,kind,care,sex\n"
    "body,Of the body,,,,,\n"
    "heart,Heart,body,I00-I99,,,\n"
    "other,All else,body,A00-H95;J00-R99,,,\n"
    "falls,Falls,,W00-W19,external,,\n"
)
BY_CAUSE = replace(COLUMNS, population="", cause="cause", cause_list="own", whole="isle")
SHARES = {"heart": 10, "other": 6, "falls": 4}  # twentieths of the deaths of every age


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


def by_cause(content: bytes, **shares: int) -> bytes:
    lines = content.decode().splitlines()
    table = [f"{lines[0].removesuffix(',population')},cause"]
    for line in lines[1:]:
        *whose, deaths, _people = line.split(",")
        for cause, share in (shares or SHARES).items():
            table.append(",".join([*whose, str(int(deaths) * share / 20), cause]))
    return "\n".join(table).encode()


COUNTS = counts_csv(times=20)


def draft(
    session: Session, *, content: bytes = COUNTS, listed: str = LIST, **shares: int
) -> Upload:
    parted = by_cause(content, **shares)
    return checked_upload(session, parted, mapping=BY_CAUSE, role="deaths", causes=listed)


def made(session: Session, upload: Upload, taking: Taking = ALL_OF_IT) -> Edition:
    return commit_upload(
        session, upload_id=upload.id, note="as told", by=LOCAL, now=NOON, taking=taking
    )


def held(session: Session, number: int) -> dict[Key, Vector]:
    return schedules.load(session, "saltmarsh", number, Selection(cause=None))


def of_causes(session: Session, number: int) -> set[tuple[str, str, str]]:
    """Area, sex and year of deaths by cause."""
    return {key[:3] for key in held(session, number) if key.cause}


@pytest.fixture
def two(session: Session) -> Session:
    """Edition 1 of all causes, edition 2 with the same deaths by cause."""
    plain = replace(COLUMNS, whole="isle", whole_name="The isle")
    made(session, checked_upload(session, COUNTS, mapping=plain))
    made(session, draft(session))
    return session


def test_every_sum_has_its_causes_and_they_add_up(two: Session) -> None:
    cells = held(two, 2)
    for area in ("north", "south", "isle"):
        for sex in "fmp":
            total = cells[Key(area, sex, "2002", "deaths")].values
            for cause, share in SHARES.items():
                found = cells[Key(area, sex, "2002", "deaths", cause)].values
                np.testing.assert_allclose(found, total * share / 20, atol=1e-6)
    listed = causes.listing(two, "saltmarsh", 2)
    assert [cause.code for cause in listed] == ["body", "heart", "other", "falls"]
    assert [cause.label for cause in listed][2:] == ["All else", "Falls"]
    asked = PopulationYear("isle", "p", "2001")
    groups = load(two, "saltmarsh", 2, [asked], Beside(causes=CauseChoice()))[asked].causes
    assert groups is not None
    assert [cause.code for cause in groups.list] == ["body", "falls"]
    assert all(one.same for one in rebuild_editions(two, collection="saltmarsh", by=LOCAL))


def test_all_causes_alone_are_what_they_were(two: Session) -> None:
    before, after = held(two, 1), held(two, 2)
    for key, cell in before.items():
        np.testing.assert_array_equal(cell.values, after[key].values)


def test_a_year_handed_in_without_causes_has_none_and_the_report_says_so(two: Session) -> None:
    plain = replace(COLUMNS, whole="isle")
    upload = checked_upload(two, counts_csv(("north",), years=(2002,)), mapping=plain)
    assert "causes_left_out" in {one.key for one in Report.from_json(upload.report).warnings}
    made(two, upload)
    lost = {("north", sex, "2002") for sex in "fmp"} | {("isle", sex, "2002") for sex in "fmp"}
    assert of_causes(two, 3) == of_causes(two, 2) - lost
    assert all(one.same for one in rebuild_editions(two, collection="saltmarsh", by=LOCAL))


def test_a_look_ahead_tells_how_many_counts_are_by_cause(two: Session) -> None:
    upload = draft(two, heart=9, other=7, falls=4)
    north = Taking(areas=("north",))
    foresee_upload(two, upload_id=upload.id, taking=north, by=LOCAL)
    seen = preview_upload(two, upload_id=upload.id, taking=north, by=LOCAL)
    assert seen is not None
    changed = made(two, upload, north).effect
    assert changed is not None
    # of two causes in two years, in women, men and persons, of the north and of the whole
    assert seen.schedules.changed == changed.changed == 2 * 2 * 3 * 2
    assert seen.by_cause == seen.cells.changed == 4 * changed.changed
    assert seen.cells.added == seen.cells.dropped == 0


def test_another_list_is_refused_while_counts_of_the_old_one_stay(two: Session) -> None:
    other = LIST.replace("heart,Heart", "hearts,Heart")
    upload = draft(two, listed=other, hearts=10, other=6, falls=4)
    with pytest.raises(Refused, match=r"does not count: heart\."):
        made(two, upload, Taking(areas=("north",)))
    made(two, draft(two, listed=other, hearts=10, other=6, falls=4))
    found = {key.cause for key in held(two, 3)}
    assert found == {"", "hearts", "other", "falls"}
    assert [cause.code for cause in causes.listing(two, "saltmarsh", 3)][1] == "hearts"
    assert all(one.same for one in rebuild_editions(two, collection="saltmarsh", by=LOCAL))


def test_new_codes_of_areas_take_their_causes_along(two: Session) -> None:
    shared = "code,becomes,share\nnorth,moor,0.25\nnorth,fell,0.75\n"
    made(two, checked_upload(two, areas=shared))
    cells, before = held(two, 3), held(two, 2)
    heart = before[Key("north", "f", "2001", "deaths", "heart")].values
    moor = cells[Key("moor", "f", "2001", "deaths", "heart")]
    np.testing.assert_allclose(moor.values, heart / 4, atol=1e-6)
    assert moor.estimated
    whole = cells[Key("isle", "p", "2001", "deaths", "heart")].values
    np.testing.assert_allclose(
        whole, before[Key("isle", "p", "2001", "deaths", "heart")].values, atol=1e-5
    )
    assert all(one.same for one in rebuild_editions(two, collection="saltmarsh", by=LOCAL))
