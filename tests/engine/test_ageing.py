"""The rise of death rates with age, over a span and between neighbours."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.stats import binomtest

from engine.ageing import rises, slope, within
from engine.ages import AgeGrid
from engine.panel import Panel
from tests.factories import GRIDS, gompertz_panel

SPAN = (40, 84)


@pytest.mark.parametrize("name", GRIDS)
@pytest.mark.parametrize("people", [3_000, 5_000_000])
def test_the_slope_maximises_the_poisson_likelihood(name: str, people: float) -> None:
    panel = gompertz_panel(GRIDS[name], people=people, seed=7)
    inside = within(panel.grid, SPAN)
    x, deaths, years = panel.grid.mids[inside], panel.deaths[inside], panel.exposure[inside]

    def minus_log_likelihood(ab: np.ndarray) -> float:
        eta = ab[0] + ab[1] * (x - 62)
        return float((years * np.exp(eta) - deaths * eta).sum() / deaths.sum())

    best = minimize(minus_log_likelihood, [-4.0, 0.1], method="BFGS", options={"gtol": 1e-12})
    got = slope(panel.grid, panel.deaths / panel.exposure, panel.exposure, SPAN).value
    assert got == pytest.approx(best.x[1], abs=2e-7)


def test_the_slope_of_a_gompertz_law_is_its_own() -> None:
    slopes = np.array([0.0, 0.03, 0.095, 0.2])
    panel = gompertz_panel(slope=slopes, level=0.01 / np.exp(62 * slopes), accidents=0.0)
    got = slope(panel.grid, panel.deaths / panel.exposure, panel.exposure, SPAN).value
    np.testing.assert_allclose(got, slopes, atol=1e-12)


def test_only_closed_groups_wholly_inside_the_span_count() -> None:
    grid = AgeGrid((0, 35, 42, 50, 60, 70, 80, 90))
    assert grid.labels[within(grid, (40, 84))] == ("42–49", "50–59", "60–69", "70–79")
    assert grid.labels[within(grid, (42, 200))][-1] == "80–89"
    assert grid.labels[within(grid, (200, 300))] == ()
    five = GRIDS["abridged"].labels[within(GRIDS["abridged"], (40, 84))]
    assert (five[0], five[-1]) == ("40–44", "80–84")  # both ends of the span are in it


def test_no_slope_from_two_groups_or_from_deaths_in_one() -> None:
    grid, years = AgeGrid((0, 40, 60, 90)), np.full(4, 1e5)
    two = slope(grid, np.array([0.01, 0.02, 0.03, 0.04]), years, (40, 84))
    assert np.isnan(two.value)
    assert np.isnan(two.gradient).all()
    grid, years = AgeGrid((0, 40, 50, 60, 70)), np.full(5, 1e5)
    one = slope(grid, np.array([0.01, 0, 0.02, 0, 0.04]), years, (40, 84))
    assert np.isnan(one.value)


def test_k_is_the_log_ratio_of_neighbours_with_the_exact_binomial_limits() -> None:
    panel = gompertz_panel(GRIDS["single"], people=200_000, seed=3)
    got = rises(panel, least_deaths=100)
    coarse = panel.regroup(AgeGrid((*range(0, 101, 5),)))
    np.testing.assert_array_equal(got.at, range(5, 100, 5))
    shown = 0
    for k, age in enumerate(range(5, 100, 5)):
        i = age // 5
        (d1, d2), (e1, e2) = coarse.deaths[i - 1 : i + 1], coarse.exposure[i - 1 : i + 1]
        if min(d1, d2) < 100:
            assert np.isnan([got.value[k], got.low[k], got.high[k]]).all()
            continue
        shown += 1
        share = binomtest(int(d2), int(d1 + d2)).proportion_ci(0.95, "exact")
        low, high = (np.log(p / (1 - p) * e1 / e2) / 5 for p in share)
        assert got.value[k] == pytest.approx(np.log(d2 / e2 / (d1 / e1)) / 5, abs=1e-14)
        assert got.low[k] == pytest.approx(low, abs=1e-9)
        assert got.high[k] == pytest.approx(high, abs=1e-9)
    assert 5 < shown < 19


def test_k_of_single_years_is_k_of_their_five_year_groups() -> None:
    single = gompertz_panel(GRIDS["single"], people=1e6, seed=5)
    fine, coarse = rises(single), rises(single.regroup(GRIDS["abridged"]))
    for name in ("at", "value", "low", "high"):
        np.testing.assert_array_equal(getattr(fine, name), getattr(coarse, name))


def test_k_only_between_groups_of_the_width() -> None:
    grid = AgeGrid((0, 5, 10, 20, 25, 30, 32, 35, 40, 45))
    got = rises(Panel.of(grid, np.full(10, 500.0), np.full(10, 1e4), sex="f"))
    # 30–31 and 32–34 are summed to 30–34; 10–19 has no neighbour of its width, nor the open group
    np.testing.assert_array_equal(got.at, [5, 25, 30, 35, 40])


@pytest.mark.parametrize("few", [1, 2])
def test_k_only_where_both_groups_have_the_deaths(few: int) -> None:
    deaths = np.full(5, 100.0)
    deaths[few] = 99
    got = rises(Panel.of(AgeGrid((0, 5, 10, 15, 20)), deaths, np.full(5, 1e4), sex="f"))
    np.testing.assert_array_equal(got.at, [5, 10, 15])
    touched = [few in (pair, pair + 1) for pair in range(3)]
    np.testing.assert_array_equal(np.isnan(got.value), touched)
    np.testing.assert_array_equal(np.isnan(got.low), touched)


def test_k_at_another_level_is_narrower() -> None:
    panel = gompertz_panel(seed=2)
    wide, narrow = rises(panel, level=0.95), rises(panel, level=0.5)
    known = np.isfinite(wide.value)
    assert np.all((narrow.high - narrow.low)[known] < (wide.high - wide.low)[known])


def test_deaths_that_were_shared_out_do_not_make_k_surer() -> None:
    panel = gompertz_panel(GRIDS["abridged"], people=400_000, seed=3)
    counted = np.round(panel.deaths / np.linspace(1, 1.3, len(panel.grid)))
    got = rises(replace(panel, counted=counted), least_deaths=100)
    at = panel.grid.position(80)
    (c1, c2), (d1, d2) = counted[at - 1 : at + 1], panel.deaths[at - 1 : at + 1]
    (e1, e2), k = panel.exposure[at - 1 : at + 1], list(got.at).index(80)
    assert got.value[k] == pytest.approx(np.log(d2 / e2 / (d1 / e1)) / 5, abs=1e-14)
    share = binomtest(int(c2), int(c1 + c2)).proportion_ci(0.95, "exact")
    worth = (d2 / c2) / (d1 / c1)
    low, high = (np.log(p / (1 - p) * worth * e1 / e2) / 5 for p in share)
    assert (got.low[k], got.high[k]) == pytest.approx((low, high), abs=1e-9)
