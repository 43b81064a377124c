"""Gaps to a benchmark: what they are, which are named, and what chance alone would show."""

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from scipy.stats import binomtest

from engine.ages import Array
from engine.chain import gradient, run
from engine.gaps import (
    Counted,
    Sides,
    alike,
    among_first,
    by_chance,
    chosen,
    clear,
    excess,
    surplus,
    to_first_order,
)
from engine.indicators import find
from engine.panel import Panel
from engine.settings import find as settings
from tests.factories import GRIDS, gompertz_panel

ALMANAC, E0 = settings("almanac-1"), find("e0")
FIVE = GRIDS["abridged"]
PARTS = np.array([0.5, 0.3, 0.2])


def isles(count: int, *, seed: int, people: float = 2e5, better: Array | None = None) -> Panel:
    """Areas of one size; all alike, but for the factor on their rates."""
    one = gompertz_panel(people=people)
    times = np.ones((count, len(FIVE))) if better is None else better
    rng = np.random.default_rng(seed)
    lived = np.broadcast_to(one.exposure, times.shape)
    return Panel.of(FIVE, rng.poisson(one.deaths * times).astype(float), lived, sex="f")


def counted(panel: Panel, seed: int = 0) -> Counted:
    """The deaths of areas dealt to three causes."""
    rng = np.random.default_rng(seed)
    dealt = rng.multinomial(panel.deaths.astype(int), PARTS)
    return Counted(np.moveaxis(dealt, -1, -2).astype(float), panel.exposure)


def nobody(like: Counted) -> Counted:
    return Counted(np.zeros_like(like.deaths), np.zeros_like(like.exposure))


def sides_of(own: Counted, member: np.ndarray) -> Sides:
    """Each of the areas beside those of the benchmark together."""
    pooled = Counted(own.deaths[member].sum(axis=0), own.exposure[member].sum(axis=0))
    benchmark = Counted(
        np.broadcast_to(pooled.deaths, own.deaths.shape),
        np.broadcast_to(pooled.exposure, own.exposure.shape),
    )
    inside = member[:, None, None]
    both = Counted(np.where(inside, own.deaths, 0.0), np.where(inside[..., 0], own.exposure, 0.0))
    return Sides.of(own, benchmark, both)


