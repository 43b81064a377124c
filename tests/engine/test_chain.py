"""The whole chain: gradients against complex steps, batches against rows, gaps."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import gradient, run
from engine.indicators import find as indicator
from engine.settings import SETTINGS, Settings, find
from engine.tables import LifeTable
from tests.engine.stepping import complex_step, largest_error
from tests.factories import GRIDS, gompertz_panel, persons_panel

E0 = indicator("e0")
ALL_SETTINGS = pytest.mark.parametrize("settings", SETTINGS.values(), ids=SETTINGS)
LOCAL = [one for one in SETTINGS.values() if one.inside != "keyfitz" and one.smoothing == "none"]
ALL_GRIDS = pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
INFANTS = (0.005, 0.03, 0.12)  # one in each piece of the first-year rules


@pytest.mark.fast
@ALL_SETTINGS
@ALL_GRIDS
@pytest.mark.parametrize("sex", ["f", "m", "p"])
def test_the_gradient_in_raw_rates(settings: Settings, grid: AgeGrid, sex: str) -> None:
    panel = gompertz_panel(grid, sex=sex, seed=3, infant=np.array(INFANTS), people=5e6)
    if sex == "p":
        panel.infant_ratio[:] = (0.9, 1.1)
    chain = run(panel, settings)
    found = gradient(E0, chain)
    expected = complex_step(lambda mx: E0.value(run(panel, settings, mx=mx)), chain.rates.mx)
    assert largest_error(found, expected) < 1e-12


@pytest.mark.fast
@ALL_SETTINGS
def test_the_gradient_through_a_join(settings: Settings) -> None:
    """The rate of a join moves as one, as its lowest group's own person-years say."""
    panel = gompertz_panel(seed=4, people=5e6)
    panel.exposure[5:7] = 0
    panel.exposure[-1] = 0
    chain = run(panel, settings)
    found = gradient(E0, chain)
    np.testing.assert_array_equal(found[[5, 6, -1]], 0)

    def value(by_own_rate: np.ndarray) -> np.ndarray:
        mx = by_own_rate[..., :].copy()
        mx[..., 5:7] = mx[..., 4:5]
        mx[..., -1] = mx[..., -2]
        return E0.value(run(panel, settings, mx=mx))

    assert largest_error(found, complex_step(value, chain.rates.mx)) < 1e-12


@pytest.mark.fast
@ALL_SETTINGS
@ALL_GRIDS
def test_a_batch_is_its_rows_bit_for_bit_in_any_split(settings: Settings, grid: AgeGrid) -> None:
    laws = np.linspace(1.5e-5, 8e-5, 12).reshape(3, 4)
    infants = np.geomspace(0.002, 0.15, 12).reshape(3, 4)
    panel = gompertz_panel(grid, seed=5, level=laws, infant=infants, people=5e5)
    panel.exposure[1, 2, -3] = 0
    panel.deaths[2, 0, -1] = 0
    panel.deaths[0, 3, 7] = np.nan
    together = run(panel, settings)
    slopes = gradient(E0, together)
    splits = [np.s_[0], np.s_[:, 1], np.s_[1:, 2:], *np.ndindex(3, 4)]
    for where in splits:
        part = run(panel[where], settings)
        for column in LifeTable.__slots__[1:]:
            np.testing.assert_array_equal(
                getattr(part.table, column), getattr(together.table, column)[where], err_msg=column
            )
        np.testing.assert_array_equal(gradient(E0, part), slopes[where])


@pytest.mark.fast
def test_memory_order_does_not_matter() -> None:
    panel = gompertz_panel(seed=6, level=np.linspace(2e-5, 5e-5, 7))
    turned = panel.over(np.asfortranarray)
    for settings in SETTINGS.values():
        np.testing.assert_array_equal(run(panel, settings).table.ex, run(turned, settings).table.ex)


