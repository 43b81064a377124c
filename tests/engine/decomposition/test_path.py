"""Contributions along the path of all years between two."""

from dataclasses import replace

import numpy as np
import pytest

from engine.chain import Reading, Tally, run
from engine.decomposition import along, along_by_cause, contributions
from engine.indicators import INDICATORS
from engine.panel import Panel
from tests.engine.decomposition.pairs import PAIRS, PLAIN
from tests.factories import gompertz_panel
from tests.published import denmark

SMOOTH = [
    one
    for one in INDICATORS.values()
    if one.smooth and not isinstance(one.partials(run(gompertz_panel(), PLAIN)), Tally)
]


def danes(sex: str = "male") -> Panel:
    """With a whole and people to standardise by, the same in all years."""
    years = denmark.panel(sex).regroup(denmark.ABRIDGED)
    whole = years[np.zeros(len(denmark.YEARS), int)]
    return replace(years, whole=whole, standard=whole)


def line_of(panel: Panel, other: Panel, steps: int) -> Panel:
    """Years that lie on the straight line in the rates, at the person-years of the first."""
    t = np.linspace(0, 1, steps + 1)[:, None]
    first, last = (one.deaths / one.exposure for one in (panel, other))
    years = np.broadcast_to(panel.exposure, (steps + 1, len(panel.grid)))
    return Panel.of(panel.grid, (first + t * (last - first)) * years, years, sex="m")


@pytest.mark.fast
@pytest.mark.parametrize("indicator", SMOOTH, ids=lambda indicator: indicator.key)
def test_the_path_and_the_straight_line_have_one_total(indicator: Reading) -> None:
    found = along(indicator, danes(), PLAIN)
    total = found.by_age.sum() + found.remainder.sum()
    held = np.abs(found.by_step).sum()
    assert total == pytest.approx(float(found.straight.difference), abs=1e-9 * held)
    assert found.apart.sum() + found.remainder.sum() - found.straight.remainder == pytest.approx(
        0, abs=1e-9 * held
    )


@pytest.mark.fast
def test_years_on_one_straight_line_are_the_straight_line() -> None:
    pair = PAIRS["men across the break of a0"]
    found = along(INDICATORS["H"], line_of(pair.that, pair.this, 7), PLAIN)
    np.testing.assert_allclose(found.apart, 0, atol=1e-10)


@pytest.mark.fast
def test_a_detour_is_seen() -> None:
    """Infant mortality falls first and old ages' follows, or the other way round: the path gives
    each age its turn, the straight line the mean of both."""
    that, this = gompertz_panel(infant=0.08, level=6e-5), gompertz_panel(infant=0.004, level=2e-5)
    first_infants = np.where(np.arange(len(this.grid)) < 2, this.deaths / this.exposure, 0)
    rates = np.where(first_infants > 0, first_infants, that.deaths / that.exposure)
    between = Panel.of(this.grid, rates * this.exposure, this.exposure, sex="f")
    found = along(INDICATORS["e0"], Panel.stack([that, between, this]), PLAIN)
    assert found.by_step.shape == (2, len(this.grid))
    np.testing.assert_allclose(found.by_step[0, 2:], 0, atol=1e-9)
    # an infant saved while the old still die early gains fewer years
    assert found.apart[0] < -0.2
    assert np.abs(found.apart).sum() < np.abs(found.straight.by_age).sum()


@pytest.mark.fast
def test_steps_are_the_contributions_from_year_to_year() -> None:
    years = danes("female")[:4]
    found = along(INDICATORS["e0"], years, PLAIN)
    for step in range(3):
        one = contributions(INDICATORS["e0"], years[step + 1], years[step], PLAIN)
        np.testing.assert_array_equal(found.by_step[step], one.by_age)
    straight = contributions(INDICATORS["e0"], years[3], years[0], PLAIN)
    np.testing.assert_array_equal(found.straight.by_age, straight.by_age)


@pytest.mark.fast
def test_turned_round_the_path_changes_its_sign() -> None:
    years = danes()[:5]
    there, back = along(INDICATORS["H"], years, PLAIN), along(INDICATORS["H"], years[::-1], PLAIN)
    np.testing.assert_allclose(back.by_age, -there.by_age, rtol=1e-9, atol=1e-15)
    np.testing.assert_allclose(back.apart, -there.apart, rtol=1e-6, atol=1e-13)


@pytest.mark.fast
def test_a_year_without_a_value_leaves_the_path_open() -> None:
    years = danes()[:4]
    years.deaths[2, 5] = np.nan
    found = along(INDICATORS["e0"], years, PLAIN)
    np.testing.assert_array_equal(np.isnan(found.by_step).any(axis=-1), [False, True, True])
    assert np.isnan(found.by_age).all()
    assert np.isfinite(found.straight.by_age).all()


@pytest.mark.fast
def test_one_year_is_no_path() -> None:
    with pytest.raises(ValueError, match=r"at least two years; put years on the first axis"):
        along(INDICATORS["e0"], danes()[:1], PLAIN)
    with pytest.raises(ValueError, match=r"at least two years"):
        along(INDICATORS["e0"], danes()[0], PLAIN)


@pytest.mark.fast
def test_the_causes_of_an_age_add_up_to_the_age_along_the_path() -> None:
    """One of them changes in the first step alone, and contributes in no other."""
    years = danes()[[0, 12, 25, 38]]
    share = np.array([0.2, 0.4, 0.4, 0.4])[:, None]
    causes = np.stack([share * years.deaths, (1 - share) * years.deaths], axis=-2)
    found = along_by_cause(INDICATORS["e0"], years, PLAIN, causes=causes)
    ages = along(INDICATORS["e0"], years, PLAIN)
    np.testing.assert_allclose(found.sum(axis=-2), ages.by_age, atol=1e-12)
    first = along_by_cause(INDICATORS["e0"], years[:2], PLAIN, causes=causes[:2])
    rest = along(INDICATORS["e0"], years[1:], PLAIN)
    np.testing.assert_allclose(found[0] - first[0], 0.4 * rest.by_age, atol=1e-12)
    with pytest.raises(ValueError, match="two years"):
        along_by_cause(INDICATORS["e0"], years[0], PLAIN, causes=causes[0])
