"""Standardised rates and their limits against printed values and separate computations."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.ages import AgeGrid, Array
from engine.chain import gradient, run
from engine.indicators import estimate, find
from engine.indicators.rates import FAMILY as RATES
from engine.indicators.standardised import by_standard
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.standardisation import (
    crude,
    direct,
    expected_deaths,
    observed_over_expected,
)
from engine.standards import STANDARDS
from tests.factories import LIMITS
from tests.published import denmark
from tests.published.denmark import rows

MOTHERS = AgeGrid((0, 20, 25, 30, 35, 40))  # maternal ages, the first under 20
ORDERS = range(1, 6)


def births(column: str) -> Array:
    """A column by order of birth and age of the mother: [order, age]."""
    listed = rows("fay_feuer_1997.csv")
    assert [int(row["birth_order"]) for row in listed] == [
        k for k in ORDERS for _ in MOTHERS.starts
    ]
    return np.array([float(row[column]) for row in listed]).reshape(len(ORDERS), len(MOTHERS))


@pytest.mark.parametrize("row", rows("fay_feuer_1997_limits.csv"), ids=lambda r: r["birth_order"])
def test_the_table_of_fay_and_feuer(row: dict[str, str]) -> None:
    order = int(row["birth_order"]) - 1
    cases, all_births = births("cases")[order], births("births")[order]
    weights = births("std_weight")[order]
    found = direct(MOTHERS, cases / all_births, all_births, weights, MOTHERS)
    low, high = LIMITS["gamma"](found.gradient / all_births, cases, 0.95)
    got = 1e5 * np.array([found.value, low, high])
    assert_allclose(got, [float(row[f"pub_{part}"]) for part in ("rate", "lo", "hi")], atol=0.05)
    computed = [float(row[part]) for part in ("rate_per_1e5", "gamma_lo", "gamma_hi")]
    assert_allclose(got, computed, rtol=1e-9)
    whole = crude(MOTHERS, cases / all_births, all_births)
    assert 1e5 * whole.value == pytest.approx(float(row["crude_per_1e5"]), rel=1e-9)


def test_dobsons_limits_and_observed_over_expected_as_a_statistics_program_has_them() -> None:
    cases, all_births, weights = births("cases"), births("births"), births("std_weight")
    printed = {name: np.array([float(row[name]) for row in rows("fay_feuer_1997_by_r.csv")])
               for name in ("dobson_low", "dobson_high", "smr", "smr_low", "smr_high")}  # fmt: skip
    found = direct(MOTHERS, cases / all_births, all_births, weights, MOTHERS)
    low, high = LIMITS["dobson"](found.gradient / all_births, cases, 0.95)
    assert_allclose(low, printed["dobson_low"], rtol=1e-9)
    assert_allclose(high, printed["dobson_high"], rtol=1e-9)
    whole = Panel.of(MOTHERS, cases.sum(axis=0), all_births.sum(axis=0), sex="f")
    ratio = observed_over_expected(cases / all_births, all_births, whole)
    low, high = LIMITS["gamma"](ratio.gradient / all_births, cases, 0.95)
    assert_allclose(ratio.value, printed["smr"], rtol=1e-9)
    assert_allclose(low, printed["smr_low"], rtol=1e-9)
    assert_allclose(high, printed["smr_high"], rtol=1e-9)
    assert_allclose(expected_deaths(all_births, whole).sum(), cases.sum(), rtol=1e-12)


def test_virginia() -> None:
    """Weights of the standard at 50 to 74; the five groups stand on a grid of their own."""
    listed = rows("virginia_1940.csv")
    mx = np.array([float(row["rate_per_1000"]) for row in listed]).reshape(4, 5) / 1000
    grid = AgeGrid((0, 55, 60, 65, 70))
    people = np.array([7000.0, 6500, 6000, 5500, 5000])
    found = direct(grid, mx, np.full(mx.shape, 1000.0), people, grid)
    printed = [30.5483333333, 23.3400000000, 38.1183333333, 23.5350000000]
    assert_allclose(1000 * found.value, printed, rtol=1e-11)


@pytest.mark.parametrize("sex", denmark.SEXES)
@pytest.mark.parametrize("single", [True, False])
def test_denmark(sex: str, single: bool) -> None:
    """Four decimals are printed; the groups of the standard are summed from single ages, or come as
    they are."""
    panel, standard = denmark.panel(sex), STANDARDS["esp2013"]
    if not single:
        panel = panel.regroup(standard.grid)
    chain = run(panel, SETTINGS["almanac-1"])
    printed = [row for row in rows("denmark_standardised.csv") if row["sex"] == sex]
    assert [int(row["year"]) for row in printed] == list(denmark.YEARS)
    columns = {name: np.array([float(row[name]) for row in printed]) for name in
               ("crude_per_1e5", "asr_esp2013_per_1e5", "gamma_lo", "gamma_hi")}  # fmt: skip
    (crude_rate,), asr = RATES, by_standard(standard)
    assert_allclose(1e5 * crude_rate.value(chain), columns["crude_per_1e5"], atol=1e-4)
    got = estimate(asr, panel, SETTINGS["almanac-1"])
    for part, column in (("low", "gamma_lo"), ("high", "gamma_hi")):
        assert_allclose(1e5 * getattr(got, part), columns[column], atol=1e-4)
    assert_allclose(1e5 * asr.value(chain), columns["asr_esp2013_per_1e5"], atol=1e-4)
    per_death = chain.rates.per_death(gradient(asr, chain))
    low, high = LIMITS["gamma"](per_death, panel.deaths, 0.95)
    assert_allclose(1e5 * low, columns["gamma_lo"], atol=1e-4)
    assert_allclose(1e5 * high, columns["gamma_hi"], atol=1e-4)


@pytest.mark.parametrize(
    "row", rows("poisson_limits.csv"), ids=lambda r: f"{r['count']}-{r['level']}"
)
def test_a_crude_rate_and_a_rate_over_births_have_exact_limits(row: dict[str, str]) -> None:
    """The printed years stand once for those lived and once for births."""
    count, years = float(row["count"]), float(row["person_years"])
    panel = Panel.of(AgeGrid((0, 1)), np.array([count, 0.0]), np.array([10.0, years - 10]), sex="f")
    panel = replace(panel, births=np.array([years, 0.0, 0.0]))
    settings = replace(SETTINGS["almanac-1"], level=float(row["level"]))
    for key in ("cdr", "imr") if count else ("imr",):  # of no deaths at all no death rate is given
        got = estimate(find(key), panel, settings)
        assert got.value == pytest.approx(count / years, rel=1e-12)
        assert got.low == pytest.approx(float(row["low"]), rel=1e-9)
        assert got.high == pytest.approx(float(row["high"]), rel=1e-9)