@pytest.mark.fast
def test_rates_given_outright_are_the_rates_of_the_counts() -> None:
    panel = persons_panel(seed=2)
    for settings in SETTINGS.values():
        chain = run(panel, settings)
        again = run(panel, settings, mx=chain.rates.mx)
        np.testing.assert_allclose(again.table.ex, chain.table.ex, rtol=1e-13)


@pytest.mark.fast
def test_without_deaths_in_the_open_group_only_a_law_gives_expectations() -> None:
    """And no warning escapes: the suite turns warnings into errors."""
    panel = gompertz_panel(seed=7, people=5e5)
    panel.deaths[-1] = 0
    plain = run(panel, find("almanac-1"))
    assert np.isnan(plain.table.ex).all()
    assert np.isnan(gradient(E0, plain)).any()
    assert np.isfinite(gradient(indicator("45q15"), plain)).all()
    assert np.isfinite(run(panel, find("almanac-1-kannisto")).table.ex).all()


@pytest.mark.fast
def test_a_law_needs_three_closed_groups_and_rates_that_rise() -> None:
    short = gompertz_panel(AgeGrid((0, 1, *range(5, 85, 5))), seed=8)
    chain = run(short, find("almanac-1-gompertz"))
    assert np.isnan(chain.table.ex).all()
    assert np.isnan(gradient(E0, chain)).any()
    assert np.isfinite(chain.table.lx[..., : len(short.grid)]).all()
    falling = gompertz_panel(seed=8)
    mx = run(falling, find("almanac-1")).rates.mx
    mx[15:] = np.linspace(0.09, 0.05, len(mx) - 15)
    assert np.isnan(run(falling, find("almanac-1-gompertz"), mx=mx).table.ex).all()


@pytest.mark.fast
@pytest.mark.parametrize("settings", LOCAL, ids=lambda s: s.key)
def test_what_an_indicator_does_not_read_passes_no_nan_on(settings: Settings) -> None:
    """45q15 keeps its gradient where the oldest rates are missing and no law can be fitted, in the
    chains in which no age group reads another."""
    whole, short = gompertz_panel(seed=8), gompertz_panel(AgeGrid((0, 1, *range(5, 85, 5))), seed=8)
    gap = gompertz_panel(seed=8)
    gap.deaths[-4:] = np.nan
    expected = gradient(indicator("45q15"), run(whole, settings))
    rounding = 1e-12 * expected.max()
    assert np.count_nonzero(expected > rounding) == 9
    np.testing.assert_array_equal(gradient(indicator("45q15"), run(gap, settings)), expected)
    found = gradient(indicator("45q15"), run(short, settings))
    np.testing.assert_array_equal(found > rounding, expected[: len(short.grid)] > rounding)


@pytest.mark.fast
@pytest.mark.parametrize("settings", ["almanac-1-gompertz", "almanac-1-kannisto"])
def test_a_law_reads_the_closed_groups_from_the_stated_age(settings: str) -> None:
    chain = run(gompertz_panel(seed=8, people=5e6), find(settings))
    by_law = np.zeros(len(chain.table.grid))
    by_law[-1] = 1
    read = np.array(chain.panel.grid.starts)[chain.closed.pull(by_law) != 0]
    np.testing.assert_array_equal(read, range(chain.settings.fit_from, 100, 5))


@pytest.mark.fast
def test_what_reaches_the_open_age() -> None:
    panel = gompertz_panel(AgeGrid((0, 1, *range(5, 90, 5))), seed=9, people=5e6)
    plain, law = run(panel, find("almanac-1")), run(panel, find("almanac-1-gompertz"))
    assert plain.open_reach == plain.table.lx[-1]
    assert law.open_reach == plain.open_reach
    assert not plain.modelled
    assert law.modelled
    assert law.table.grid.starts[-46:] == tuple(range(85, 131))


@pytest.mark.fast
def test_a_number_without_derivative_says_why() -> None:
    chain = run(gompertz_panel(), find("almanac-1"))
    with pytest.raises(ValueError, match=r"Life-table median has no derivative.*its slope"):
        gradient(indicator("median"), chain)
