"""What must hold of contributions along the straight line, by age and by cause."""

import numpy as np
import pytest

from engine.ages import AgeGrid, Array
from engine.chain import Reading, Tally, run
from engine.decomposition import contributions, contributions_by_cause
from engine.indicators import INDICATORS
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from tests.engine.decomposition.pairs import ONE_SEX, PAIRS, PLAIN, Pair, scale
from tests.factories import GRIDS, gompertz_panel

SMOOTH = [
    one
    for one in INDICATORS.values()
    if one.smooth and not isinstance(one.partials(run(gompertz_panel(), PLAIN)), Tally)
]
every_smooth = pytest.mark.parametrize("indicator", SMOOTH, ids=lambda indicator: indicator.key)


@pytest.mark.fast
@every_smooth
@pytest.mark.parametrize("name", ONE_SEX)
def test_nothing_remains_between_populations_of_one_sex(name: str, indicator: Reading) -> None:
    pair = ONE_SEX[name].same_years()
    found = contributions(indicator, pair.this, pair.that, PLAIN)
    value = [indicator.value(run(panel, PLAIN)) for panel in (pair.this, pair.that)]
    np.testing.assert_array_equal(found.difference, value[0] - value[1])
    if np.isnan(found.difference):
        assert np.isnan(found.by_age).all()
        return
    assert abs(found.remainder) <= 1e-9 * scale(found.by_age, found.difference) + 1e-17
    assert found.by_age.sum() + found.remainder == pytest.approx(found.difference, rel=1e-12)


UNSMOOTHED = {key: one for key, one in SETTINGS.items() if one.smoothing == "none"}


@pytest.mark.fast
@pytest.mark.parametrize("settings", UNSMOOTHED.values(), ids=UNSMOOTHED)
@pytest.mark.parametrize("name", [name for name in ONE_SEX if name != "far apart"])
def test_nothing_remains_under_any_chain(name: str, settings: Settings) -> None:
    """Of a curve whose smoothness the counts choose, what that choice moves is no age's."""
    pair = ONE_SEX[name].same_years(settings)
    for key in ("e0", "H"):
        found = contributions(INDICATORS[key], pair.this, pair.that, settings)
        assert abs(found.remainder) <= 1e-9 * scale(found.by_age, found.difference)


@pytest.mark.fast
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
def test_nothing_remains_between_very_unlike_populations(grid: AgeGrid) -> None:
    this = gompertz_panel(grid, sex="f", level=1e-5, infant=0.003)
    that = gompertz_panel(grid, sex="f", level=2.5e-4, infant=0.2)
    that.deaths[-1] *= 3
    found = contributions(INDICATORS["e0"], this, that, PLAIN)
    assert found.difference > 40
    assert abs(found.remainder) <= 1e-9 * scale(found.by_age, found.difference)


@pytest.mark.fast
def test_between_the_sexes_the_first_year_rules_remain() -> None:
    """Women and men with the same rates still differ by their rules; no age's rate does that."""
    women, men = gompertz_panel(sex="f"), gompertz_panel(sex="m")
    found = contributions(INDICATORS["e0"], women, men, PLAIN)
    np.testing.assert_array_equal(found.by_age, 0)
    assert found.remainder == found.difference != 0


@pytest.mark.fast
@every_smooth
def test_turned_round_every_part_changes_its_sign(indicator: Reading) -> None:
    for pair in PAIRS.values():
        there = contributions(indicator, pair.this, pair.that, PLAIN)
        back = contributions(indicator, pair.that, pair.this, PLAIN)
        least = 1e-12 * np.abs(np.nan_to_num(there.by_age)).sum()
        np.testing.assert_allclose(back.by_age, -there.by_age, rtol=1e-9, atol=least)
        np.testing.assert_allclose(back.remainder, -there.remainder, rtol=0, atol=10 * least)


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


def by_cause(panel: Panel, seed: int) -> Array:
    """Deaths split over four causes with shares that change with age: [..., cause, age]."""
    weights = np.random.default_rng(seed).gamma(0.7, size=(4, len(panel.grid)))
    return panel.deaths[..., None, :] * weights / weights.sum(axis=0)


def split(pair: Pair) -> tuple[Array, Array]:
    return by_cause(pair.this, 1), by_cause(pair.that, 2)


