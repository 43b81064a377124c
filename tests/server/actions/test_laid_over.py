"""Areas over time and breaks, from a small table to the editions they make."""

from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy.orm import Session

from engine.ages import AgeGrid
from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.actions.rebuild_editions import rebuild_editions
from server.actions.recoding import recoded
from server.intake.mapping import Mapping
from server.intake.report import Report
from server.intake.successions import FIRST, LAST, Share, Succession, Successions
from server.store import areas, breaks, editions, schedules
from server.store.errors import Refused
from server.store.records import Break, Edition, Key, Selection, Taking, Upload, Vector
from tests.factories import BASIS, COLUMNS, NOON, checked_upload, counts_csv, stored_collection

WHOLE = replace(COLUMNS, whole="isle", whole_name="The isle")
THREE, YEARS = ("north", "south", "cape"), (2001, 2002, 2003)
SPLIT = "code,becomes,share\nnorth,moor,0.25\nnorth,fell,0.75\n"
MERGED = "code,becomes,name\nnorth,main,Mainland\nsouth,main,\n"
NEW = "code,becomes,from\nnorth,moor,2004\nnorth,fell,2004\n"


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


def made(session: Session, upload: Upload, **options: Taking) -> Edition:
    return commit_upload(
        session, upload_id=upload.id, note="as told", by=LOCAL, now=NOON, **options
    )


def first(session: Session, mapping: Mapping = WHOLE) -> None:
    made(session, checked_upload(session, counts_csv(THREE, years=YEARS), mapping=mapping))


def held(session: Session, number: int, *codes: str) -> dict[Key, Vector]:
    chosen = Selection(areas=codes or None, cause=None)
    return schedules.load(session, "saltmarsh", number, chosen)


def codes(session: Session, number: int) -> set[str]:
    return {area.code for area in areas.listing(session, "saltmarsh", number)}


def rebuilt(session: Session) -> bool:
    return all(one.same for one in rebuild_editions(session, collection="saltmarsh", by=LOCAL))


def test_a_merge_is_the_exact_sum_of_the_years_that_stand_and_of_those_handed_in(
    session: Session,
) -> None:
    first(session)
    upload = checked_upload(session, counts_csv(THREE, years=(2004,)), mapping=WHOLE, areas=MERGED)
    made(session, upload)
    before, after = held(session, 1), held(session, 2)
    assert codes(session, 2) == {"isle", "cape", "main"}
    assert {key.period for key in after if key.area == "main"} == {"2001", "2002", "2003", "2004"}
    for key, cell in after.items():
        if key.area == "main" and key.period < "2004":
            parts = [before[key._replace(area=code)].values for code in ("north", "south")]
            assert np.array_equal(cell.values, parts[0] + parts[1])
        assert not cell.estimated
    for key, cell in before.items():  # the whole and what was not merged are what they were
        if key.area in ("isle", "cape"):
            assert np.array_equal(after[key].values, cell.values)
    names = {area.code: (area.name, area.parent) for area in areas.listing(session, "saltmarsh", 2)}
    assert names["main"] == ("Mainland", "isle")
    assert codes(session, 1) == {"isle", *THREE}
    assert rebuilt(session)


@pytest.mark.parametrize(
    ("field", "merged", "left"),
    [("from", {"2002", "2003"}, {"2001"}), ("to", {"2001", "2002"}, {"2003"})],
)
def test_years_outside_a_merge_keep_their_codes(
    session: Session, field: str, merged: set[str], left: set[str]
) -> None:
    first(session, COLUMNS)
    table = f"code,becomes,{field}\nnorth,main,2002\nsouth,main,2002\n"
    made(session, checked_upload(session, areas=table))
    after = held(session, 2)
    assert {key.period for key in after if key.area == "main"} == merged
    assert {key.period for key in after if key.area == "north"} == left
    assert codes(session, 2) == {*THREE, "main"}
    assert rebuilt(session)


