"""Contributions of ages against a plain sum of 20,000 steps, and what must hold for any pair.

The plain sum knows nothing of gradients: at the middle of each step along the straight line of
rates it moves one age's rate by its share of the step and reads the indicator before and after.
"""

from dataclasses import dataclass, replace

import numpy as np
import pytest
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.chain import Reading, run
from engine.decomposition import arriaga, contribution_limits, contributions
from engine.indicators import INDICATORS, difference
from engine.panel import Panel
from engine.settings import Settings, find
from tests.factories import GRIDS, codes, gompertz_panel
from tests.published import denmark

GRID = GRIDS["abridged"]
PLAIN = find("almanac-1")
AT_ONCE = 200
SMOOTH = [indicator for indicator in INDICATORS.values() if indicator.smooth]


@dataclass(frozen=True)
class Pair:
    this: Panel
    that: Panel


def zero_cell() -> Pair:
    """The rate at 95-99 passes the one at which all who enter die, too."""
    this = gompertz_panel(GRID, sex="m", level=2e-5)
    this.deaths[4] = 0
    return Pair(this, gompertz_panel(GRID, sex="m", infant=0.01))


def crossing(sex: str, infants: tuple[float, float], ratio: tuple[float, float]) -> Pair:
    """Infant rates on both sides of a break point, the sexes' mix changing as well for persons."""
    this, that = (
        gompertz_panel(GRID, sex=sex, infant=infant, level=level, slope=0.095)
        for infant, level in zip(infants, (1.8e-5, 2.4e-5), strict=True)
    )
    if sex == "p":
        this.infant_weight[:], this.infant_ratio[:] = (0.45, 0.55), ratio
        that.infant_weight[:], that.infant_ratio[:] = (0.42, 0.58), (0.85, 1.15)
    return Pair(this, that)


def danes() -> Pair:
    this, that = (denmark.one("male", year).regroup(denmark.ABRIDGED) for year in (2012, 1974))
    return Pair(this, that)


PAIRS = {
    "Danish men 1974 to 2012": danes(),
    "men across the break of a0": crossing("m", (0.008, 0.045), (1, 1)),
    "women across all breaks, upwards": crossing("f", (0.13, 0.005), (1, 1)),
    "a group without deaths": zero_cell(),
    "persons across a break, mix changing": crossing("p", (0.006, 0.019), (0.9, 1.08)),
}


def between(pair: Pair, t: np.ndarray) -> Panel:
    """Panels [node, age] on the line from that to this, rates still to be given."""
    line = {
        name: getattr(pair.that, name) + t * (getattr(pair.this, name) - getattr(pair.that, name))
        for name in ("exposure", "infant_weight", "infant_ratio")
    }
    return replace(pair.this, deaths=line["exposure"] * 0, **line)


def step_sums(pair: Pair, settings: Settings, steps: int, *readings: Reading) -> list[np.ndarray]:
    ends = [run(panel, settings).rates.mx for panel in (pair.that, pair.this)]
    step = (ends[1] - ends[0]) / steps
    sums = [np.zeros_like(step) for _ in readings]
    aside = np.eye(len(step)) * step / 2  # one age moved, [age, age]
    for first in range(0, steps, AT_ONCE):
        t = ((np.arange(first, first + AT_ONCE) + 0.5) / steps)[:, None]
        panel, middle = between(pair, t)[:, None], (ends[0] + t * (ends[1] - ends[0]))[:, None]
        after, before = (run(panel, settings, mx=middle + side * aside) for side in (1, -1))
        for total, reading in zip(sums, readings, strict=True):
            total += (reading.value(after) - reading.value(before)).sum(axis=0)
    return sums


@pytest.mark.slow
@pytest.mark.parametrize("pair", PAIRS.values(), ids=PAIRS)
def test_every_age_against_20_000_steps(pair: Pair) -> None:
    readings = [INDICATORS[key] for key in ("e0", "H")]
    for reading, expected in zip(readings, step_sums(pair, PLAIN, 20_000, *readings), strict=True):
        found = contributions(reading, pair.this, pair.that, PLAIN)
        np.testing.assert_allclose(found.by_age, expected, rtol=0, atol=1e-6)


@pytest.mark.fast
@pytest.mark.parametrize("settings", ["almanac-1-gompertz", "almanac-1-kannisto"])
def test_every_age_against_steps_through_a_fitted_law(settings: str) -> None:
    chain, pair = find(settings), PAIRS["Danish men 1974 to 2012"]
    (expected,) = step_sums(pair, chain, AT_ONCE, INDICATORS["e0"])
    found = contributions(INDICATORS["e0"], pair.this, pair.that, chain)
    np.testing.assert_allclose(found.by_age, expected, rtol=0, atol=2e-6)
    assert found.by_age[-1] == 0  # the law takes the place of the open group's own rate
    assert 0 < abs(found.remainder) < 1e-3 * abs(found.difference)  # moved by person-years


def scale(found) -> float:
    return max(abs(float(found.difference)), float(np.abs(found.by_age).sum()))