@pytest.mark.fast
@pytest.mark.parametrize("pair", PAIRS.values(), ids=PAIRS)
@every_smooth
def test_the_causes_of_an_age_add_up_to_the_age(indicator: Reading, pair: Pair) -> None:
    ages = contributions(indicator, pair.this, pair.that, PLAIN)
    causes = contributions_by_cause(indicator, pair.this, pair.that, PLAIN, causes=split(pair))
    assert causes.by_cause.shape == (4, len(pair.this.grid))
    held = np.abs(np.nan_to_num(causes.by_cause)).sum()
    np.testing.assert_allclose(
        causes.by_cause.sum(axis=0), ages.by_age, rtol=1e-12, atol=1e-12 * held
    )
    np.testing.assert_allclose(causes.remainder, ages.remainder, rtol=0, atol=1e-12 * held)
    np.testing.assert_array_equal(causes.difference, ages.difference)


@pytest.mark.fast
def test_two_causes_taken_as_one_contribute_as_one() -> None:
    pair = PAIRS["Danish men 1974 to 2012"]
    apart = split(pair)
    joined = tuple(np.add.reduceat(side, [0, 2, 3], axis=-2) for side in apart)
    found, together = (
        contributions_by_cause(INDICATORS["H"], pair.this, pair.that, PLAIN, causes=causes).by_cause
        for causes in (apart, joined)
    )
    np.testing.assert_allclose(together, np.add.reduceat(found, [0, 2, 3], axis=0), atol=1e-15)


@pytest.mark.fast
def test_a_cause_alone_that_changes_contributes_all() -> None:
    """One cause halved at all ages; the others stand still and contribute nothing."""
    that = gompertz_panel(people=1e6, infant=0.02)
    before = by_cause(that, 3)
    after = before * np.array([1, 0.5, 1, 1])[:, None]
    this = Panel.of(that.grid, after.sum(axis=0), that.exposure, sex="f")
    found = contributions_by_cause(INDICATORS["e0"], this, that, PLAIN, causes=(after, before))
    assert np.abs(found.by_cause[[0, 2, 3]]).max() < 1e-14
    assert found.by_cause[1].sum() == pytest.approx(found.difference, rel=1e-9)


@pytest.mark.fast
def test_causes_that_trade_places_are_seen_where_the_age_stands_still() -> None:
    """All deaths the same on both sides, the causes exchanged: the cells are not 0 though every
    age is, and they cancel."""
    panel = gompertz_panel(people=1e6)
    causes = np.stack([0.2 * panel.deaths, 0.8 * panel.deaths])
    found = contributions_by_cause(
        INDICATORS["e0"], panel, panel, PLAIN, causes=(causes, causes[::-1])
    ).by_cause
    assert found[0].sum() > 1  # the first cause kills fewer here
    np.testing.assert_allclose(found.sum(axis=0), 0, atol=1e-14)


@pytest.mark.fast
def test_causes_of_a_join_have_the_rates_of_the_join() -> None:
    """Nobody counted at 95-99: the deaths there, by cause, share the rates of 90-94."""
    this, that = gompertz_panel(seed=1), gompertz_panel(seed=2, level=3e-5)
    this.exposure[-2] = 0
    pair = Pair(this, that)
    ages = contributions(INDICATORS["e0"], this, that, PLAIN).by_age
    found = contributions_by_cause(INDICATORS["e0"], this, that, PLAIN, causes=split(pair))
    np.testing.assert_allclose(found.by_cause.sum(axis=0), ages, rtol=1e-12, atol=1e-13)


@pytest.mark.fast
def test_causes_in_a_batch_are_its_rows_bit_for_bit() -> None:
    levels = np.array([2e-5, 3e-5, 4e-5])
    pair = Pair(gompertz_panel(seed=1, level=levels), gompertz_panel(seed=2, level=levels[::-1]))
    causes = split(pair)
    assert causes[0].shape == (3, 4, 22)
    both = pair.this, pair.that
    together = contributions_by_cause(INDICATORS["e0"], *both, PLAIN, causes=causes).by_cause
    for row in range(3):
        one = tuple(side[row] for side in causes)
        alone = contributions_by_cause(
            INDICATORS["e0"], pair.this[row], pair.that[row], PLAIN, causes=one
        )
        np.testing.assert_array_equal(alone.by_cause, together[row])


@pytest.mark.fast
def test_causes_must_hold_every_death() -> None:
    pair = PAIRS["Danish men 1974 to 2012"]
    ours, theirs = split(pair)
    theirs[2, 5] += 1
    with pytest.raises(ValueError, match=r"causes hold .* deaths at ages 20–24 but all deaths are"):
        contributions_by_cause(INDICATORS["e0"], pair.this, pair.that, PLAIN, causes=(ours, theirs))
