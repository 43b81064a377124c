"""Tables without a cause: constant hazards in closed form, integrals, and the chain run again."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from engine.ages import AgeGrid
from engine.causes.counts import CauseCounts
from engine.causes.deletion import GAIN, GAIN_UNIFORM, deleted, gain
from engine.causes.number import estimates
from engine.causes.parting import part
from engine.chain import run
from engine.estimates import Reason
from engine.panel import Panel
from engine.settings import SETTINGS
from tests.factories import GRIDS, gompertz_panel, parted

pytestmark = pytest.mark.fast
STEADY, PLAIN = SETTINGS["almanac-1-constant-rate"], SETTINGS["almanac-1"]


@pytest.mark.parametrize("taken", [1.0, 0.25, 0.0])
def test_two_constant_hazards(taken: float) -> None:
    """e(0) = 1 / (m1 + m2); without a part of the first, 1 / ((1 - part) m1 + m2)."""
    grid = AgeGrid((0, 1, 5, 10, *range(40, 100, 5)))
    years = np.full(len(grid), 1e6)
    m1, m2 = 0.005, 0.02
    causes = CauseCounts(np.stack([m1 * years, m2 * years]))
    panel = Panel.of(grid, (m1 + m2) * years, years, sex="f")
    for law, settings, exact in (("constant_ratio", STEADY, 1e-12), ("uniform", STEADY, 2e-2)):
        one = gain(part=taken, law=law)
        found = estimates([one], panel, causes, settings)[one.key]
        expected = 1 / ((1 - taken) * m1 + m2) - 1 / (m1 + m2)
        assert_allclose(found.value[0], expected, rtol=exact, atol=1e-6)
        other = 1 / (m1 + (1 - taken) * m2) - 1 / (m1 + m2)
        assert_allclose(found.value[1], other, rtol=exact, atol=1e-6)


def test_steady_rates_are_the_chain_run_on_the_rates_left() -> None:
    panel = gompertz_panel(GRIDS["irregular"], seed=4, slope=np.array([0.09, 0.1]))
    causes = parted(panel)
    for taken in (1.0, 0.4):
        tables = deleted(part(panel, causes, STEADY), part=taken).table
        for cause in range(3):
            fewer = replace(panel, deaths=panel.deaths - taken * causes.deaths[..., cause, :])
            assert_allclose(tables.ex[cause], run(fewer, STEADY).table.ex, rtol=1e-10)


@pytest.mark.parametrize("settings", ["almanac-1", "almanac-2", "almanac-1-kannisto"])
def test_other_chains_come_near_the_chain_run_again_and_the_two_laws_near_each_other(
    settings: str,
) -> None:
    panel = gompertz_panel(seed=4, people=5e6)
    chosen = SETTINGS[settings]
    share = np.linspace(0.3, 0.1, len(panel.grid))
    causes = CauseCounts(np.stack([share, 1 - share]) * panel.deaths)
    found = estimates([GAIN, GAIN_UNIFORM], panel, causes, chosen)
    fewer = replace(panel, deaths=panel.deaths - causes.deaths[0])
    again = (run(fewer, chosen).table.ex - run(panel, chosen).table.ex)[0]
    assert found["gain"].value[0] == pytest.approx(again, rel=0.02)
    assert found["gain_uniform"].value[0] == pytest.approx(again, rel=0.02)


def test_gompertz_and_accidents_by_quadrature() -> None:
    """Single ages: without either of two known forces, the integral of the other's survivors."""
    a, b, c = 2e-5, 0.1, 4e-4
    grid = GRIDS["single"]
    starts = np.array(grid.starts, float)

    def survivors(x: float, senescent: float, steady: float) -> float:
        return float(np.exp(-senescent * a / b * np.expm1(b * x) - steady * c * x))

    def alive(senescent: float, steady: float) -> float:
        value, _ = quad(survivors, 0, 140, args=(senescent, steady), limit=400)
        return value

    def rates(senescent: float, steady: float) -> np.ndarray:
        """Each force's deaths over the years of the stationary population of both."""
        found = []
        for x, end in zip(starts, [*starts[1:], 140.0], strict=True):
            years, _ = quad(survivors, x, end, args=(1, 1))
            of_force = lambda t: survivors(t, 1, 1) * (senescent * a * np.exp(b * t) + steady * c)  # noqa: E731
            deaths, _ = quad(of_force, x, end)
            found.append(deaths / years)
        return np.array(found)

    years = np.full(len(grid), 1e6)
    causes = np.stack([rates(1, 0) * years, rates(0, 1) * years])
    panel = Panel.of(grid, causes.sum(axis=0), years, sex="f")
    found = estimates([GAIN], panel, CauseCounts(causes), PLAIN)["gain"].value
    assert found[1] == pytest.approx(alive(1, 0) - alive(1, 1), abs=2e-3)
    # without senescence most outlive any table; at half of it some 12 % reach the open group
    half = gain(part=0.5)
    found = estimates([half], panel, CauseCounts(causes), PLAIN)[half.key].value
    assert found[0] == pytest.approx(alive(0.5, 1) - alive(1, 1), abs=0.08)


def test_gains_do_not_add_up_and_nothing_taken_gains_nothing() -> None:
    panel = gompertz_panel(seed=4)
    causes = parted(panel)
    joined = CauseCounts(np.stack([causes.deaths[0] + causes.deaths[1], causes.deaths[2]]))
    apart = estimates([GAIN], panel, causes, PLAIN)["gain"].value
    together = estimates([GAIN], panel, joined, PLAIN)["gain"].value
    assert together[0] > apart[0] + apart[1] + 0.1
    still = estimates([gain(part=0.0)], panel, causes, PLAIN)["gain_0"]
    assert_allclose(still.value, 0, atol=1e-12)


def test_a_cause_that_has_all_deaths_of_the_open_group_has_no_gain() -> None:
    panel = gompertz_panel(seed=4)
    deaths = parted(panel).deaths.copy()
    deaths[2, -1], deaths[:2, -1] = panel.deaths[-1], 0.0
    found = estimates([GAIN], panel, CauseCounts(deaths), PLAIN)["gain"]
    assert np.isnan(found.value[2])
    assert found.reason[2] == Reason.NO_DEATHS_IN_OPEN_GROUP
    assert np.isfinite(found.value[:2]).all()


def test_parts_and_laws_that_are_none_are_refused() -> None:
    panel = gompertz_panel(seed=4)
    whole = part(panel, parted(panel), PLAIN)
    with pytest.raises(ValueError, match="lies between 0 and 1"):
        deleted(whole, part=1.5)
    with pytest.raises(ValueError, match="the names are constant_ratio, uniform"):
        deleted(whole, law="even")
