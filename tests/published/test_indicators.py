"""Indicators against values computed elsewhere, and against laws whose values are known exactly."""

import csv
import json
from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import brentq
from scipy.special import exp1

from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.indicators import INDICATORS, estimate, find
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.streams import poisson_draws
from engine.tables import LifeTable, from_rates
from tests.factories import survivors_table
from tests.published import denmark

SETTINGS_1 = SETTINGS["almanac-1"]
LAWS = json.loads((denmark.HERE / "closed_forms.json").read_text(encoding="utf-8"))
COLUMNS = {
    "e0": "e0",
    "e65": "e65",
    "median": "median",
    "mode_raw": "mode_raw",
    "mode_parabola": "mode_kannisto",
    "edagger": "edagger_A",
    "H": "H_A",
    "45q15": "q45_15",
    "40q30": "q30_70_allcause",
    "sd0": "sd",
    "e80": "e80",
}
FIVE_YEARS = (  # what five-year groups make of Danish figures, as the definitions say: least, most
    ("edagger", 0.07, 0.16),
    ("H", 0.001, 0.0021),
    ("sd0", -0.035, 0.035),
    ("sd10", -0.035, 0.035),
    ("cv", -0.0005, 0.0005),
    ("gini", -0.0008, 0.0),
    ("aid", -0.07, 0.0),
    ("theil", -0.0002, 0.0002),
    ("mld", -0.001, 0.001),
    ("lower_quartile", -0.25, 0.25),
    ("upper_quartile", -0.25, 0.25),
    ("iqr", -0.4, 0.4),
    ("shortest_half", -0.52, 0.52),
    ("edagger_early", -0.05, 0.05),
    ("edagger_late", 0.0, 0.2),
    ("threshold_edagger", -0.3, 0.0),
    ("threshold_H", -0.3, 0.0),
)


@pytest.mark.parametrize("sex", denmark.SEXES)
@pytest.mark.parametrize(("key", "column"), COLUMNS.items())
def test_denmark(sex: str, key: str, column: str) -> None:
    """Eight digits are printed; all years of a sex in one call."""
    got = estimate(find(key), denmark.panel(sex), SETTINGS_1)
    np.testing.assert_allclose(got.value, denmark.summary(sex, column), rtol=1e-6)


@pytest.mark.parametrize("sex", denmark.SEXES)
@pytest.mark.parametrize(
    ("key", "column", "apart"),
    [("gini", "gini_B", 1e-4), ("edagger", "edagger_B", 0.012), ("H", "H_B", 1.5e-4)],
)
def test_denmark_where_the_death_rate_is_level_within_the_year(
    sex: str, key: str, column: str, apart: float
) -> None:
    """Another convention inside a year of age, which moves the figure by little."""
    got = find(key).value(run(denmark.panel(sex), SETTINGS_1))
    np.testing.assert_allclose(got, denmark.summary(sex, column), rtol=0, atol=apart)