@pytest.mark.fast
@pytest.mark.parametrize("indicator", SMOOTH, ids=lambda indicator: indicator.key)
@pytest.mark.parametrize("name", [name for name in PAIRS if "persons" not in name])
def test_nothing_remains_between_populations_of_one_sex(name: str, indicator: Reading) -> None:
    pair = PAIRS[name]
    same_years = replace(
        pair.that,
        exposure=pair.this.exposure,
        deaths=run(pair.that, PLAIN).rates.mx * pair.this.exposure,
    )
    found = contributions(indicator, pair.this, same_years, PLAIN)
    value = [indicator.value(run(panel, PLAIN)) for panel in (pair.this, same_years)]
    assert found.difference == value[0] - value[1]
    assert abs(found.remainder) <= 1e-9 * scale(found) + 1e-17  # where the number is untouched
    assert found.by_age.sum() + found.remainder == pytest.approx(found.difference, rel=1e-12)


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
def test_nothing_remains_between_very_unlike_populations(grid: AgeGrid) -> None:
    this = gompertz_panel(grid, sex="f", level=1e-5, infant=0.003)
    that = gompertz_panel(grid, sex="f", level=2.5e-4, infant=0.2)
    that.deaths[-1] *= 3
    found = contributions(INDICATORS["e0"], this, that, PLAIN)
    assert found.difference > 40
    assert abs(found.remainder) <= 1e-9 * scale(found) + 1e-17  # where the number is untouched


@pytest.mark.fast
@pytest.mark.parametrize("empty", [(0, 1), (1, 0), (1, 1)])
def test_each_age_of_a_join_has_its_own_part(empty: tuple[int, int]) -> None:
    """Nobody counted at 95-99 on one side or on both: its deaths share the rate of 90-94, and its
    part is still its own."""
    this, that = gompertz_panel(GRID, seed=1), gompertz_panel(GRID, seed=2, level=3e-5)
    for panel, is_empty in zip((this, that), empty, strict=True):
        panel.exposure[-2] *= 1 - is_empty
    found = contributions(INDICATORS["e0"], this, that, PLAIN)
    (expected,) = step_sums(Pair(this, that), PLAIN, AT_ONCE, INDICATORS["e0"])
    np.testing.assert_allclose(found.by_age, expected, rtol=0, atol=1e-6)
    assert abs(found.by_age[-2]) > 1e-4


@pytest.mark.fast
def test_between_the_sexes_the_first_year_rules_remain() -> None:
    """Women and men with the same rates still differ by their rules; no age's rate does that."""
    women, men = gompertz_panel(sex="f"), gompertz_panel(sex="m")
    found = contributions(INDICATORS["e0"], women, men, PLAIN)
    np.testing.assert_array_equal(found.by_age, 0)
    assert found.remainder == found.difference != 0


@pytest.mark.fast
def test_turned_round_every_part_changes_its_sign() -> None:
    for pair in PAIRS.values():
        there = contributions(INDICATORS["H"], pair.this, pair.that, PLAIN)
        back = contributions(INDICATORS["H"], pair.that, pair.this, PLAIN)
        np.testing.assert_allclose(back.by_age, -there.by_age, rtol=1e-9, atol=1e-15)
        assert back.remainder == pytest.approx(-there.remainder, abs=1e-12)


@pytest.mark.fast
@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-kannisto"])
def test_a_batch_is_its_rows_bit_for_bit(settings: str) -> None:
    """Also where rows need different cuts."""
    infants = np.geomspace(0.002, 0.15, 6)
    this = gompertz_panel(sex="f", seed=1, infant=infants, people=5e6)
    that = gompertz_panel(sex="f", seed=2, infant=infants[::-1], people=5e6)
    together = contributions(INDICATORS["e0"], this, that, find(settings))
    for row in range(6):
        alone = contributions(INDICATORS["e0"], this[row], that[row], find(settings))
        np.testing.assert_array_equal(alone.by_age, together.by_age[row])
        np.testing.assert_array_equal(alone.remainder, together.remainder[row])


@pytest.mark.fast
def test_no_contributions_without_a_difference() -> None:
    this, that = gompertz_panel(), gompertz_panel(level=4e-5)
    this.deaths[-1] = 0
    found = contributions(INDICATORS["e0"], this, that, PLAIN)
    assert np.isnan(found.by_age).all()
    assert np.isnan(found.remainder)
    np.testing.assert_array_equal(
        np.isnan(contributions(INDICATORS["45q15"], this, that, PLAIN).by_age), False
    )


@pytest.mark.fast
def test_refusals() -> None:
    this, other = gompertz_panel(), gompertz_panel(GRIDS["single"])
    with pytest.raises(ValueError, match=r"age groups differ .* regroup both"):
        contributions(INDICATORS["e0"], this, other, PLAIN)
    with pytest.raises(ValueError, match="has no derivative"):
        contributions(INDICATORS["mode"], this, this, PLAIN)
    with pytest.raises(
        ValueError, match=r"tables' age groups differ .* one rule for the open group"
    ):
        arriaga(run(this, PLAIN).table, run(other, PLAIN).table)


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
def test_arriagas_contributions_add_up_on_any_grid(grid: AgeGrid) -> None:
    this = run(gompertz_panel(grid, level=np.array([2e-5, 3e-5])), PLAIN).table
    that = run(gompertz_panel(grid, infant=0.02), PLAIN).table
    found = arriaga(this, that)
    np.testing.assert_allclose(found.sum(axis=-1), this.ex[..., 0] - that.ex[..., 0], rtol=1e-12)


