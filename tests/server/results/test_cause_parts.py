"""Contributions by age and cause of two populations as a page has them."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine import decomposition, indicators
from engine.ages import AgeGrid, Array
from engine.causes.counts import CauseCounts
from engine.panel import Panel
from engine.settings import find
from server.results.cause_parts import CausePair, CauseParts, Years, cause_parts, side_by_side
from server.results.causes import NOT_STATED, Causes
from server.results.loading import Loaded
from server.store.records import Break, Cause
from tests.factories import GRIDS, cause_list, gompertz_panel, parted

FIVE = GRIDS["abridged"]
PLAIN = find("almanac-1")
E0 = indicators.find("e0")
THIS = gompertz_panel(people=2e6, seed=1, level=2.4e-5)
THAT = gompertz_panel(people=2e6, seed=2)
LIST = cause_list(4)
Z95 = 1.959963984540054


def side(
    panel: Panel, counts: CauseCounts, listed: tuple[Cause, ...] = LIST, **more: object
) -> Loaded:
    return Loaded(panel, "final", causes=Causes(listed, counts, **more))  # type: ignore[arg-type]


def paired(
    ours: Loaded, theirs: Loaded, shared: Loaded | None = None, grid: AgeGrid = FIVE
) -> CausePair:
    found = side_by_side(ours, theirs, shared, grid)
    assert found is not None
    return found


def parts(pair: CausePair, years: Years | None = None, groups: AgeGrid = FIVE) -> CauseParts:
    return cause_parts(E0, THIS, THAT, pair, groups, years, PLAIN, by_chance=True)


HERE, THERE = side(THIS, parted(THIS, 4, seed=3)), side(THAT, parted(THAT, 4, seed=4))


def test_cells_causes_and_ages_add_up() -> None:
    found = parts(paired(HERE, THERE), groups=AgeGrid((0, 15, 30, 60, 80)))
    ages = decomposition.contributions(E0, THIS, THAT, PLAIN)
    assert_allclose(found.by_group.sum() + found.remainder, found.difference, rtol=1e-12)
    by_group = FIVE.regroup(ages.by_age, AgeGrid((0, 15, 30, 60, 80)))
    assert_allclose(found.by_group.sum(axis=0), by_group, atol=1e-12)
    assert_allclose(found.by_cause, found.by_group.sum(axis=1))
    assert np.all(found.low < found.by_group)
    assert np.all(found.by_group < found.high)


def test_limits_are_the_engines_for_cells_and_for_sums() -> None:
    pair = paired(HERE, THERE)
    found = parts(pair)
    for groups, low, high in (
        (FIVE, found.low, found.high),
        (AgeGrid((0,)), found.cause_low[:, None], found.cause_high[:, None]),
    ):
        ends = decomposition.contribution_limits(
            E0, THIS, THAT, PLAIN, causes=pair.deaths, groups=groups
        )
        assert_allclose(low, ends.low)
        assert_allclose(high, ends.high)


def test_a_cause_that_one_list_lacks_has_no_deaths_there_and_not_stated_comes_last() -> None:
    three = CauseCounts(
        np.concatenate(
            [THERE.causes.counts.deaths[:2], THERE.causes.counts.deaths[2:].sum(0)[None]]
        )  # type: ignore[union-attr]
    )
    found = paired(HERE, side(THAT, three, (LIST[1], LIST[0], NOT_STATED)))
    assert [one.code for one in found.list] == [*(one.code for one in LIST), NOT_STATED.code]
    assert_allclose(found.that.deaths[0], three.deaths[1])
    assert_allclose(found.that.deaths[2:4], 0)
    assert_allclose(found.this.deaths[4], 0)
    total = parts(found)
    assert_allclose(total.by_group.sum() + total.remainder, total.difference, rtol=1e-12)


def test_causes_that_stand_for_other_codes_are_not_set_side_by_side() -> None:
    other = (replace(LIST[0], ranges=("Z00-Z99",)), *LIST[1:])
    assert side_by_side(HERE, side(THAT, parted(THAT, 4), other), None, FIVE) is None
    assert side_by_side(HERE, Loaded(THAT, "final"), None, FIVE) is None
    named = (replace(LIST[0], label="The same by another name"), *LIST[1:])
    assert side_by_side(HERE, side(THAT, parted(THAT, 4), named), None, FIVE) is not None


def test_deaths_in_both_count_once() -> None:
    """North lies in the isle: the difference of a cause is known better than of two apart."""
    north, rest = HERE.causes.counts.deaths, THERE.causes.counts.deaths  # type: ignore[union-attr]
    whole = Panel.of(FIVE, THIS.deaths + THAT.deaths, THIS.exposure + THAT.exposure, sex="f")
    isle = side(whole, CauseCounts(north + rest))
    once = cause_parts(E0, THIS, whole, paired(HERE, isle, HERE), FIVE, None, PLAIN, by_chance=True)
    twice = cause_parts(E0, THIS, whole, paired(HERE, isle), FIVE, None, PLAIN, by_chance=True)
    assert_allclose(once.by_cause, twice.by_cause)
    assert np.all(once.cause_high - once.cause_low < 0.75 * (twice.cause_high - twice.cause_low))


def test_a_revision_has_no_limits() -> None:
    found = cause_parts(E0, THIS, THAT, paired(HERE, THERE), FIVE, None, PLAIN, by_chance=False)
    assert np.isnan(found.low).all()
    assert np.isnan(found.cause_high).all()
    assert np.isfinite(found.by_group).all()


def test_the_error_of_a_ratio_that_both_sides_share_widens_the_limits() -> None:
    """A tenth of one cause of that side’s deaths is moved to another; how much, is not known for
    sure. Beside chance the limits hold what that moves, of the two causes and no other."""

    def moved(panel: Panel, share: float) -> Array:
        shift = np.zeros((1, 4, len(FIVE)))
        shift[0, 0], shift[0, 1] = share * panel.deaths, -share * panel.deaths
        return shift

    stated = (Break("", "2011", "coding", "cause-a", ratio=1.1, ratio_error=0.02),)
    ours, theirs = (
        side(panel, parted(panel, 4, seed=seed), ratios=stated, shifts=moved(panel, share))
        for panel, seed, share in ((THIS, 3, 0.0), (THAT, 4, 0.02))
    )
    plain, found = parts(paired(HERE, THERE)), parts(paired(ours, theirs))
    assert found.ratios == stated
    assert_allclose(found.by_group, plain.by_group)
    slope = decomposition.contributions(E0, THIS, THAT, PLAIN).by_age
    steps = THIS.deaths / THIS.exposure - THAT.deaths / THAT.exposure
    out = Z95 * abs((-slope / steps * 0.02 * THAT.deaths / THAT.exposure).sum())
    for cause in (0, 1):
        below = plain.by_cause[cause] - plain.cause_low[cause]
        assert_allclose(
            found.by_cause[cause] - found.cause_low[cause], np.hypot(below, out), rtol=1e-6
        )
    assert_allclose(found.cause_low[2:], plain.cause_low[2:])


def test_ratios_of_two_collections_err_each_by_itself() -> None:
    """Were their errors taken for one, they would cancel out where both sides are moved alike."""
    one = Break("", "2011", "coding", "cause-a", ratio=1.1, ratio_error=0.02)
    other = Break("", "2013", "coding", "cause-a", ratio=1.3, ratio_error=0.02)
    shift = np.zeros((1, 4, len(FIVE)))
    shift[0, 0], shift[0, 1] = 5.0, -5.0

    def found(*ratios: Break | None) -> CausePair:
        sides = (
            side(panel, parted(panel, 4, seed=seed), ratios=(ratio,), shifts=shift)
            if ratio
            else side(panel, parted(panel, 4, seed=seed))
            for panel, seed, ratio in zip((THIS, THAT), (3, 4), ratios, strict=True)
        )
        return paired(*sides)

    same, apart, alone = found(one, one), found(one, other), found(one, None)
    assert same.ratios == (one,)
    assert apart.ratios == (one, other)
    assert [[bool(moved.any()) for moved in both] for both in apart.shifts] == [
        [True, False],
        [False, True],
    ]
    wide = {
        name: parts(pair).cause_high[0] - parts(pair).by_cause[0]
        for name, pair in (("same", same), ("apart", apart), ("alone", alone))
    }
    none = parts(paired(HERE, THERE))
    assert wide["alone"] > none.cause_high[0] - none.by_cause[0]
    assert wide["apart"] > wide["alone"]
    assert wide["apart"] > wide["same"]


def test_causes_through_the_years_add_up_and_need_every_year() -> None:
    middle = gompertz_panel(people=2e6, seed=5, level=2.2e-5)
    between = side(middle, parted(middle, 4, seed=6))
    years = (THERE, between, HERE)
    panel = Panel.stack([one.panel for one in years])
    found = parts(paired(HERE, THERE), Years.of(panel, years))
    assert found.path is not None
    assert_allclose(found.path.sum() + found.remainder, found.difference, rtol=1e-9)
    assert not np.allclose(found.path, found.by_cause, atol=1e-6)
    assert Years.of(panel, (THERE, Loaded(middle, "final"), HERE)).causes is None


@pytest.mark.parametrize("share", [0.0, 0.3])
def test_deaths_moved_to_a_cause_leave_chance_with_those_counted(share: float) -> None:
    """Ill-defined deaths, counted in the last row, are spread over the others: the fewer of a
    cause's deaths were counted as its own, the wider its limits."""
    sides = []
    for panel, seed in ((THIS, 3), (THAT, 4)):
        counted = parted(panel, 4, seed=seed).deaths.copy()
        moved = share * counted[:3]
        counted[:3] -= moved
        counted[3] += moved.sum(axis=0)
        spread = counted.copy()
        others = counted[:3].sum(axis=0)
        spread[:3] += np.divide(
            counted[:3] * counted[3], others, out=np.zeros_like(counted[:3]), where=others > 0
        )
        spread[3] = np.where(others > 0, 0.0, counted[3])
        sides.append(side(panel, CauseCounts(spread, counted)))
    pair = paired(*sides)
    assert pair.counted is not None
    found = parts(pair)
    bare = parts(
        paired(*(side(one.panel, CauseCounts(one.causes.counts.deaths)) for one in sides))  # type: ignore[union-attr]
    )
    assert_allclose(found.by_group, bare.by_group)
    wider = (found.cause_high - found.cause_low)[:3] / (bare.cause_high - bare.cause_low)[:3]
    assert np.all(wider > 1)
    if share:
        assert np.all(wider > 1.05)