def test_counts_handed_in_under_the_new_code_go_before_those_made_of_old_ones(
    session: Session,
) -> None:
    first(session, COLUMNS)
    own = counts_csv(["main"], years=(2003,), times=7)
    made(session, checked_upload(session, own, areas=MERGED))
    before, after = held(session, 1), held(session, 2)
    key = Key("main", "f", "2003", "deaths")
    assert after[key].values.tolist() == [7 * 21.0, 7 * 22.0, 7 * 23.0, 7 * 24.0]
    earlier = key._replace(period="2002")
    parts = [before[earlier._replace(area=code)].values for code in ("north", "south")]
    assert np.array_equal(after[earlier].values, parts[0] + parts[1])
    persons = after[key._replace(sex="p")].values
    assert np.array_equal(persons, after[key].values + after[key._replace(sex="m")].values)


def test_a_split_sums_to_the_old_and_carries_the_deaths_that_were_counted(
    session: Session,
) -> None:
    first(session)
    made(session, checked_upload(session, areas=SPLIT))
    before, after = held(session, 1), held(session, 2)
    assert codes(session, 2) == {"isle", "south", "cape", "moor", "fell"}
    for key, cell in before.items():
        if key.area == "north" and key.sex != "p":
            moor, fell = (after[key._replace(area=code)] for code in ("moor", "fell"))
            assert np.allclose(moor.values + fell.values, cell.values, rtol=0, atol=1e-6)
            assert np.array_equal(moor.values, 0.25 * cell.values)
            assert moor.estimated
            assert fell.estimated
            if key.measure == "deaths":
                counted = after[key._replace(area="moor", measure="counted_deaths")]
                assert np.array_equal(counted.values, cell.values)
        if key.area in ("isle", "south"):
            assert np.allclose(after[key].values, cell.values, rtol=0, atol=1e-6)
            assert after[key].estimated == (key.area == "isle")
    whole = Key("isle", "f", "2001", "counted_deaths")
    assert np.allclose(after[whole].values, before[whole._replace(measure="deaths")].values)
    assert rebuilt(session)


def test_shares_by_age_sex_and_kind_of_count(session: Session) -> None:
    first(session, COLUMNS)
    rows = ["code,becomes,share,counts,sex,age"]
    for code, young, old, women, men in (
        ("moor", 0.5, 0.2, 0.4, 0.1),
        ("fell", 0.5, 0.8, 0.6, 0.9),
    ):
        rows += [f"north,{code},{young},deaths,,0-9", f"north,{code},{old},deaths,,10+"]
        rows += [f"north,{code},{women},population,f,", f"north,{code},{men},population,m,"]
    made(session, checked_upload(session, areas="\n".join(rows)))
    before, after = held(session, 1, "north"), held(session, 2, "moor")
    for sex, people in (("f", 0.4), ("m", 0.1)):
        deaths, years = (Key("north", sex, "2002", what) for what in ("deaths", "person_years"))
        shared = after[deaths._replace(area="moor")].values / before[deaths].values
        assert np.allclose(shared, [0.5, 0.5, 0.5, 0.2])
        lived = after[years._replace(area="moor")].values / before[years].values
        assert np.allclose(lived, people)
    both = [after[Key("moor", sex, "2002", "person_years")].values for sex in "pfm"]
    assert np.allclose(both[0], both[1] + both[2], atol=1e-5)


def test_part_of_a_code_moves_to_one_that_stays(session: Session) -> None:
    first(session, COLUMNS)
    table = "code,becomes,share\nnorth,north,0.9\nnorth,south,0.1\nsouth,south,1\n"
    made(session, checked_upload(session, areas=table))
    before, after = held(session, 1), held(session, 2)
    assert codes(session, 2) == set(THREE)
    key = Key("north", "f", "2001", "deaths")
    there = key._replace(area="south")
    assert np.allclose(after[key].values, 0.9 * before[key].values)
    assert np.allclose(after[there].values, before[there].values + 0.1 * before[key].values)
    assert after[there].estimated
    assert rebuilt(session)


