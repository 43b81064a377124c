"""Where lower rates add most: derivatives by complex step, deaths to avoid by running anew."""

from dataclasses import replace

import numpy as np
import pytest

from engine import sensitivity
from engine.ages import AgeGrid
from engine.chain import Tally, gradient, run
from engine.indicators import INDICATORS, Indicator
from engine.indicators import find as indicator
from engine.panel import Panel
from engine.settings import SETTINGS, Settings, find
from engine.stages.separation import separate
from engine.tables import LifeTable, Partials, from_rates
from tests.engine.stepping import complex_step, largest_error
from tests.factories import GRIDS, gompertz_panel, table_of_qx
from tests.published import denmark


def short_cut(table: LifeTable) -> np.ndarray:
    """(1 / px) times the sum of l over the ages above x."""
    above = np.flip(np.cumsum(np.flip(table.lx, axis=-1), axis=-1), axis=-1)[..., 1:]
    with np.errstate(invalid="ignore"):  # where nobody survives there is no such form
        return np.asarray(above / (1 - table.qx[..., :-1]))


def printed_form(table: LifeTable) -> np.ndarray:
    """(1 / px) T(x+n) + (n - ax) lx."""
    px, n = 1 - table.qx[..., :-1], table.grid.widths[:-1]
    return np.asarray(table.Tx[..., 1:] / px + (n - table.ax[..., :-1]) * table.lx[..., :-1])


def closed_single_years() -> LifeTable:
    """Half a year lived by all who die, nobody left at 110."""
    grid = AgeGrid(tuple(range(111)))
    qx = np.append(np.minimum(1e-4 * np.exp(0.09 * np.arange(109)), 0.8), [1.0, 1.0])
    return table_of_qx(grid, qx, np.full(111, 0.5))


def of_e0(table: LifeTable) -> np.ndarray:
    """The sensitivity of e0 to survival in any table."""
    chain = replace(run(gompertz_panel(), find("almanac-1")), table=table)
    return sensitivity.by_survival(indicator("e0"), chain)


@pytest.mark.fast
def test_of_life_expectancy_it_is_the_printed_form() -> None:
    table = run(gompertz_panel(GRIDS["irregular"], level=2e-5), find("almanac-1")).table
    np.testing.assert_allclose(of_e0(table), printed_form(table), rtol=1e-12)


@pytest.mark.fast
def test_the_short_cut_holds_for_closed_single_years_with_a_half() -> None:
    table = closed_single_years()
    assert (table.qx[:-2] < 1).all()
    np.testing.assert_allclose(of_e0(table)[:-1], short_cut(table)[:-1], rtol=1e-12)


@pytest.mark.fast
@pytest.mark.parametrize(
    ("name", "least"), [("open at 85, single years", 0.02), ("abridged to 100", 0.7)]
)
def test_elsewhere_it_errs(name: str, least: float, capsys: pytest.CaptureFixture[str]) -> None:
    grid = AgeGrid(tuple(range(86))) if "85" in name else GRIDS["abridged"]
    table = run(gompertz_panel(grid), find("almanac-1")).table
    right, cut = of_e0(table), short_cut(table)
    with capsys.disabled():
        for age in (0, 40, 80):
            x = grid.position(age)
            print(f"\n  sum of l beyond {age:2}, {name}: {cut[x]:7.3f} for {right[x]:7.3f}", end="")
    x = grid.position(40)
    assert right[x] - cut[x] > least * right[x]


def of_a_whole(**law: float) -> Panel:
    """With births, and the whole that some numbers compare with."""
    panel = gompertz_panel(**law)
    births = np.array([14_000.0, 60.0, 20.0])
    return replace(panel, births=births, whole=gompertz_panel(people=1e7, level=3e-5))


def partials(one: Indicator) -> object:
    return one.partials(run(of_a_whole(), find("almanac-1")))


SMOOTH = [one for one in INDICATORS.values() if one.smooth]
OF_TABLE = [one for one in SMOOTH if isinstance(partials(one), Partials)]
BY_AGE = [one for one in SMOOTH if not isinstance(partials(one), Tally)]
OF_RATES = [one for one in BY_AGE if one not in OF_TABLE]
every_of_table = pytest.mark.parametrize("one", OF_TABLE, ids=lambda one: one.key)
every_chain = pytest.mark.parametrize("settings", SETTINGS.values(), ids=SETTINGS)


@pytest.mark.fast
@every_chain
@every_of_table
def test_sensitivity_to_survival_is_the_complex_step(one: Indicator, settings: Settings) -> None:
    """One px moved, ax held: the table built anew from probabilities."""
    chain = run(gompertz_panel(infant=0.02, people=5e6), settings)
    table = chain.table

    def value(px: np.ndarray) -> np.ndarray:
        qx = np.append(1 - px, 1.0)
        return one.value(replace(chain, table=table_of_qx(table.grid, qx, table.ax)))

    expected = complex_step(value, 1 - table.qx[:-1])
    found = sensitivity.by_survival(one, chain)
    assert largest_error(found, expected) < 1e-9


