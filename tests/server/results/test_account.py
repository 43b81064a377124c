"""Why a figure moved: the parts add up exactly, and each is what an independent count says."""

import math
from dataclasses import replace
from itertools import count

import numpy as np
import pytest
from hypothesis import HealthCheck, given
from hypothesis import settings as tuned
from hypothesis import strategies as st
from sqlalchemy.orm import Session

from engine import indicators
from engine import settings as named
from engine.ages import AgeGrid
from engine.panel import Panel
from server.accounts.viewer import LOCAL
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.results.account import Account, AccountQuestion, account
from server.results.keys import BadValue, PopulationYear
from server.results.loading import load
from server.store.heading import heading
from server.store.records import Edition
from tests.factories import (
    BASIS,
    COLUMNS,
    NOON,
    checked_upload,
    counts_csv,
    edition,
    gompertz_panel,
    stored_collection,
)

NORTH = PopulationYear("north", "f", "2014")
NUMBERS = count(1)
KEYS = ("e0", "e65", "edagger", "asr_esp2013", "5q0")


def told(
    session: Session,
    at: PopulationYear = NORTH,
    *,
    code: str = "isle",
    number: int = 2,
    **said: str,
) -> Account:
    settings = said.pop("settings", "almanac-1")
    then = said.pop("settings_then", settings)
    since = int(said.pop("since", "0"))
    question = AccountQuestion(at, since, said.pop("of", "e0"), "released", settings, then, **said)
    return account(session, heading(session, code, number), question)


def value(panel: Panel, key: str = "e0", settings: str = "almanac-1") -> float:
    return float(indicators.estimate(indicators.find(key), panel, named.find(settings)).value)


def mixed(deaths: Panel, exposure: Panel) -> Panel:
    """One's deaths with the other's person-years."""
    return replace(deaths, exposure=exposure.exposure)


def counted(level: float, people: float = 500_000) -> Panel:
    """Numbers that the store keeps as they are."""
    return gompertz_panel(level=level, people=people).over(lambda array: np.round(array, 3))


THEN = counted(2.6e-5)
NOW = counted(2.4e-5, 480_000)


def test_deaths_and_population_take_the_mean_of_both_directions(session: Session) -> None:
    edition(session, {"north.f.2014": THEN})
    edition(session, {"north.f.2014": NOW})
    found = told(session)
    assert found.parts == ("deaths", "population")
    assert (found.before, found.after) == (value(THEN), value(NOW))
    assert found.shares is not None
    first = value(mixed(NOW, THEN)) - value(THEN)
    second = value(NOW) - value(mixed(THEN, NOW))
    assert found.shares.amounts["deaths"] == pytest.approx((first + second) / 2, abs=1e-12)
    assert sum(found.shares.amounts.values()) == pytest.approx(found.difference, abs=1e-12)


@tuned(max_examples=8, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    levels=st.tuples(*[st.floats(1.5e-5, 4e-5)] * 3),
    people=st.tuples(*[st.sampled_from((2e5, 2.1e5, 3e5))] * 2),
    key=st.sampled_from(KEYS),
    settings=st.sampled_from(("almanac-1", "almanac-1-kannisto", "almanac-1-coale-demeny")),
    sex=st.sampled_from("fp"),
)
def test_the_parts_add_up_whatever_moved(
    session: Session,
    levels: tuple[float, float, float],
    people: tuple[float, float],
    key: str,
    settings: str,
    sex: str,
) -> None:
    name = f"c{next(NUMBERS)}"
    for level, persons in zip(levels, people, strict=False):
        panels = {
            f"north.{one}.2014": mixed(
                gompertz_panel(sex=one, level=level * by), gompertz_panel(people=persons)
            )
            for one, by in (("f", 1.0), ("m", 1.4))
        }
        edition(session, panels, code=name)
    at = replace(NORTH, sex=sex)
    found = told(session, at, code=name, of=key, settings=settings, settings_then="almanac-1")
    loaded = [load(session, name, number, [at])[at].panel for number in (1, 2)]
    np.testing.assert_equal(found.before, value(loaded[0], key, "almanac-1"))
    np.testing.assert_equal(found.after, value(loaded[1], key, settings))  # or neither has one
    if found.shares is None:
        assert math.isnan(found.difference)
        return
    assert ("settings" in found.parts) == (settings != "almanac-1")
    assert ("population" in found.parts) == (people[0] != people[1])
    amounts = found.shares.amounts
    np.testing.assert_allclose(math.fsum(amounts.values()), found.difference, atol=1e-12)
    assert set(amounts) == set(found.parts)