def test_a_new_series_leaves_the_old_one_ends_it_and_sets_a_break(session: Session) -> None:
    first(session)
    later = counts_csv(("moor", "fell", "south", "cape"), years=(2004,))
    made(session, checked_upload(session, later, mapping=WHOLE, areas=NEW))
    after = held(session, 2)
    assert {key.period for key in after if key.area == "north"} == {"2001", "2002", "2003"}
    assert {key.period for key in after if key.area == "moor"} == {"2004"}
    found = breaks.listing(session, "saltmarsh", 2)
    assert {(one.area, one.period, one.kind) for one in found} == {
        (area, "2004", "boundary") for area in ("north", "moor", "fell")
    }
    # the whole is summed over the parts there are in each year
    assert {key.period for key in after if key.area == "isle"} == {"2001", "2002", "2003", "2004"}
    for period, parts in (("2003", THREE), ("2004", ("moor", "fell", "south", "cape"))):
        key = Key("isle", "f", period, "deaths")
        together = sum(after[key._replace(area=part)].values for part in parts)
        assert np.array_equal(after[key].values, together)
    assert rebuilt(session)


def test_without_a_break_a_missing_part_still_leaves_no_whole(session: Session) -> None:
    first(session)
    later = counts_csv(("moor", "south", "cape"), years=(2004,))
    made(session, checked_upload(session, later, mapping=WHOLE))
    assert not [key for key in held(session, 2, "isle") if key.period == "2004"]


def test_breaks_alone_make_an_edition_and_a_row_ends_one(session: Session) -> None:
    first(session, COLUMNS)
    table = (
        "area,year,kind,note,ratio,ratio_error\n"
        ",2002,population,census,,\nnorth,2003,coding,,1.03,0.01\n"
    )
    second = made(session, checked_upload(session, breaks=table))
    assert breaks.listing(session, "saltmarsh", 2) == (
        Break("", "2002", "population", note="census"),
        Break("north", "2003", "coding", ratio=1.03, ratio_error=0.01),
    )
    assert held(session, 1).keys() == held(session, 2).keys()
    third = made(session, checked_upload(session, breaks="area,year,kind\n,2002,none\n"))
    (left,) = breaks.listing(session, "saltmarsh", 3)
    assert left.area == "north"
    assert len(breaks.listing(session, "saltmarsh", 2)) == 2
    digests = {edition.digest for edition in (second, third)}
    assert len(digests) == 2
    assert rebuilt(session)


def test_a_note_that_changes_is_new_content(session: Session) -> None:
    first(session, COLUMNS)
    for note in ("census of 2001", "census of 2001, corrected"):
        table = f'area,year,kind,note\n,2002,population,"{note}"\n'
        made(session, checked_upload(session, breaks=table))
    notes = [breaks.listing(session, "saltmarsh", number)[0].note for number in (2, 3)]
    assert notes == ["census of 2001", "census of 2001, corrected"]
    assert rebuilt(session)


def test_breaks_of_a_merged_code_part_the_new_one(session: Session) -> None:
    first(session, COLUMNS)
    made(session, checked_upload(session, breaks="area,year,kind\nnorth,2002,definition\n"))
    made(session, checked_upload(session, areas=MERGED))
    assert [(one.area, one.kind) for one in breaks.listing(session, "saltmarsh", 3)] == [
        ("main", "definition")
    ]
    assert rebuilt(session)


def test_replacing_keeps_no_break_and_no_old_code(session: Session) -> None:
    first(session, COLUMNS)
    made(session, checked_upload(session, breaks="area,year,kind\n,2002,population\n"))
    upload = checked_upload(session, counts_csv(["north", "south"]), areas=MERGED)
    made(session, upload, taking=Taking(gives_way="all"))
    assert codes(session, 3) == {"main"}
    assert breaks.listing(session, "saltmarsh", 3) == ()
    assert rebuilt(session)


def test_an_old_code_without_counts_in_a_year_is_an_error_with_its_row(session: Session) -> None:
    first(session, COLUMNS)
    late = checked_upload(session, counts_csv(["north"], years=(2004,)), areas=MERGED)
    found = {(problem.key, problem.row) for problem in Report.from_json(late.report).errors}
    assert found == {("merged_part_missing", 3)}
    with pytest.raises(Refused, match="2 errors"):
        made(session, late)