@pytest.mark.fast
@every_chain
@every_of_table
def test_elasticity_is_the_complex_step_in_log_rates(one: Indicator, settings: Settings) -> None:
    """One log mx moved, ax held but for 1 / m of the open group."""
    chain = run(gompertz_panel(infant=0.02, people=5e6), settings)
    table = chain.table

    def log_value(logs: np.ndarray) -> np.ndarray:
        mx = np.exp(logs)
        ax = np.append(table.ax[:-1], 1 / mx[-1])
        return np.log(one.value(replace(chain, table=from_rates(table.grid, mx, ax))))

    expected = complex_step(log_value, np.log(table.mx))
    assert largest_error(sensitivity.elasticity(one, chain), expected) < 1e-9


@pytest.mark.fast
@every_chain
@pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)
def test_elasticities_of_life_expectancy_sum_to_minus_h(grid: AgeGrid, settings: Settings) -> None:
    """All rates 1 % higher make life H % shorter, to first order (Leser 1955; Keyfitz 1977)."""
    panel = gompertz_panel(grid, seed=2, people=5e6, level=np.array([1e-5, 4e-5, 2e-4]))
    chain = run(panel, settings)
    elasticity = sensitivity.elasticity(indicator("e0"), chain)
    unevenness = indicator("H").value(chain)
    np.testing.assert_allclose(elasticity.sum(axis=-1), -unevenness, rtol=1e-10)


@pytest.mark.fast
@pytest.mark.parametrize("one", OF_RATES, ids=lambda one: one.key)
def test_elasticity_of_what_is_read_off_rates(one: Indicator) -> None:
    panel = of_a_whole(infant=0.02, people=5e6)
    chain = run(panel, find("almanac-1"))

    def log_value(logs: np.ndarray) -> np.ndarray:
        return np.log(one.value(run(panel, chain.settings, mx=np.exp(logs))))

    expected = complex_step(log_value, np.log(chain.rates.mx))
    assert largest_error(sensitivity.elasticity(one, chain), expected) < 1e-9


@pytest.mark.fast
def test_the_slope_of_log_rates_keeps_where_all_rates_rise_alike() -> None:
    chain = run(gompertz_panel(seed=1, people=5e6), find("almanac-1"))
    found = sensitivity.elasticity(indicator("ageing_rate"), chain)
    assert abs(found.sum()) < 1e-10 < np.abs(found).max()


@pytest.mark.fast
@pytest.mark.parametrize("settings", SETTINGS.values(), ids=SETTINGS)
def test_one_per_cent_less_at_one_age_of_the_table(settings) -> None:
    panel = gompertz_panel(seed=3, people=5e6)
    chain = run(panel, settings)
    gain = sensitivity.gain_per_percent(indicator("e0"), chain)

    def value(mx: np.ndarray) -> float:
        closed = replace(chain.closed, mx=mx)
        ax = separate(closed, panel.infant_weight, panel.infant_ratio, settings).ax
        return float(from_rates(closed.grid, mx, ax).ex[0])

    assert gain.shape == chain.table.mx.shape
    for x in range(len(gain)):
        lower, higher = chain.table.mx.copy(), chain.table.mx.copy()
        lower[x] *= 0.995
        higher[x] *= 1.005
        assert gain[x] == pytest.approx(value(lower) - value(higher), rel=1e-3, abs=1e-9)


@pytest.mark.fast
def test_of_counted_ages_it_is_the_gradient_in_the_raw_rates() -> None:
    chain = run(gompertz_panel(seed=3, people=5e6), find("almanac-1"))
    by_rate = gradient(indicator("e0"), chain)
    np.testing.assert_allclose(
        sensitivity.gain_per_percent(indicator("e0"), chain),
        -0.01 * chain.rates.mx * by_rate,
        rtol=1e-12,
    )


@pytest.mark.fast
def test_refusals() -> None:
    chain = run(gompertz_panel(), find("almanac-1"))
    for method in (sensitivity.gain_per_percent, sensitivity.by_survival):
        with pytest.raises(ValueError, match="not off the table"):
            method(indicator("ageing_rate"), chain)
    for method in (
        sensitivity.gain_per_percent,
        sensitivity.by_survival,
        sensitivity.elasticity,
        sensitivity.deaths_to_avoid,
    ):
        with pytest.raises(ValueError, match="has no derivative"):
            method(indicator("mode"), chain)
    with pytest.raises(ValueError, match="a gain of 0 takes no deaths"):
        sensitivity.deaths_to_avoid(indicator("e0"), chain, 0.0)


def without(panel: Panel, x: int, avoided: float) -> Panel:
    deaths = panel.deaths.copy()
    deaths[..., x] -= avoided
    return replace(panel, deaths=deaths)


