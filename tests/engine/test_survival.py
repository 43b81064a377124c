"""Lengths of life under a law: printed closed forms, quadrature, derivatives by complex step."""

import json
from pathlib import Path

import numpy as np
import pytest

from engine.hazards import GOMPERTZ, KANNISTO, LAWS, MAKEHAM, SILER, Law
from engine.laws import fit
from engine.survival import adult_mode, lives, mode_of
from tests.engine.test_laws import AGES, WIDTHS, drawn, truth

PRINTED = Path(__file__).parents[1] / "published" / "closed_forms.json"
GOMPERTZ_FORMS = [one for one in json.loads(PRINTED.read_text()) if "Gompertz" in one["name"]]
SUMS = pytest.mark.parametrize(
    "law", [law for law in LAWS.values() if not law.saturates], ids=lambda law: law.key
)


@pytest.mark.fast
@pytest.mark.parametrize("form", GOMPERTZ_FORMS, ids=lambda form: str(form["params"]))
def test_printed_closed_forms(form: dict[str, dict[str, float]]) -> None:
    given, exact = form["params"], form["exact"]
    law = MAKEHAM if "c" in given else GOMPERTZ
    logs = [np.log(given["a"]), given["b"], *(np.log(given["c"]) for _ in law.names[2:])]
    found = lives(law, np.array(logs), 0.0)
    assert found.expectancy == pytest.approx(exact["e0"], abs=1e-9)
    assert found.lost == pytest.approx(exact["edagger"], abs=1e-9)
    if "mode" in exact:
        assert mode_of(logs[0], logs[1], 0.0) == pytest.approx(exact["mode"], abs=1e-9)


@pytest.mark.fast
@SUMS
@pytest.mark.parametrize("age", [0.0, 0.5, 65.0, 90.0])
def test_expectancy_and_years_lost_by_quadrature(law: Law, age: float) -> None:
    at, step = truth(law), 1e-3
    x = np.arange(age + step / 2, 150, step)
    spent = np.cumsum(law.hazard(x, at, 50.0)) * step
    alive = np.exp(-np.concatenate([[0.0], spent]))
    middle = (alive[1:] + alive[:-1]) / 2
    years, lost = step * middle.sum(), -step * (middle * np.log(np.maximum(middle, 1e-300))).sum()
    found = lives(law, at, 50.0, age=age)
    assert found.expectancy == pytest.approx(years, abs=1e-6)
    assert found.lost == pytest.approx(lost, abs=1e-6)


@pytest.mark.fast
@SUMS
def test_slopes_of_the_expectancy(law: Law) -> None:
    at, h = np.stack([truth(law), truth(law) + 0.02]), 1e-30
    for age in (0.0, 65.0):
        found = lives(law, at, 50.0, age=age).slopes
        for j in range(at.shape[-1]):
            beside = at.astype(complex)
            beside[:, j] += 1j * h
            there = lives(law, beside, 50.0, age=age).expectancy.imag / h
            np.testing.assert_allclose(found[:, j], there, rtol=1e-10, atol=1e-13)


@pytest.mark.fast
def test_a_steep_fall_after_birth_is_followed() -> None:
    """Deaths of newborn within days: exp(-d x) integrates to 1 / d."""
    at = np.array([-20.0, 1e-9, np.log(0.01), np.log(0.2), 40.0])
    found = lives(SILER, at, 0.0).expectancy
    infants = 0.2 / 40
    flat = -np.expm1(-0.01 * 150) / 0.01 * np.exp(-infants)
    assert found == pytest.approx(flat, rel=1e-4)


@pytest.mark.fast
def test_deaths_gather_about_the_mode() -> None:
    """The rising term alone has its most deaths at M."""
    level, slope = -2.5, 0.11
    mode = float(mode_of(np.array(level), np.array(slope), 85.0))
    ages = mode + np.array([-0.02, 0.0, 0.02])
    mu = GOMPERTZ.hazard(ages, np.array([level, slope]), 85.0)
    deaths = mu * np.exp(-(mu - np.exp(level - slope * 85)) / slope)
    assert deaths[1] > deaths[[0, 2]].max()


@pytest.mark.fast
@pytest.mark.parametrize("law", [MAKEHAM, SILER], ids=lambda law: law.key)
def test_the_standard_error_of_the_mode(law: Law) -> None:
    """Against the spread over 1,500 samples."""
    deaths, exposure = drawn(law, 5, (1500,), people=3e6)
    found = adult_mode(fit(law, AGES, deaths, exposure, widths=WIDTHS))
    kept = np.isfinite(found.se)
    assert kept.mean() > 0.95
    assert np.std(found.age[kept]) == pytest.approx(np.mean(found.se[kept]), rel=0.06)
    true = mode_of(*truth(law)[:2], float(AGES.mean()))
    assert np.mean(found.age[kept]) == pytest.approx(float(true), abs=0.02)


@pytest.mark.fast
def test_no_mode_where_deaths_do_not_gather() -> None:
    """Without a fit, or where M would lie before birth."""
    exposure = np.full(len(AGES), 1e5)
    flat = exposure * 0.3 * np.exp(0.01 * AGES)
    found = adult_mode(fit(GOMPERTZ, AGES, np.stack([0 * flat, flat]), exposure, widths=WIDTHS))
    assert np.isnan([found.age, found.se]).all()


@pytest.mark.fast
def test_a_law_that_saturates_is_refused() -> None:
    with pytest.raises(ValueError, match="Kannisto law is no sum of terms"):
        lives(KANNISTO, np.array([-2.0, 0.1]), 85.0)
