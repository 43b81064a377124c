"""The difference in H, owed to the years lost per death and to life expectancy."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from engine.chain import run
from engine.decomposition import contributions, unevenness_parts
from engine.decomposition.unevenness import log_mean
from engine.indicators import INDICATORS
from engine.panel import Panel
from tests.engine.decomposition.pairs import PAIRS, PLAIN
from tests.factories import gompertz_panel

LOST, LIVED, H = (INDICATORS[key] for key in ("edagger", "e0", "H"))


def both(this: Panel, that: Panel):
    return unevenness_parts(LOST, LIVED, this, that, PLAIN)


@pytest.mark.fast
@pytest.mark.parametrize("pair", PAIRS.values(), ids=PAIRS)
def test_both_parts_add_up_to_the_difference_in_h(pair) -> None:
    there, back = both(pair.this, pair.that), both(pair.that, pair.this)
    expected = H.value(run(pair.this, PLAIN)) - H.value(run(pair.that, PLAIN))
    parts = (there.lost.sum(), there.lived.sum(), there.lost_remainder, there.lived_remainder)
    held = np.abs(there.lost).sum() + np.abs(there.lived).sum()
    assert there.difference == pytest.approx(float(expected), rel=1e-12)
    assert sum(parts) == pytest.approx(float(expected), abs=1e-9 * held)
    np.testing.assert_allclose(back.lost, -there.lost, rtol=1e-9, atol=1e-15)
    np.testing.assert_allclose(back.lived, -there.lived, rtol=1e-9, atol=1e-15)


@pytest.mark.fast
def test_each_part_is_its_share_of_the_logarithms() -> None:
    pair = PAIRS["Danish men 1974 to 2012"]
    logs = [
        np.log([one.value(run(panel, PLAIN)) for panel in (pair.this, pair.that)])
        for one in (LOST, LIVED, H)
    ]
    (lost, lived, whole), found = (one[0] - one[1] for one in logs), both(pair.this, pair.that)
    scale = float(found.difference) / whole
    assert found.lost.sum() + found.lost_remainder == pytest.approx(scale * lost, rel=1e-9)
    assert found.lived.sum() + found.lived_remainder == pytest.approx(-scale * lived, rel=1e-9)
    ages = contributions(LIVED, pair.this, pair.that, PLAIN).by_age
    np.testing.assert_allclose(found.lived / found.lived.sum(), ages / ages.sum(), rtol=1e-9)


@pytest.mark.fast
def test_for_a_small_difference_it_is_the_quotient_rule() -> None:
    this, that = gompertz_panel(level=2.0e-5), gompertz_panel(level=2.002e-5)
    found, table = both(this, that), run(that, PLAIN)
    e0, lost = LIVED.value(table), LOST.value(table)
    expected = (
        contributions(LOST, this, that, PLAIN).by_age / e0,
        -lost / e0**2 * contributions(LIVED, this, that, PLAIN).by_age,
    )
    np.testing.assert_allclose(found.lost, expected[0], rtol=1e-3)
    np.testing.assert_allclose(found.lived, expected[1], rtol=1e-3)
    line = contributions(H, this, that, PLAIN).by_age
    np.testing.assert_allclose(found.lost + found.lived, line, rtol=1e-3, atol=1e-10)


@pytest.mark.fast
def test_missing_where_either_side_has_no_value() -> None:
    this, that = gompertz_panel(), gompertz_panel(level=4e-5)
    this.deaths[-1] = 0
    found = both(this, that)
    assert np.isnan(found.lost).all()
    assert np.isnan(found.difference)


@pytest.mark.fast
@given(st.floats(1e-3, 1e3), st.floats(1e-3, 1e3))
def test_the_logarithmic_mean_is_the_mean_of_all_powers(a: float, b: float) -> None:
    """L(a, b) is the integral of a^t b^(1 - t) over t from 0 to 1, between the two numbers."""
    expected = quad(lambda t: a**t * b ** (1 - t), 0, 1)[0]
    found = float(log_mean(np.array(a), np.array(b)))
    assert found == pytest.approx(expected, rel=1e-9)
    assert found == pytest.approx(float(log_mean(np.array(b), np.array(a))), rel=1e-12)
    assert min(a, b) * (1 - 1e-12) <= found <= max(a, b) * (1 + 1e-12)