@pytest.mark.fast
@pytest.mark.parametrize("one", BY_AGE, ids=lambda one: one.key)
@pytest.mark.parametrize("key", ["almanac-1", "almanac-1-gompertz"])
def test_so_many_deaths_fewer_bring_the_gain(one: Indicator, key: str) -> None:
    """Taken off the counts, at one age after another, and the whole chain run anew."""
    settings, panel = find(key), of_a_whole(people=1e6, infant=0.02, seed=1)
    chain = run(panel, settings)
    before = one.value(chain)
    most = np.nan_to_num(sensitivity.deaths_to_avoid(one, chain, 1e-3).most)
    gain = 0.4 * most[np.argmax(np.abs(most))]
    found = sensitivity.deaths_to_avoid(one, chain, float(gain))
    reached = np.flatnonzero(np.isfinite(found.deaths))
    assert len(reached) > 0
    for x in reached:
        assert 0 < found.deaths[x] <= panel.deaths[x]
        after = one.value(run(without(panel, x, found.deaths[x]), settings))
        assert float(after - before) == pytest.approx(gain, rel=1e-9)
    for x in set(range(len(panel.grid))) - {*reached, len(panel.grid) - 1}:
        after = one.value(run(without(panel, x, panel.deaths[x]), settings))
        assert float(after - before) == pytest.approx(found.most[x], rel=1e-9, abs=1e-15)
        assert float(after - before) / gain < 1


@pytest.mark.fast
def test_a_month_of_life_is_out_of_reach_where_few_die() -> None:
    panel = denmark.one("male", 2012).regroup(denmark.ABRIDGED)
    chain = run(panel, find("almanac-1"))
    found = sensitivity.deaths_to_avoid(indicator("e0"), chain)
    np.testing.assert_array_equal(found.there, panel.deaths)
    starts = np.array(panel.grid.starts)
    assert np.isnan(found.deaths[(starts > 0) & (starts < 20)]).all()
    assert np.isfinite(found.deaths[starts >= 30]).all()
    short = np.isnan(found.deaths)
    assert (found.most[short] < 1 / 12).all()
    assert np.isnan(found.most[-1])  # the fewer die in the open group, the longer, without end


@pytest.mark.fast
def test_no_deaths_are_avoided_by_borrowing_a_rate() -> None:
    """With a whole to borrow from, a population with deaths in the open group is as without one."""
    panel = of_a_whole(people=1e5, seed=2)
    own, with_whole = (
        sensitivity.deaths_to_avoid(indicator("e0"), run(panel, find(key)))
        for key in ("almanac-1", "almanac-1-borrow")
    )
    assert np.isfinite(own.deaths[-1])
    for name in ("deaths", "most"):
        np.testing.assert_array_equal(getattr(with_whole, name), getattr(own, name))
    panel.deaths[-1] = 0  # and with nobody dead there, its ages below are searched all the same
    borrowing = sensitivity.deaths_to_avoid(
        indicator("e0"), run(panel, find("almanac-1-borrow")), 0.01
    )
    assert np.isfinite(borrowing.deaths[panel.grid.position(60) : -1]).all()


@pytest.mark.fast
def test_infant_deaths_over_births_are_avoided_in_the_first_year() -> None:
    panel = of_a_whole(people=1e6, infant=0.02)
    chain = run(panel, find("almanac-1"))
    found = sensitivity.deaths_to_avoid(indicator("imr"), chain, -0.001)
    assert found.deaths[0] == pytest.approx(0.001 * 14_000)
    assert np.isnan(found.deaths[1:]).all()
    with pytest.raises(ValueError, match="a count over births"):
        sensitivity.elasticity(indicator("imr"), chain)


@pytest.mark.fast
def test_for_a_small_gain_it_is_the_gradient_per_death() -> None:
    chain = run(gompertz_panel(people=1e7), find("almanac-1"))
    found = sensitivity.deaths_to_avoid(indicator("e0"), chain, 1e-6).deaths
    per_death = -gradient(indicator("e0"), chain) / chain.rates.exposure
    np.testing.assert_allclose(found, 1e-6 / per_death, rtol=1e-3)


@pytest.mark.fast
def test_a_number_better_lower_has_a_gain_below_0() -> None:
    """H falls where early deaths are avoided, and rises where late ones are: out of reach."""
    panel = gompertz_panel(people=1e6, infant=0.02)
    chain = run(panel, find("almanac-1"))
    found = sensitivity.deaths_to_avoid(indicator("H"), chain, -1e-4)
    assert np.isfinite(found.deaths[0])
    assert found.most[0] < -1e-4
    late = panel.grid.position(90)
    assert found.most[late] > 0
    assert np.isnan(found.deaths[late])


@pytest.mark.fast
def test_deaths_to_avoid_in_a_batch_are_its_rows_bit_for_bit() -> None:
    """Also where some rows are done sooner, and some have nobody to save."""
    panel = gompertz_panel(seed=4, level=np.geomspace(1e-5, 1e-4, 6).reshape(2, 3), people=3e5)
    panel.deaths[0, 1, 3] = 0
    settings = find("almanac-1")
    together = sensitivity.deaths_to_avoid(indicator("e0"), run(panel, settings))
    assert together.most[0, 1, 3] == 0
    for where in np.ndindex(2, 3):
        alone = sensitivity.deaths_to_avoid(indicator("e0"), run(panel[where], settings))
        for name in ("deaths", "there", "most"):
            np.testing.assert_array_equal(getattr(alone, name), getattr(together, name)[where])
