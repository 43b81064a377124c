"""Figures of causes against the engine asked for each by itself; targets; errors of ratios."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.causes.counts import CauseCounts
from engine.causes.targets import chance_30_to_70, crude_rate
from engine.indicators import estimates, find
from engine.settings import SETTINGS
from server.intake.causes.lists import CHAPTERS, SHORT
from server.results.cause_course import wider
from server.results.cause_figures import CauseFigures, cause_figures
from server.results.causes import CauseChoice
from server.results.questions import CausesQuestion, PopulationYear
from server.results.targets import TARGETS, matched, reached
from server.store.connect import Session
from server.store.heading import heading
from server.store.records import Break, Cause
from tests.factories import edition, gompertz_panel, parted

LEAVES = tuple(one for one in SHORT if one.code not in {other.parent for other in SHORT})
PLAIN = SETTINGS["almanac-1"]


@pytest.fixture
def isle(session: Session) -> Session:
    panels, counts = {}, {}
    for seed, year in enumerate(("2012", "2013", "2014")):
        for sex in "fm":
            name = f"north.{sex}.{year}"
            panels[name] = gompertz_panel(sex=sex, seed=seed, people=4e5)
            own = parted(panels[name], len(LEAVES), seed=seed).deaths
            counts[name] = {one.code: own[at] for at, one in enumerate(LEAVES)}
    edition(
        session,
        panels,
        causes=SHORT,
        by_cause=counts,
        breaks=(Break("", "2013", "coding", "dementia", "", 1.5, 0.1),),
    )
    return session


def figures(session: Session, of: str = "north.m.2012", **keys: object) -> CauseFigures:
    question = CausesQuestion(PopulationYear.parse(of), **keys)  # type: ignore[arg-type]
    return cause_figures(session, heading(session, "isle", 1), question.completed())


def test_a_cause_has_the_rates_of_its_deaths_alone(isle: Session) -> None:
    found = figures(isle, causes=CauseChoice("causes"))
    rates = [find(key) for key in ("cdr", "asr_esp2013", "yll75")]
    for at, one in enumerate(found.causes[:6]):
        panel = replace(found.panel, deaths=found.held.counts.deaths[at], whole=None)
        for key, expected in estimates(rates, panel, PLAIN).items():
            got = found.estimates[key][at]
            assert_allclose(
                (got.value, got.low, got.high),
                (expected.value, expected.low, expected.high),
                rtol=1e-12,
                err_msg=f"{one.code} {key}",
            )


def test_groups_are_the_sums_of_their_causes(isle: Session) -> None:
    groups, each = figures(isle), figures(isle, causes=CauseChoice("causes"))
    for key in ("chance", "edagger", "H", "cdr", "asr_esp2013"):
        parts = dict.fromkeys([one.code for one in groups.causes], 0.0)
        for at, cause in enumerate(each.causes):
            parts[cause.parent or cause.code] += float(each.estimates[key].value[at])
        own = {one.code: groups.estimates[key].value[at] for at, one in enumerate(groups.causes)}
        known = [code for code in own if np.isfinite(own[code]) and np.isfinite(parts[code])]
        assert len(known) > 5
        assert_allclose([own[code] for code in known], [parts[code] for code in known], rtol=1e-9)


def test_the_order_is_by_what_causes_cost_and_leading_ones_are_known(isle: Session) -> None:
    found = figures(isle)
    lost = found.estimates["edagger"].value
    assert list(found.order) == sorted(found.order, key=lambda at: -lost[at])
    assert {found.causes[at].kind for at in found.leading} <= {
        "natural", "external", "undetermined",
    }  # fmt: skip
    assert set(found.order) - set(found.leading)


def test_errors_of_ratios_widen_intervals(isle: Session) -> None:
    kept = figures(isle, causes=CauseChoice("causes"))
    applied = figures(isle, causes=CauseChoice("causes", ratios="applied"))
    at = [one.code for one in kept.causes].index("dementia")
    for key in ("cdr", "edagger", "chance"):
        one, other = kept.estimates[key][at], applied.estimates[key][at]
        assert_allclose(other.value, 1.5 * one.value, rtol=0.2)
        assert other.se**2 > (1.5 * one.se) ** 2 / 2 + (0.9 * 0.1 / 1.5 * other.value) ** 2
    after = figures(isle, "north.m.2014", causes=CauseChoice("causes", ratios="applied"))
    plain = figures(isle, "north.m.2014", causes=CauseChoice("causes"))
    assert_allclose(after.estimates["cdr"].low, plain.estimates["cdr"].low, rtol=1e-12)


def test_one_more_error_adds_by_squares() -> None:
    one = estimates([find("cdr")], gompertz_panel(seed=1), PLAIN)["cdr"]
    error = np.asarray(2 * one.se)
    found = wider(one, error, 0.95)
    assert_allclose(found.se, np.sqrt(5) * one.se)
    assert_allclose(one.value - found.low, np.hypot(one.value - one.low, 1.959964 * error), 1e-6)
    assert wider(one, np.zeros(()), 0.95).low == one.low
    assert wider(one, np.asarray(one.value), 0.95).low == 0  # no rate lies below
    below = replace(one, low=np.asarray(-one.value))
    assert wider(below, error, 0.95).low < below.low


def test_targets_count_the_causes_of_their_codes(isle: Session) -> None:
    found = figures(isle)
    rows = {one.target.key: one for one in found.targets}
    leaves = {one.code: at for at, one in enumerate(found.leaves.list)}
    suicide = [leaves["suicide"]]
    chronic = [
        leaves[one.code]
        for one in LEAVES
        if one.parent == "circulatory"
        or (one.code.startswith("cancer"))
        or one.code in ("diabetes", "lungs-chronic", "respiratory-other")
    ]
    for key, places, figure in (
        ("suicide", suicide, crude_rate),
        ("ncd", chronic, chance_30_to_70),
    ):
        own = CauseCounts(found.leaves.counts.deaths[places])
        expected = figure(found.panel, own, PLAIN)
        got = rows[key].estimate
        assert got is not None
        assert_allclose((got.value, got.low), (expected.value, expected.low), rtol=1e-12)


def test_a_list_that_mixes_codes_gives_no_figure() -> None:
    panel = gompertz_panel(seed=1)
    counts = parted(panel, len(CHAPTERS))
    found = {one.target.key: one for one in reached(panel, counts, CHAPTERS, PLAIN)}
    assert all(one.estimate is None for one in found.values())
    assert {one.code for one in found["ncd"].mixed} == {"tumours", "metabolism", "breathing"}
    assert {one.code for one in found["suicide"].mixed} == {"external"}


def test_the_finer_of_two_ranges_holds_a_code() -> None:
    own = Cause("own", "", ranges=("X60-X84", "Y87.0"))
    rest = Cause("rest", "", ranges=("Y35-Y89",))
    codes = next(one.codes for one in TARGETS if one.key == "suicide")
    assert matched((own, rest), codes) == ((0,), ())
    assert matched((rest,), codes) == ((), (rest,))
    assert matched((Cause("part", "", ranges=("X60",)), rest), codes) == ((0,), (rest,))
    assert matched((Cause("other", "", ranges=("I60-I69",)),), codes) == ((), ())


def test_a_cause_within_a_group_is_that_of_its_parts(session: Session) -> None:
    """A list of three steps: the middle one is followed, and counted as avoidable, with its parts;
    a break in the coding of the whole is one in that of the part."""
    tree = (
        Cause("body", "Body"),
        Cause("heart", "Heart", "body"),
        Cause("attack", "Heart attack", "heart", ("I21",)),
        Cause("valve", "Heart valves", "heart", ("I34",)),
        Cause("lung", "Lung", "body", ("J00",)),
    )
    panels = {f"north.f.{year}": gompertz_panel(seed=year) for year in (2012, 2013)}
    own = {name: parted(panel, 3).deaths for name, panel in panels.items()}
    counts = {
        name: dict(zip(("attack", "valve", "lung"), deaths, strict=True))
        for name, deaths in own.items()
    }
    coded = (Break("", "2013", "coding", "body"), Break("", "2013", "coding", "lung"))
    edition(session, panels, causes=tree, by_cause=counts, breaks=coded)
    found = figures(session, "north.f.2012", cause="heart", avoidable=("heart",))
    here, young = own["north.f.2012"][:2], np.array(found.panel.grid.starts) < 75
    assert found.avoidable is not None
    assert [one.code for one in found.avoidable.causes] == ["attack", "valve"]
    assert_allclose(found.avoidable.deaths, here[:, young].sum())
    assert found.course is not None
    assert_allclose(found.course.deaths[0], here.sum())
    assert [one.cause for one in found.course.breaks] == ["body"]