def test_settings_alone_within_one_edition(session: Session) -> None:
    edition(session, {"north.f.2014": THEN})
    found = told(session, number=1, settings="almanac-1-kannisto", settings_then="almanac-1")
    assert found.parts == ("settings",)
    assert found.shares is not None
    wanted = value(THEN, settings="almanac-1-kannisto") - value(THEN)
    assert found.shares.amounts == {"settings": pytest.approx(wanted, abs=1e-12)}


def test_nothing_moved_where_nothing_differs(session: Session) -> None:
    edition(session, {"north.f.2014": THEN})
    edition(session, {"cape.f.2014": NOW})
    found = told(session)
    assert (found.parts, found.difference) == ((), 0.0)
    assert found.shares is not None
    assert found.shares.amounts == {}


def test_years_added_up_move_with_any_of_them(session: Session) -> None:
    years = {f"north.f.{year}": gompertz_panel(level=2.5e-5) for year in (2012, 2013, 2014)}
    edition(session, years)
    edition(session, {"north.f.2012": gompertz_panel(level=2.9e-5, people=500_000)})
    found = told(session, settings="almanac-1-3-years")
    assert "deaths" in found.parts
    assert found.difference < -0.1
    assert told(session).parts == ()


def test_a_printed_value_leaves_the_rest_to_engine_or_rounding(session: Session) -> None:
    edition(session, {"north.f.2014": THEN})
    edition(session, {"north.f.2014": NOW})
    kept = f"{value(THEN):.1f}"
    found = told(session, printed=kept)
    assert found.shares is not None
    assert found.astray == pytest.approx(value(THEN) - float(kept), abs=1e-12)
    assert abs(found.astray) <= 0.05
    total = found.astray + math.fsum(found.shares.amounts.values())
    assert total == pytest.approx(found.after - float(kept), abs=1e-12)


def test_an_edition_that_did_not_hold_it_gives_no_parts(session: Session) -> None:
    edition(session, {"cape.f.2014": THEN})
    edition(session, {"north.f.2014": NOW})
    found = told(session)
    assert math.isnan(found.before)
    assert found.shares is None


def test_another_whole_and_its_parts_are_the_make_up_of_the_area(session: Session) -> None:
    """A third part joins the whole: its counts are in the make-up, not in deaths or population."""
    parents = {"north": "isle", "cape": "isle"}
    parts = {
        f"{area}.f.2014": counted(level)
        for area, level in (("north", 2.4e-5), ("cape", 2.6e-5), ("rock", 3.6e-5))
    }
    edition(session, parts, parents=parents)  # the rock stands beside the isle
    edition(session, {"rock.f.2014": parts["rock.f.2014"]}, parents=parents | {"rock": "isle"})
    found = told(session, PopulationYear("isle", "f", "2014"))
    assert found.parts == ("areas",)
    assert found.shares is not None
    everyone = Panel.pooled([parts[f"{area}.f.2014"] for area in ("cape", "north", "rock")])
    two = Panel.pooled([parts[f"{area}.f.2014"] for area in ("cape", "north")])
    wanted = value(everyone) - value(two)
    assert found.shares.amounts == {"areas": pytest.approx(wanted, abs=1e-9)}


