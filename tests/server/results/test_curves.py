"""Curves behind death rates: smooth ones, single years out of groups, level and shape."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.graduation import PENALTIES
from engine.panel import Panel
from engine.settings import find as named
from server.results import curves
from server.results.holdings import NotInEdition
from server.results.laws import Fitted, best, fitted, rivals
from server.results.questions import CurvesQuestion, PopulationYear
from server.store.connect import Session
from server.store.heading import heading
from tests.factories import GRIDS, edition, gompertz_panel, gompertz_rates

FIVE, SINGLE = GRIDS["abridged"], GRIDS["single"]
PLAIN = named("almanac-1")
Z = 1.959963984540054  # of the normal distribution, 95 %


def smooth(panel: Panel, level: float = 0.95, settings: str = "almanac-1") -> curves.Smooth:
    found = curves.smooth(run(panel, named(settings)), level)
    assert found is not None
    return found


# ---- smooth curves -------------------------------------------------------------------------------


@pytest.mark.parametrize("grid", [SINGLE, FIVE], ids=["single", "five"])
def test_smooth_curves_find_the_rates_behind_many_deaths(grid: AgeGrid) -> None:
    found = smooth(gompertz_panel(grid, people=1e8))
    truth, grown = gompertz_rates(grid)[found.groups], grid.mids[found.groups] > 20
    assert_allclose(found.at_groups[0][grown], truth[grown], rtol=0.03)
    assert_allclose(found.graduated[grown], truth[grown], rtol=0.03)
    assert grid.starts[found.groups.start] == found.ages[0] == 10
    assert found.ages[-1] == grid.open_age


def test_limits_of_the_smooth_curve_are_even_on_the_scale_of_logarithms() -> None:
    panel = gompertz_panel(people=1e5, seed=4)
    wide, narrow = (np.log(smooth(panel, level).curve) for level in (0.95, 0.6826894921370859))
    assert_allclose(wide[2] - wide[0], wide[0] - wide[1], rtol=1e-9)
    assert_allclose(wide[2] - wide[0], Z * (narrow[2] - narrow[0]), rtol=1e-9)
    assert (wide[2] > wide[0]).all()


def test_the_band_holds_the_rates_behind_the_counts_about_as_often_as_it_says() -> None:
    truth, held = gompertz_rates(FIVE), []
    for seed in range(40):
        found = smooth(gompertz_panel(people=3e5, seed=seed))
        _value, low, high = found.at_groups
        held.append((low < truth[found.groups]) & (truth[found.groups] < high))
    assert 0.88 < np.mean(held) < 0.98


def test_the_curve_is_that_of_the_counts_under_smoothing_settings_too() -> None:
    panel = gompertz_panel(people=1e5, seed=4)
    plain, smoothed = (smooth(panel, settings=key) for key in ("almanac-1", "almanac-1-smooth"))
    assert_allclose(smoothed.curve, plain.curve, rtol=1e-12)


def dense_graduation(logs: Array, weights: Array) -> Array:
    """Whittaker and Henderson's sum of squares by full matrices, penalty by cross-validation."""
    size = len(logs)
    steps = np.diff(np.eye(size), 2, axis=0)
    best = (np.inf, logs)
    for penalty in PENALTIES * weights.mean():
        hat = np.linalg.solve(np.diag(weights) + penalty * steps.T @ steps, np.diag(weights))
        values = hat @ logs
        left = float(weights @ (values - logs) ** 2)
        score = size * left / (size - np.trace(hat)) ** 2
        best = min(best, (score, values), key=lambda pair: pair[0])
    return best[1]


def test_graduated_rates_are_those_of_full_matrices() -> None:
    panel = gompertz_panel(people=3e6, seed=2)
    found = smooth(panel)
    deaths, years = panel.deaths[found.groups], panel.exposure[found.groups]
    assert_allclose(
        np.log(found.graduated), dense_graduation(np.log(deaths / years), deaths), rtol=1e-6
    )


def test_groups_of_different_widths_are_not_graduated() -> None:
    found = smooth(gompertz_panel(GRIDS["irregular"], people=3e6, seed=2))
    assert np.isnan(found.graduated).all()
    assert np.isfinite(found.at_groups).all()


def test_no_curve_without_groups_or_deaths() -> None:
    few = gompertz_panel(people=3e6).regroup(AgeGrid((0, 1, 10, 20, 30)))
    nobody = replace(gompertz_panel(people=3e6), deaths=np.zeros(len(FIVE)))
    for panel in (few, nobody):
        assert curves.smooth(run(panel, PLAIN), 0.95) is None


# ---- single years --------------------------------------------------------------------------------