@pytest.mark.parametrize("sex", denmark.SEXES)
@pytest.mark.parametrize("age", [50, 60, 70, 80])
def test_denmarks_rates_of_five_years_rise_as_the_tables_deaths_over_years(
    sex: str, age: int
) -> None:
    table = run(denmark.panel(sex), SETTINGS_1).table
    deaths, years = (
        np.add.reduceat(column, np.arange(0, 100, 5), axis=-1) for column in (table.dx, table.Lx)
    )
    rates = deaths / years
    rise = np.log(rates[:, age // 5] / rates[:, age // 5 - 1]) / 5
    np.testing.assert_allclose(rise, denmark.summary(sex, f"LAR5_{age}"), rtol=1e-6)


@pytest.mark.parametrize("sex", denmark.SEXES)
@pytest.mark.parametrize(("key", "least", "most"), FIVE_YEARS)
def test_groups_of_five_years_move_a_figure_by_what_is_said(
    key: str, least: float, most: float, sex: str
) -> None:
    single = denmark.panel(sex)
    fives, ones = (run(one, SETTINGS_1) for one in (single.regroup(denmark.ABRIDGED), single))
    more = INDICATORS[key].value(fives) - INDICATORS[key].value(ones)
    assert least < more.min() < more.max() < most


@pytest.mark.parametrize("sex", denmark.SEXES)
def test_denmarks_quartiles_and_shortest_half(sex: str) -> None:
    chain = run(denmark.panel(sex), SETTINGS_1)
    for row, lx in enumerate(chain.table.lx):
        at = lambda share, lx=lx: np.interp(-share, -lx, np.arange(100.0))  # noqa: E731
        for key, share in (("lower_quartile", 0.75), ("upper_quartile", 0.25)):
            assert INDICATORS[key].value(chain)[row] == pytest.approx(at(share), abs=1e-9)
        begins = np.linspace(lx[-1] + 0.5, 1, 5_001)
        spans = at(begins - 0.5) - at(begins)
        assert INDICATORS["shortest_half"].value(chain)[row] == pytest.approx(spans.min(), abs=0.01)


def test_austrias_children_before_5() -> None:
    """The printed survivors at 5, of 100,000 born: half a death is half the last digit."""
    with open(denmark.HERE / "austria_males_1992.csv", encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    grid = AgeGrid(tuple(int(row["age"]) for row in rows))
    deaths, years = (
        np.array([float(row[name]) for row in rows]) for name in ("deaths", "population")
    )
    printed = np.array([float(row["ax"]) for row in rows[:-1]])
    ax = np.append(printed, years[-1] / deaths[-1])
    table = from_rates(grid, deaths / years, ax)
    assert 1e5 * read("5q0", table) == pytest.approx(1e5 - float(rows[2]["lx"]), abs=0.5)
    survivors = {int(row["age"]): float(row["lx"]) for row in rows}
    expected = 1 - survivors[60] / survivors[15]
    assert read("45q15", table) == pytest.approx(expected, abs=1e-5)


@pytest.mark.parametrize("sex", denmark.SEXES)
def test_denmarks_smooth_mode_is_near_the_parabolas_and_jumps_less(sex: str) -> None:
    """No smooth mode is printed; over 39 years it must follow the parabola's with less noise."""
    smooth = INDICATORS["mode"].value(run(denmark.panel(sex), SETTINGS_1))
    parabola = denmark.summary(sex, "mode_kannisto")
    assert abs(np.mean(smooth - parabola)) < 0.4
    assert np.abs(np.diff(smooth)).mean() < 0.75 * np.abs(np.diff(parabola)).mean()


def simulated() -> list[tuple[str, int, float]]:
    return [
        (row["sex"], int(row["year"]), float(row["mc_sd_e0"]))
        for row in denmark.rows("denmark_e0_simulated.csv")
    ]


@pytest.mark.parametrize(("sex", "year", "spread"), simulated())
def test_denmarks_e0_spreads_as_simulated_elsewhere(sex: str, year: int, spread: float) -> None:
    panel = denmark.one(sex, year)
    e0 = INDICATORS["e0"]
    got = estimate(e0, panel, SETTINGS_1)
    assert got.se == pytest.approx(spread, rel=0.02)
    deaths = poisson_draws(panel.deaths, np.array(f"{sex}.{year}"), 4000, "test")
    own = replace(
        panel,
        deaths=deaths,
        exposure=np.broadcast_to(panel.exposure, deaths.shape),
        infant_weight=np.broadcast_to(panel.infant_weight, (4000, 2)),
        infant_ratio=np.broadcast_to(panel.infant_ratio, (4000, 2)),
    )
    assert e0.value(run(own, SETTINGS_1)).std() == pytest.approx(spread, rel=0.04)


def read(key: str, table: LifeTable) -> float:
    """An indicator of a table that no panel gave."""
    grid = table.grid
    panel = Panel.of(grid, np.ones(len(grid)), np.ones(len(grid)), sex="f")
    return float(find(key).value(replace(run(panel, SETTINGS_1), table=table)))


def law_of(name: str, **near: float) -> dict[str, float]:
    """Exact values of the entry of this name whose parameters are these."""
    return next(
        entry["exact"]
        for entry in LAWS
        if entry["name"] == name and near.items() <= entry["params"].items()
    )


def gompertz_table(level: float, slope: float) -> LifeTable:
    """Single years to 109 of a Gompertz law: l(x) exact, a(x) from its integral."""
    ages = np.arange(110.0)
    cumulated = lambda x: level / slope * np.expm1(slope * x)  # noqa: E731
    inner, weight = np.polynomial.legendre.leggauss(16)
    inside = ages[:-1, None] + (inner + 1) / 2
    lx = np.exp(-cumulated(ages))
    years = (np.exp(-cumulated(inside)) * weight / 2).sum(axis=-1)
    ax = (years - lx[1:]) / (lx[:-1] - lx[1:])
    z = level / slope * np.exp(slope * ages[-1])
    last = np.exp(z) * exp1(z) / slope
    return survivors_table(AgeGrid(tuple(range(110))), lx, np.append(ax, last))


@pytest.mark.parametrize("ends", [20, 60, 100])
def test_at_a_constant_hazard_all_is_lost_with_every_death(ends: int) -> None:
    exact = law_of("constant hazard")
    hazard = 1 / exact["e0"]
    grid = AgeGrid((0, 1, *range(5, ends + 1, 5)))
    n: Array = grid.widths
    n[-1] = 1.0
    ax = 1 / hazard - n / np.expm1(hazard * n)
    ax[-1] = 1 / hazard
    table = from_rates(grid, np.full(len(grid), hazard), ax)
    assert read("e0", table) == pytest.approx(exact["e0"], rel=1e-12)
    assert read("edagger", table) == pytest.approx(exact["edagger"], rel=1e-12)
    assert read("H", table) == pytest.approx(exact["H"], rel=1e-12)


def test_a_constant_hazard_is_half_as_unequal_as_can_be() -> None:
    """Groups of a year against a mean of 500: what stands at one age in each is of no weight, and
    the rest of lives is in the open group, whose lengths follow the law itself."""
    grid, hazard = AgeGrid(tuple(range(1001))), 1 / 500
    ax = np.full(1001, 1 / hazard - 1 / np.expm1(hazard))
    ax[-1] = 1 / hazard
    table = from_rates(grid, np.full(1001, hazard), ax)
    exact = law_of("constant hazard")
    assert read("e0", table) == pytest.approx(500, rel=1e-12)
    assert read("gini", table) == pytest.approx(exact["gini"], abs=1e-6)
    assert read("aid", table) == pytest.approx(250, rel=1e-5)
    assert read("sd0", table) == pytest.approx(500, rel=1e-6)
    assert read("cv", table) == pytest.approx(1, rel=1e-6)
    assert read("sd10", table) == pytest.approx(500, rel=1e-6)
    assert read("theil", table) == pytest.approx(1 - np.euler_gamma, abs=1e-5)
    assert read("mld", table) == pytest.approx(np.euler_gamma, abs=1e-3)
    assert read("lower_quartile", table) == pytest.approx(500 * np.log(4 / 3), abs=1e-3)
    assert read("upper_quartile", table) == pytest.approx(500 * np.log(4), abs=1e-3)
    assert read("iqr", table) == pytest.approx(500 * np.log(3), abs=1e-3)
    assert read("shortest_half", table) == pytest.approx(500 * np.log(2), abs=1e-3)
    assert np.isnan(read("threshold_edagger", table))  # e-dagger is all of life at any age


@pytest.mark.parametrize("starts", [tuple(range(101)), (0, 1, *range(5, 101, 5))])
def test_where_survivors_fall_on_a_line_half_of_life_is_lost(starts: tuple[int, ...]) -> None:
    exact = law_of("de Moivre (linear l(x))")
    middles = np.append(np.diff(starts) / 2, 1e-14)  # nobody reaches 100, where no life is left
    table = survivors_table(AgeGrid(starts), 1 - np.array(starts) / 100, middles)
    for key in ("e0", "edagger", "H", "median"):
        assert read(key, table) == pytest.approx(exact[key], rel=1e-12)
    for key, quantile in (("lower_quartile", 25), ("upper_quartile", 75), ("iqr", 50)):
        assert read(key, table) == pytest.approx(quantile, rel=1e-12)
    assert read("shortest_half", table) == pytest.approx(50, rel=1e-12)
    # ages at death n apart, and spread evenly between: n^2 / 12 of their variance is lost
    width = np.diff(starts)
    lost = (width**3 / 12 / 100).sum()
    assert read("sd0", table) == pytest.approx(np.sqrt(exact["sd"] ** 2 - lost), rel=1e-9)
    short = (width**3 / 6 / 100**2).sum()
    assert read("gini", table) == pytest.approx(exact["gini"] - short / 50, rel=1e-9)
    assert read("threshold_edagger", table) == pytest.approx(100 * (1 - np.exp(-0.5)), abs=0.02)
    assert read("threshold_H", table) == pytest.approx(100 * (1 - np.exp(-1)), abs=0.02)


@pytest.mark.parametrize(("level", "slope"), [(5e-5, 0.095), (2e-5, 0.105)])
def test_a_gompertz_law(level: float, slope: float) -> None:
    exact = law_of("Gompertz", a=level, b=slope)
    table = gompertz_table(level, slope)
    assert read("e0", table) == pytest.approx(exact["e0"], abs=1e-8)
    # the sum takes e(x) as straight within a year of age
    assert read("edagger", table) == pytest.approx(exact["edagger"], rel=2e-4)
    assert read("H", table) == pytest.approx(exact["H"], rel=2e-4)
    assert read("median", table) == pytest.approx(exact["median"], abs=0.01)
    assert read("gini", table) == pytest.approx(exact["gini"], rel=1e-3)
    assert read("sd0", table) ** 2 == pytest.approx(exact["sd"] ** 2 - 1 / 12, rel=1e-4)
    assert read("mode_raw", table) == np.floor(exact["mode"])
    assert read("mode_parabola", table) == pytest.approx(exact["mode"], abs=0.03)


@pytest.mark.parametrize(("level", "slope"), [(5e-5, 0.095), (2e-5, 0.105)])
def test_the_threshold_ages_of_a_gompertz_law(level: float, slope: float) -> None:
    """Life left and years lost at any age in closed form; the years lost early by quadrature."""

    def left(age: float) -> float:
        z = level / slope * np.exp(slope * age)
        return float(np.exp(z) * exp1(z) / slope)

    def risen(age: float) -> float:
        lost = (1 - level * np.exp(slope * age) * left(age)) / slope
        return float(lost / left(age) + level / slope * np.expm1(slope * age))

    def density(age: float) -> float:
        rate = level * np.exp(slope * age)
        return float(rate * np.exp(-level / slope * np.expm1(slope * age)))

    table = gompertz_table(level, slope)
    exact = brentq(lambda x: risen(x) - 1, 0, 105)
    early, _ = quad(lambda x: density(x) * left(x), 0, exact)
    above = brentq(lambda x: risen(x) - 1 - risen(0), 0, 105)
    assert read("threshold_edagger", table) == pytest.approx(exact, abs=0.01)
    assert read("threshold_H", table) == pytest.approx(above, abs=0.01)
    assert read("edagger_early", table) == pytest.approx(early, abs=0.003)
    whole = law_of("Gompertz", a=level, b=slope)["edagger"]
    assert read("edagger_late", table) == pytest.approx(whole - early, abs=0.003)


@pytest.mark.parametrize("width", [1, 5])
@pytest.mark.parametrize(("level", "slope"), [(5e-5, 0.095), (2e-5, 0.105)])
def test_the_smooth_mode_and_the_ageing_rate_of_a_gompertz_law(
    level: float, slope: float, width: int
) -> None:
    """Counts of a stationary population under the law, exact within each group."""
    exact = law_of("Gompertz", a=level, b=slope)
    table = gompertz_table(level, slope)
    starts = (0, *range(width, 101, width))
    first = np.array(starts)
    grid = AgeGrid(starts)
    deaths, years = (1e6 * np.add.reduceat(column, first) for column in (table.dx, table.Lx))
    chain = run(Panel.of(grid, deaths, years, sex="f"), SETTINGS_1)
    # rates stand at the middle of their group
    mode = INDICATORS["mode"].value(chain)
    assert mode == pytest.approx(exact["mode"], abs=0.006 if width == 1 else 0.2)
    rate = INDICATORS["ageing_rate"].value(chain)
    assert rate == pytest.approx(exact["LAR"], rel=0.001 if width == 1 else 0.02)