@pytest.mark.fast
def test_arriaga_and_the_line_agree_for_small_differences() -> None:
    this, that = gompertz_panel(seed=3, people=1e9), gompertz_panel(seed=4, people=1e9)
    line = contributions(INDICATORS["e0"], this, that, PLAIN).by_age
    closed = arriaga(run(this, PLAIN).table, run(that, PLAIN).table)
    np.testing.assert_allclose(line, closed, rtol=0.02, atol=2e-6)


def both(panel: Panel) -> tuple[NDArray[np.str_], NDArray[np.str_]]:
    """Codes of the two sides of a comparison."""
    return codes(panel, "this"), codes(panel, "that")


@pytest.mark.fast
def test_limits_count_shared_deaths_once() -> None:
    """Against a whole it is part of, the delta method and the simulated sum agree; taken as
    independent, the interval would be too wide."""
    part = gompertz_panel(seed=11, people=3e6, level=2e-5, slope=0.095)
    rest = gompertz_panel(seed=12, people=1e6, level=4e-5, slope=0.095)
    whole = replace(part, deaths=part.deaths + rest.deaths, exposure=part.exposure + rest.exposure)

    def width(shared: Array | None) -> float:
        limits = contribution_limits(
            INDICATORS["e0"],
            part,
            whole,
            PLAIN,
            streams=both(part),
            shared=shared,
            draws=2000,
            groups=AgeGrid((0,)),
        )
        return float(limits.high[0] - limits.low[0])

    expected = difference(INDICATORS["e0"], part, whole, PLAIN, shared=part.deaths)
    assert width(part.deaths) == pytest.approx(float(expected.high - expected.low), rel=0.08)
    assert width(None) > 1.5 * width(part.deaths)


@pytest.mark.fast
def test_limits_are_those_of_the_delta_method_for_large_counts() -> None:
    """The contribution of an age moves with its own two rates, so its variance is nearly theirs."""
    this = gompertz_panel(seed=5, people=3e7, level=2e-5, slope=0.095)
    that = gompertz_panel(seed=6, people=3e7, level=3e-5, slope=0.095)
    found = contributions(INDICATORS["e0"], this, that, PLAIN).by_age
    limits = contribution_limits(
        INDICATORS["e0"], this, that, PLAIN, streams=both(this), draws=2000
    )
    chains = run(this, PLAIN), run(that, PLAIN)
    step = chains[0].rates.mx - chains[1].rates.mx
    slope = found / step
    variance = sum(chain.rates.deaths / chain.rates.exposure**2 for chain in chains)
    expected = 2 * 1.96 * np.abs(slope) * np.sqrt(variance)
    assert ((limits.low < found) & (found < limits.high)).all()
    np.testing.assert_allclose(limits.high - limits.low, expected, rtol=0.15)


@pytest.mark.fast
def test_limits_of_groups_are_those_of_the_sums() -> None:
    """One group that holds every age: the limits of the whole difference, as simulated."""
    this = gompertz_panel(seed=5, people=3e7, level=2e-5, slope=0.095)
    that = gompertz_panel(seed=6, people=3e7, level=3e-5, slope=0.095)
    whole = contribution_limits(
        INDICATORS["e0"], this, that, PLAIN, streams=both(this), draws=400, groups=AgeGrid((0,))
    )
    assert whole.low.shape == (1,)
    expected = difference(INDICATORS["e0"], this, that, PLAIN)
    np.testing.assert_allclose(whole.high - whole.low, expected.high - expected.low, rtol=0.15)


@pytest.mark.fast
def test_limits_do_not_depend_on_what_else_is_drawn() -> None:
    this = gompertz_panel(seed=7, level=np.array([2e-5, 3e-5, 4e-5]))
    that = gompertz_panel(seed=8, level=np.array([3e-5, 3e-5, 3e-5]))
    names = both(this)
    low, high = contribution_limits(INDICATORS["H"], this, that, PLAIN, streams=names, draws=50)
    for row in range(3):
        alone = contribution_limits(
            INDICATORS["H"],
            this[row],
            that[row],
            PLAIN,
            streams=(names[0][row], names[1][row]),
            draws=50,
        )
        np.testing.assert_array_equal(alone.low, low[row])
        np.testing.assert_array_equal(alone.high, high[row])


@pytest.mark.fast
def test_no_limits_where_many_draws_give_no_figure() -> None:
    """One death expected in the open group: a third of the draws have none, and no e0."""
    this, that = gompertz_panel(seed=9), gompertz_panel(level=4e-5)
    this.deaths[-1] = 1
    limits = contribution_limits(INDICATORS["e0"], this, that, PLAIN, streams=both(this))
    assert np.isnan(limits.low).all()
    assert np.isnan(limits.high).all()