def test_single_years_are_those_that_were_grouped() -> None:
    ones = gompertz_panel(SINGLE, people=1e7)
    found = curves.single(ones.regroup(FIVE), 0.95)
    assert found is not None
    adult = slice(30, 95)
    truth = gompertz_rates(SINGLE)[adult]
    assert_allclose(found.rates[adult], truth, rtol=0.02)
    assert_allclose(found.rates_interpolated[adult], truth, rtol=0.1)
    assert np.all((found.low <= found.deaths) & (found.deaths <= found.high))


def test_sums_of_groups_are_kept_by_interpolation() -> None:
    panel = gompertz_panel(people=3e6, seed=5)
    found = curves.single(panel, 0.95)
    assert found is not None
    assert len(found.deaths) == FIVE.open_age
    for values, counted in (
        (found.interpolated, panel.deaths),
        (found.exposure, panel.exposure),
    ):
        assert_allclose(np.add.reduceat(values, FIVE.starts[:-1]), counted[:-1], rtol=1e-9)
    assert_allclose(np.add.reduceat(found.deaths, FIVE.starts[:-1]).sum(), panel.deaths[:-1].sum())


def test_limits_of_single_years_are_as_wide_as_their_level_asks() -> None:
    panel = gompertz_panel(people=3e6, seed=5)
    wide, narrow = (curves.single(panel, level) for level in (0.95, 0.6826894921370859))
    assert wide is not None
    assert narrow is not None
    assert_allclose(wide.high / wide.deaths, wide.deaths / wide.low, rtol=1e-9)
    assert_allclose(np.log(wide.high / wide.deaths), Z * np.log(narrow.high / narrow.deaths))


def test_single_years_are_worked_out_only_from_groups_with_deaths_enough() -> None:
    assert curves.single(gompertz_panel(SINGLE, people=1e7), 0.95) is None
    panel = gompertz_panel(people=3e6)
    for wanted, known in ((curves.LEAST_SINGLE + 1, True), (curves.LEAST_SINGLE - 1, False)):
        share = wanted / panel.deaths[:-1].sum()
        found = curves.single(replace(panel, deaths=share * panel.deaths), 0.95)
        assert (found is not None) == known


# ---- level and shape -----------------------------------------------------------------------------


def part(share: float = 0.2, *, times: Array | float = 1.0) -> Panel:
    """A scaled copy of its whole, with so many times its deaths."""
    whole = gompertz_panel(people=4e6)
    own = Panel.of(FIVE, share * times * whole.deaths, share * whole.exposure, sex="f")
    return replace(own, whole=whole)


def related(panel: Panel) -> curves.Related:
    found = curves.related(run(panel, PLAIN), "Isle")
    assert found is not None
    return found


def test_a_scaled_copy_has_level_0_and_shape_1() -> None:
    found = related(part())
    assert found.area == "Isle"
    assert found.level.value == pytest.approx(0, abs=1e-6)
    assert found.shape.value == pytest.approx(1, abs=1e-6)
    assert found.level.low < 0 < found.level.high
    assert found.shape.low < 1 < found.shape.high
    assert not found.misses
    assert found.freedom == len(FIVE) - 1 - 2


def test_more_deaths_at_every_age_raise_the_level_and_steeper_ones_the_shape() -> None:
    assert related(part(times=1.2)).level.low > 0
    assert related(part(times=0.8)).level.high < 0
    old = np.array(FIVE.starts) >= 75
    assert related(part(times=np.where(old, 1.2, 0.8))).shape.low > 1
    assert related(part(times=np.where(old, 0.8, 1.2))).shape.high < 1


def test_what_no_level_and_shape_explain_is_told() -> None:
    assert related(part(times=np.where(np.array(FIVE.starts) == 60, 1.5, 1.0))).misses


def test_the_level_is_read_where_half_of_the_whole_are_alive() -> None:
    panel = part()
    assert panel.whole is not None
    table = run(panel.whole, PLAIN).table
    half = np.interp(-0.5, -table.lx, np.array(FIVE.starts))
    assert related(panel).median == pytest.approx(half, abs=1e-9)
    short = AgeGrid(FIVE.starts[: FIVE.position(60) + 1])
    assert np.isnan(related(panel.regroup(short)).median)


def test_without_a_whole_nothing_is_set_against_it() -> None:
    assert curves.related(run(gompertz_panel(people=4e6), PLAIN), "Isle") is None
    nobody = replace(part(), deaths=np.zeros(len(FIVE)))
    assert curves.related(run(nobody, PLAIN), "Isle") is None


# ---- all together --------------------------------------------------------------------------------


def found(session: Session, of: str, settings: str = "almanac-1", number: int = 1) -> curves.Curves:
    question = CurvesQuestion(PopulationYear.parse(of), settings=settings)
    return curves.curves(session, heading(session, "isle", number), question)