def commit(session: Session, *files: tuple[str, bytes], **mapping: object) -> Edition:
    """An edition of small counts, so that every figure is large enough for a table."""
    upload = receive_upload(
        session,
        collection="saltmarsh",
        files=[(role, f"{role}.csv", content) for role, content in files],
        by=LOCAL,
        now=NOON,
    )
    said = {
        role: replace(COLUMNS, **mapping) if role == "counts" else replace(COLUMNS)  # type: ignore[arg-type]
        for role, _content in files
    }
    map_upload(session, upload_id=upload.id, mappings=said, basis=BASIS, by=LOCAL, now=NOON)
    check_upload(session, upload_id=upload.id)
    return commit_upload(session, upload_id=upload.id, note="n", by=LOCAL, now=NOON)


def test_the_same_bytes_read_otherwise_are_the_reading(session: Session) -> None:
    """Women's and men's codes were exchanged: nobody counted anything anew."""
    stored_collection(session)
    content = counts_csv()
    commit(session, ("counts", content))
    commit(session, ("counts", content), sex_codes=(("f", "m"), ("m", "f")))
    at = PopulationYear("north", "f", "2001")
    found = told(session, at, code="saltmarsh", of="cdr")
    assert found.parts == ("reading",)
    assert found.shares is not None
    assert found.shares.amounts == {"reading": pytest.approx(found.difference, rel=1e-12)}
    assert found.difference != 0
    other = checked_upload(session, counts_csv(times=2))
    commit_upload(session, upload_id=other.id, note="n", by=LOCAL, now=NOON)
    after = told(session, at, code="saltmarsh", of="cdr", number=3)
    assert after.parts == ("deaths", "reading")  # the population only is read as at first again


def test_a_merged_area_was_made_up_of_other_codes(session: Session) -> None:
    """The south becomes part of the north, and all deaths are doubled besides."""
    stored_collection(session)
    commit(session, ("counts", counts_csv()))
    areas = b"code,becomes\nsouth,north\nnorth,north\n"
    commit(session, ("counts", counts_csv(times=2)), ("areas", areas))
    at = PopulationYear("north", "f", "2001")
    found = told(session, at, code="saltmarsh", of="cdr")
    assert found.parts == ("deaths", "areas")
    assert found.shares is not None
    panels = {(area, times): _panel(times, area) for area in ("north", "south") for times in (1, 2)}
    one = value(panels["north", 1], "cdr")
    merged = value(Panel.pooled([panels["north", 1], panels["south", 1]]), "cdr")
    after = value(Panel.pooled([panels["north", 2], panels["south", 2]]), "cdr")
    assert (found.before, found.after) == (pytest.approx(one), pytest.approx(after))
    assert found.shares.amounts["deaths"] == pytest.approx(after - merged, rel=1e-9)
    assert found.shares.amounts["areas"] == pytest.approx(merged - one, rel=1e-9)
    assert found.shares.orders < found.shares.all_orders  # the later counts know no south


def _panel(times: int, area: str) -> Panel:
    rows = [line.split(",") for line in counts_csv(times=times).decode().splitlines()[1:]]
    own = [row for row in rows if (row[0], row[1], row[3]) == ("2001", "f", area)]
    deaths, people = (np.array([float(row[at]) for row in own]) for at in (4, 5))
    return Panel.of(AgeGrid((0, 1, 5, 10)), deaths, people, sex="f")


@pytest.mark.parametrize("text", ["many", "nan", "1e999", "1" * 40])
def test_a_printed_value_that_is_no_number_is_refused(text: str) -> None:
    with pytest.raises(BadValue, match="it takes a number"):
        AccountQuestion.parse([("at", "north.f.2014"), ("printed", text)])


def test_an_address_spells_every_choice() -> None:
    short = AccountQuestion.parse([("at", "north.f.2014"), ("settings", "almanac-2")])
    assert short.canonical() == (
        "of=e0&at=north.f.2014&since=0&figures=released&settings=almanac-2&settings_then=almanac-2"
    )
