"""Sensitivity of e0 to survival, and the short cut that holds in one kind of table only."""

from dataclasses import replace

import numpy as np
import pytest

from engine import sensitivity
from engine.ages import AgeGrid
from engine.chain import gradient, run
from engine.indicators import find as indicator
from engine.settings import SETTINGS, find
from engine.stages.separation import separate
from engine.tables import LifeTable, Partials, from_qx, from_rates, pull
from tests.factories import GRIDS, gompertz_panel


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
    return from_qx(grid, qx, np.full(111, 0.5))


@pytest.mark.fast
def test_it_is_the_printed_form_and_the_derivative() -> None:
    table = run(gompertz_panel(GRIDS["irregular"], level=2e-5), find("almanac-1")).table
    found = sensitivity.of_survival(table)
    np.testing.assert_allclose(found, printed_form(table), rtol=1e-12)
    g, n, a = (
        pull(table, Partials(ex=np.eye(len(table.grid))[0])).mx[:-1],
        table.grid.widths[:-1],
        table.ax[:-1],
    )
    per_m = n / (1 + (n - a) * table.mx[:-1]) ** 2
    np.testing.assert_allclose(found, -g / per_m, rtol=1e-12)


@pytest.mark.fast
def test_the_short_cut_holds_for_closed_single_years_with_a_half() -> None:
    table = closed_single_years()
    assert (table.qx[:-2] < 1).all()
    np.testing.assert_allclose(
        sensitivity.of_survival(table)[:-1], short_cut(table)[:-1], rtol=1e-12
    )


@pytest.mark.fast
@pytest.mark.parametrize(
    ("name", "least"), [("open at 85, single years", 0.02), ("abridged to 100", 0.7)]
)
def test_elsewhere_it_errs(name: str, least: float, capsys: pytest.CaptureFixture[str]) -> None:
    grid = AgeGrid(tuple(range(86))) if "85" in name else GRIDS["abridged"]
    table = run(gompertz_panel(grid), find("almanac-1")).table
    right, cut = sensitivity.of_survival(table), short_cut(table)
    with capsys.disabled():
        for age in (0, 40, 80):
            x = grid.position(age)
            print(f"\n  sum of l beyond {age:2}, {name}: {cut[x]:7.3f} for {right[x]:7.3f}", end="")
    x = grid.position(40)
    assert right[x] - cut[x] > least * right[x]


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
def test_what_is_not_read_off_the_table_has_no_such_gain() -> None:
    chain = run(gompertz_panel(), find("almanac-1"))
    with pytest.raises(ValueError, match="not off the table"):
        sensitivity.gain_per_percent(indicator("ageing_rate"), chain)