@pytest.fixture
def isle(session: Session) -> Session:
    """Two halves of an isle through three years, and a rock on which hardly anybody lives."""
    panels = {}
    for seed, year in enumerate(("2012", "2013", "2014")):
        panels[f"north.f.{year}"] = gompertz_panel(people=1e6, seed=seed)
        panels[f"south.f.{year}"] = gompertz_panel(people=1e6, seed=seed + 9, level=2.4e-5)
        panels[f"rock.f.{year}"] = gompertz_panel(people=4e3, seed=seed)
    edition(session, panels, parents=dict.fromkeys(("north", "south", "rock"), "isle"))
    return session


def test_an_area_is_set_against_the_one_it_lies_in(isle: Session) -> None:
    north, south, whole = (found(isle, f"{area}.f.2014") for area in ("north", "south", "isle"))
    assert north.parent == "isle"
    assert north.related is not None
    assert south.related is not None
    assert north.related.area == "Isle"
    assert north.related.level.high < 0 < south.related.level.low
    assert (whole.parent, whole.related) == ("", None)


def test_years_are_pooled_as_the_settings_say(isle: Session) -> None:
    one, three = (found(isle, "north.f.2014", key) for key in ("almanac-1", "almanac-1-3-years"))
    assert one.best is not None
    assert three.best is not None
    assert (one.period, three.period) == ("2014", "2012–2014")
    assert three.best.fit.deaths.sum() > 2.5 * one.best.fit.deaths.sum()
    assert three.best.slope.high - three.best.slope.low < one.best.slope.high - one.best.slope.low


def test_hardly_anybody_bears_no_curve(isle: Session) -> None:
    rock = found(isle, "rock.f.2014")
    assert rock.laws == ()
    assert (rock.best, rock.smooth, rock.single, rock.related) == (None, None, None, None)


def test_a_newer_edition_is_measured_by_the_same_law(isle: Session) -> None:
    assert found(isle, "north.f.2014").moved is None
    steeper = gompertz_panel(people=1e6, seed=1, slope=0.11, level=1e-5)
    edition(isle, {"north.f.2014": steeper}, parents={"north": "isle"})
    old, new = (found(isle, "north.f.2014", number=number) for number in (1, 2))
    assert old.moved is not None
    assert old.best is not None
    same = next(one for one in new.laws if one.law is old.best.law)
    assert old.moved.value == pytest.approx(same.slope.value, rel=1e-12)


def test_what_is_not_held_is_refused(isle: Session) -> None:
    with pytest.raises(NotInEdition, match="does not hold"):
        found(isle, "north.m.2014")


# ---- what else is said of laws -------------------------------------------------------------------


def laws_of(panel: Panel) -> dict[str, Fitted]:
    return {one.law.key: one for one in fitted(panel, 0.95)}


def test_rivals_are_other_laws_of_the_same_ages_hardly_worse() -> None:
    laws = laws_of(gompertz_panel(SINGLE, people=2e5, seed=3))
    of = min(
        (laws[key] for key in ("gompertz", "kannisto", "makeham")), key=lambda one: one.fit.aic
    )
    near = rivals(tuple(laws.values()), of)
    assert near
    assert of not in near
    for one in near:
        assert one.first == 40
        assert 0 <= one.fit.aic - of.fit.aic < 2
    many = laws_of(gompertz_panel(people=1e8))
    assert rivals(tuple(many.values()), many["makeham"]) == ()


def test_a_law_with_a_term_at_nought_is_no_rival() -> None:
    panel = gompertz_panel(people=1e7, accidents=0.0)
    lower = np.array(FIVE.starts) < 60
    laws = laws_of(replace(panel, deaths=np.where(lower, 0.9, 1.0) * panel.deaths))
    assert laws["makeham"].bounded
    assert laws["makeham"].fit.aic == pytest.approx(laws["gompertz"].fit.aic)
    assert laws["makeham"] not in rivals(tuple(laws.values()), laws["gompertz"])


def test_the_measure_of_misfit_is_rough_where_few_deaths_are_expected() -> None:
    for people, rough in ((1e4, True), (4e6, False)):
        one = laws_of(gompertz_panel(people=people))["gompertz"]
        few = np.mean(one.fit.exposure * one.fit.rates < 5)
        assert (few > 0.2) == rough == one.rough


def test_a_law_of_all_ages_is_never_the_best_of_adults() -> None:
    laws = laws_of(gompertz_panel(people=3e6, seed=1))
    assert best((laws["makeham_infant"], laws["siler"])) is None
    assert best((laws["siler"], laws["gompertz"])) is laws["gompertz"]