def test_a_new_population_alone_leaves_the_deaths_and_their_status(session: Session) -> None:
    deaths = counts_csv(THREE, years=YEARS)
    first_mapping = replace(WHOLE, provisional_years=("2003",))
    made(session, checked_upload(session, deaths, mapping=first_mapping))
    people = replace(WHOLE, deaths="")
    named = replace(BASIS, vintage="after the census of 2001")
    table = counts_csv(THREE, years=YEARS).replace(b",9", b",8")  # a thousand fewer in each row
    upload = checked_upload(session, table, mapping=people, role="population", basis=named)
    report = Report.from_json(upload.report)
    assert report.problems == ()
    assert report.rebased == ("2001", "2002", "2003")
    second = made(session, upload)
    before, after = held(session, 1), held(session, 2)
    assert before.keys() == after.keys()
    for key, cell in before.items():
        same = np.array_equal(after[key].values, cell.values)
        assert same == (key.measure == "deaths")
        if key.measure == "deaths":
            assert after[key].status == cell.status
    status = schedules.contents(session, "saltmarsh", 2).status
    assert {key[2] for key, word in status.items() if word == "provisional"} == {"2003"}
    first_edition = editions.find(session, "saltmarsh", 1)
    assert first_edition is not None
    assert (first_edition.basis.vintage, second.basis.vintage) == ("", named.vintage)
    assert rebuilt(session)


def test_counts_without_a_share_are_refused_and_none_is_lost(session: Session) -> None:
    first(session, COLUMNS)
    late = checked_upload(session, areas="code,becomes,share,counts\nnorth,moor,1,deaths\n")
    found = {problem.key for problem in Report.from_json(late.report).errors}
    assert found == {"counts_without_share"}
    said = Successions(
        (
            Succession(
                "north",
                FIRST,
                LAST,
                ("moor",),
                (Share("moor", "deaths", "", AgeGrid((0,)), (1.0,)),),
            ),
        )
    )
    with pytest.raises(Refused, match="no share is stated for its person_years"):
        recoded(held(session, 1, "north"), said)


@pytest.mark.parametrize(("table", "missed"), [(MERGED, False), ("", True)])
def test_codes_that_became_others_are_not_missed(
    session: Session, table: str, missed: bool
) -> None:
    others = ("cape", "rock", "reef")
    content = counts_csv(("north", "south", *others), years=YEARS)
    made(session, checked_upload(session, content, mapping=WHOLE))
    later = counts_csv(("main", *others), years=(2004,))
    lists = {"areas": table} if table else {}
    upload = checked_upload(session, later, mapping=WHOLE, **lists)  # type: ignore[arg-type]
    found = {problem.key for problem in Report.from_json(upload.report).problems}
    assert ("areas_gone" in found) is missed
    made(session, upload)
    assert "main" in codes(session, 2)
    assert ("north" in codes(session, 2)) is missed
    years = {key.period for key in held(session, 2, "isle")}
    assert years == (set() if missed else {"2001", "2002", "2003", "2004"})


def test_breaks_of_nothing_make_no_edition(session: Session) -> None:
    upload = checked_upload(session, breaks="area,year,kind\n,2002,population\n")
    with pytest.raises(Refused, match="hold no counts"):
        made(session, upload)


@pytest.mark.parametrize(
    ("gives_way", "kept"),
    [
        ("cells", {"2001", "2002", "2003", "2004"}),
        ("handed", {"2001", "2002", "2003", "2004"}),
        ("years", {"2001", "2002", "2003", "2004"}),
        ("areas", {"2004"}),
    ],
)
def test_years_that_merely_move_to_another_code_take_no_place_of_others(
    session: Session, gives_way: str, kept: set[str]
) -> None:
    """What gives way gives way to counts handed in, in the base and in what is made of it."""
    first(session)
    content = counts_csv(("main",), years=(2004,))
    upload = checked_upload(session, content, mapping=WHOLE, areas=MERGED)
    made(session, upload, taking=Taking(gives_way=gives_way))
    after = held(session, 2)
    assert {key.period for key in after if key.area == "cape"} == {"2001", "2002", "2003"}
    assert {key.period for key in after if key.area == "main"} == kept
    for key, cell in held(session, 1, "cape").items():
        assert np.array_equal(after[key].values, cell.values)
    assert rebuilt(session)