def named_among(count: int, seed: int) -> np.ndarray:
    """Which cells of identical areas are named: benchmark chosen on another year."""
    before, now = isles(count, seed=seed), isles(count, seed=seed + 1000)
    length = run(before, ALMANAC).table.ex[:, 0]
    member = chosen(length, before.exposure.sum(axis=-1), 1e5)
    assert member.sum() == -(-count // 3)
    return clear(by_chance(sides_of(counted(now, seed), member)), 0.95)


def test_among_forty_identical_areas_no_gain_is_worth_naming() -> None:
    assert not named_among(40, 11).any()


def test_and_seldom_in_any_other_forty() -> None:
    """With the chance 5 % something is named at all: in 60 worlds, seldom more than six times."""
    some = [bool(named_among(40, seed).any()) for seed in range(60)]
    assert sum(some) <= 6


def test_deaths_that_stand_for_others_name_no_more() -> None:
    """Each one counted stands for two: chance is in half of the deaths, and names as much."""
    member = np.arange(40) < 13
    sides = sides_of(counted(isles(40, seed=11)), member)
    twice = Sides(
        *(
            Counted(2 * one.deaths, one.exposure, one.deaths)
            for one in (sides.alone, sides.others, sides.both)
        )
    )
    assert_allclose(twice.own.worth[twice.own.counts > 0], 2.0)
    assert_allclose(by_chance(twice), by_chance(sides), rtol=1e-9)
    assert not clear(by_chance(twice), 0.95).any()
    as_counted = Sides(
        *(Counted(one.deaths, one.exposure) for one in (twice.alone, twice.others, twice.both))
    )
    assert clear(by_chance(as_counted), 0.95).any()


def test_deaths_given_to_other_causes_are_no_gap() -> None:
    """Counted under a cause, and all given to others: as if none had been; another area kept them,
    and where nobody is counted in one of the two each stands for what it does in the other."""
    gone = Counted(np.array([[0.0, 0.0]]), np.array([100.0, 100.0]), np.array([[5.0, 0.0]]))
    kept = Counted(np.array([[4.0, 6.0]]), np.array([900.0, 900.0]), np.array([[4.0, 3.0]]))
    assert_array_equal(surplus(gone, kept), [[1.0, 1.0]])
    assert_allclose(surplus(kept, gone)[0], [0.9**4, 0.9**3])
    sides = Sides(gone, kept, nobody(gone))
    found = alike(sides, kept.rates, np.array([-100.0, -50.0]), np.array(["a", "b", "c"]))
    assert np.isfinite(found.expected).all()
    assert (found.expected > 0).all()


def test_gains_drawn_anew_have_the_chance_of_those_counted() -> None:
    """Half as many counted for the same deaths: the gaps of chance are wider by the root of 2."""
    own = Counted(np.array([[800.0]]), np.array([2e4]))
    other = Counted(np.array([[8000.0]]), np.array([2e5]))
    half = (Counted(one.deaths, one.exposure, one.deaths / 2) for one in (own, other))
    slopes, names = np.array([-100.0]), np.array(["a", "b", "c"])
    plain = alike(Sides(own, other, nobody(own)), other.rates, slopes, names)
    wider = alike(Sides(*half, nobody(own)), other.rates, slopes, names)
    assert_allclose(wider.expected / plain.expected, np.sqrt(2), rtol=0.15)


def test_a_gap_that_is_there_is_named_and_no_other_area() -> None:
    worse = np.ones((40, len(FIVE)))
    worse[7, 8:13] = 1.6
    now = counted(isles(40, seed=6, people=2e6, better=worse))
    member = np.arange(40) < 10
    member[7] = False
    named = clear(by_chance(sides_of(now, member)), 0.95)
    assert named[7, 0, 8:13].sum() >= 3
    assert named.sum() - named[7].sum() == 0


def test_the_benchmark_are_the_large_that_live_longest_whatever_their_order() -> None:
    value = np.array([80.0, 83.0, 82.0, np.nan, 81.0, 99.0, 79.0, 78.0, 77.0])
    lived = np.array([9.0, 9, 9, 9, 9, 1, 9, 9, 9])
    taken = chosen(value, lived, 5.0)
    assert_array_equal(np.flatnonzero(taken), [1, 2, 4])
    order = np.random.default_rng(1).permutation(9)
    assert_array_equal(chosen(value[order], lived[order], 5.0), taken[order])
    assert_array_equal(chosen(np.full(4, 80.0), np.full(4, 9.0), 5.0), [True] * 4)
    assert not chosen(value, lived, 50.0).any()
    for areas in range(1, 31):  # a third, rounded up
        taken = chosen(np.arange(float(areas)), np.full(areas, 9.0), 5.0)
        assert taken.sum() == -(-areas // 3)
        assert taken[-1]


@pytest.mark.parametrize(
    ("d", "n", "other", "m"), [(7, 100, 30, 900), (0, 10, 3, 10), (4, 9, 0, 1)]
)
def test_the_chance_of_a_surplus_is_that_of_a_binomial_count(
    d: int, n: int, other: int, m: int
) -> None:
    ours = Counted(np.array([[float(d)]]), np.array([float(n)]))
    theirs = Counted(np.array([[float(other)]]), np.array([float(m)]))
    right = binomtest(d, d + other, n / (n + m), alternative="greater").pvalue
    assert_allclose(surplus(ours, theirs)[0, 0], right, rtol=1e-10)


def test_what_each_one_counted_stands_for_may_differ_between_the_two() -> None:
    ours = Counted(np.array([[14.0]]), np.array([100.0]), np.array([[7.0]]))
    theirs = Counted(np.array([[45.0]]), np.array([900.0]), np.array([[30.0]]))
    right = binomtest(7, 37, 50 / (50 + 600), alternative="greater").pvalue
    assert_allclose(surplus(ours, theirs)[0, 0], right, rtol=1e-10)
    both = ours.plus(theirs)
    assert_allclose([both.deaths[0, 0], both.counts[0, 0]], [59.0, 37.0])
    assert_allclose(both.less(ours).counts, theirs.counts)


def test_named_are_those_that_holm_names() -> None:
    chance = np.random.default_rng(3).beta(0.2, 1.5, (6, 3, 21))
    named = clear(chance, 0.95)
    left, taken = sorted(chance.ravel().tolist()), 0
    while left and left[0] * len(left) <= 0.05:  # the smallest times how many are left
        left.pop(0)
        taken += 1
    assert 0 < taken < named.size
    assert named.sum() == taken
    assert chance[named].max() < chance[~named].min()
    assert clear(np.array([1e-9, 0.01, 0.03]), 0.95).all()


def test_an_area_of_the_benchmark_is_set_against_the_others() -> None:
    now = counted(isles(8, seed=3))
    member = np.arange(8) < 3
    sides = sides_of(now, member)
    rest = Counted(now.deaths[1:3].sum(axis=0), now.exposure[1:3].sum(axis=0))
    own = Counted(now.deaths[0], now.exposure[0])
    assert_allclose(by_chance(sides)[0], surplus(own, rest))
    assert_allclose(sides.own.deaths, now.deaths)
    assert_allclose(sides.benchmark.deaths[5], now.deaths[:3].sum(axis=0))


def test_a_whole_is_set_against_its_part_without_it_and_a_benchmark_not_against_itself() -> None:
    now = counted(isles(3, seed=3))
    part = Counted(now.deaths[:1], now.exposure[:1])
    whole = Counted(now.deaths.sum(axis=0)[None], now.exposure.sum(axis=0)[None])
    sides = Sides.of(whole, part, part)
    rest = Counted(now.deaths[1:].sum(axis=0), now.exposure[1:].sum(axis=0))
    assert_allclose(by_chance(sides)[0], surplus(rest, Counted(now.deaths[0], now.exposure[0])))
    assert (by_chance(Sides.of(part, part, part)) == 1).all()


def test_only_what_lies_above_is_a_gap() -> None:
    own = Counted(np.array([[2.0, 1.0, 0.0]]), np.array([10.0, 10.0, 10.0]))
    other = Counted(np.array([[10.0, 20.0, 0.0]]), np.array([100.0, 100.0, 100.0]))
    assert_allclose(excess(own, other), [[0.1, 0.0, 0.0]])


def test_to_first_order_is_the_gradient_times_the_gap() -> None:
    now = isles(4, seed=2)
    slopes = gradient(E0, run(now, ALMANAC))
    own = counted(now)
    member = np.array([True, False, False, False])
    sides = sides_of(own, member)
    gains = to_first_order(slopes, excess(sides.own, sides.benchmark))
    assert not gains[0].any()
    assert (gains >= 0).all()
    one = np.unravel_index(int(np.argmax(gains)), gains.shape)
    lower = now.deaths.copy()
    area, _cause, age = one
    gap = excess(sides.own, sides.benchmark)[one]
    step = 1e-4
    lower[area, age] -= step * gap * now.exposure[area, age]
    moved = run(Panel.of(FIVE, lower, now.exposure, sex="f"), ALMANAC).table.ex[area, 0]
    exact = (moved - run(now, ALMANAC).table.ex[area, 0]) / step
    assert_allclose(gains[one], exact, rtol=1e-4)


def streams(names: list[str]) -> np.ndarray:
    return np.array([[f"{one}", "benchmark", f"{one} in both"] for one in names])


def worlds() -> tuple[Sides, Array, Array, np.ndarray]:
    now = isles(12, seed=4)
    own, member = counted(now), np.arange(12) < 3
    slopes = gradient(E0, run(now, ALMANAC))
    rates = own.deaths.sum(axis=0) / own.exposure.sum(axis=0)
    return sides_of(own, member), rates, slopes, streams([f"isle-{n}" for n in range(12)])


def some(sides: Sides, where: object) -> Sides:
    return Sides(
        *(
            Counted(one.deaths[where], one.exposure[where])
            for one in (sides.alone, sides.others, sides.both)
        )
    )


def test_areas_in_another_order_or_alone_have_the_same_numbers() -> None:
    sides, rates, slopes, names = worlds()
    together = alike(sides, rates, slopes, names)
    first = among_first(sides, slopes, names)
    order = np.random.default_rng(2).permutation(12)
    for where in (order, np.array([5]), np.array([0])):
        part = some(sides, where)
        other = alike(part, rates, slopes[where], names[where])
        for name in ("expected", "total", "total_most", "largest"):
            assert_array_equal(getattr(other, name), getattr(together, name)[where], err_msg=name)
        assert_array_equal(among_first(part, slopes[where], names[where]), first[where])


def test_chance_alone_shows_half_a_normal_law_of_gains() -> None:
    """Where counts are large the mean of what lies above is the standard deviation over the root of
    2 pi."""
    own = Counted(np.array([[400.0, 900.0]]), np.array([1e4, 1e4]))
    other = Counted(np.array([[4000.0, 9000.0]]), np.array([1e5, 1e5]))
    sides = Sides(own, other, nobody(own))
    slopes = np.array([-100.0, -50.0])
    found = alike(sides, other.rates, slopes, np.array(["a", "b", "c"]))
    rates = other.rates[0]
    spread = np.sqrt(rates / 1e4 + rates / 1e5) * np.array([100.0, 50.0])
    assert_allclose(found.expected[0], spread / np.sqrt(2 * np.pi), rtol=0.15)
    assert_allclose(found.total, found.expected.sum())
    assert found.largest > spread.max()
    assert found.largest < found.total_most < 3 * spread.sum()


def test_the_chances_of_the_first_five_add_up_to_five() -> None:
    sides, _rates, slopes, names = worlds()
    found = among_first(sides, slopes, names)
    assert_allclose(found[5].sum(), 5.0, atol=0.02)
    assert ((found >= 0) & (found <= 1)).all()
    alone = among_first(sides, slopes, names, first=1)
    assert_allclose(alone[5].sum(), 1.0, atol=0.02)
    assert (alone <= found).all()


def test_a_large_gap_is_surely_among_the_first() -> None:
    worse = np.ones((6, len(FIVE)))
    worse[5, 12] = 4.0
    now = isles(6, seed=5, people=2e6, better=worse)
    sides = sides_of(counted(now), np.arange(6) < 2)
    slopes = gradient(E0, run(now, ALMANAC))
    found = among_first(sides, slopes, streams([f"isle-{n}" for n in range(6)]))
    assert found[5, 0, 12] == 1
    assert found[5, 0, 4] < 0.2
