"""Kitagawa's two parts of a difference of weighted rates."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from engine.decomposition import kitagawa, of_crude_rates
from engine.panel import Panel
from tests.engine.decomposition.pairs import PAIRS
from tests.factories import GRIDS, gompertz_panel

rates = arrays(float, (2, 3, 7), elements=st.floats(0, 2))
weights = arrays(float, (2, 3, 7), elements=st.floats(0.001, 1))


@given(rates, weights)
def test_both_parts_add_up_and_change_their_sign_turned_round(m, w) -> None:
    w = w / w.sum(axis=-1, keepdims=True)
    there, back = kitagawa((m[0], m[1]), (w[0], w[1])), kitagawa((m[1], m[0]), (w[1], w[0]))
    expected = (w[0] * m[0]).sum(axis=-1) - (w[1] * m[1]).sum(axis=-1)
    np.testing.assert_allclose(there.difference, expected, rtol=1e-9, atol=1e-12)
    together = (there.composition + there.rate).sum(axis=-1)
    np.testing.assert_allclose(together, expected, rtol=1e-9, atol=1e-12)
    np.testing.assert_array_equal(back.composition, -there.composition)
    np.testing.assert_array_equal(back.rate, -there.rate)


@given(rates, weights)
def test_with_common_weights_all_is_owed_to_rates(m, w) -> None:
    parts = kitagawa((m[0], m[1]), (w[0], w[0]))
    np.testing.assert_array_equal(parts.composition, 0)
    np.testing.assert_allclose(parts.rate, w[0] * (m[0] - m[1]), rtol=1e-12, atol=1e-300)


@pytest.mark.fast
def test_with_common_rates_all_is_owed_to_composition() -> None:
    m, w = np.array([0.001, 0.05]), (np.array([0.9, 0.1]), np.array([0.8, 0.2]))
    parts = kitagawa((m, m), w)
    np.testing.assert_array_equal(parts.rate, 0)
    assert parts.composition.sum() == pytest.approx(0.1 * 0.001 - 0.1 * 0.05)


@pytest.mark.fast
def test_the_rates_part_is_the_mean_of_two_standardised_differences() -> None:
    """Kitagawa (1955): rates directly standardised to the one population and to the other."""
    pair = PAIRS["Danish men 1974 to 2012"]
    mx = [panel.deaths / panel.exposure for panel in (pair.this, pair.that)]
    share = [panel.exposure / panel.exposure.sum() for panel in (pair.this, pair.that)]
    standardised = [(mx[0] * w).sum() - (mx[1] * w).sum() for w in share]
    parts = of_crude_rates(pair.this, pair.that)
    assert parts.rate.sum() == pytest.approx(np.mean(standardised), rel=1e-12)
    own = [(m * w).sum() for m, w in zip(mx, share, strict=True)]
    assert parts.difference == pytest.approx(own[0] - own[1], rel=1e-12)
    assert parts.rate.sum() < 0 < parts.composition.sum()  # older, and longer-lived


@pytest.mark.fast
@pytest.mark.parametrize("pair", PAIRS.values(), ids=PAIRS)
def test_crude_rates_of_any_pair(pair) -> None:
    parts = of_crude_rates(pair.this, pair.that)
    crude = [panel.deaths.sum() / panel.exposure.sum() for panel in (pair.this, pair.that)]
    assert parts.difference == pytest.approx(crude[0] - crude[1], rel=1e-9)
    np.testing.assert_allclose(
        (parts.composition + parts.rate).sum(), parts.difference, rtol=1e-9, atol=1e-15
    )


@pytest.mark.fast
@pytest.mark.parametrize("empty", [(0, 1), (1, 0), (1, 1)])
def test_ages_without_people_take_no_part_in_the_crude_rate(empty: tuple[int, int]) -> None:
    """Deaths there share the rate of the group below, and the crude rate stays what it is."""
    sides: list[Panel] = []
    for seed, none in enumerate(empty):
        panel = gompertz_panel(seed=seed)
        exposure = panel.exposure * np.where(np.arange(len(panel.grid)) == 20, 1 - none, 1)
        sides.append(replace(panel, exposure=exposure))
    parts = of_crude_rates(*sides)
    crude = [panel.deaths.sum() / panel.exposure.sum() for panel in sides]
    assert parts.difference == pytest.approx(crude[0] - crude[1], rel=1e-9)


@pytest.mark.fast
def test_a_rate_without_weight_is_not_needed() -> None:
    m = np.array([0.01, np.nan]), np.array([0.02, 0.3])
    w = np.array([1.0, 0.0]), np.array([0.5, 0.5])
    parts = kitagawa(m, w)
    assert parts.rate[1] == 0
    assert parts.composition[1] == pytest.approx(-0.5 * 0.3)
    assert parts.difference == pytest.approx(0.01 - 0.16)
    needed = kitagawa(m, (np.array([0.5, 0.5]), w[1]))
    assert np.isnan(needed.difference)


@pytest.mark.fast
def test_unlike_grids_are_refused() -> None:
    with pytest.raises(ValueError, match=r"age groups differ .* regroup both"):
        of_crude_rates(gompertz_panel(), gompertz_panel(GRIDS["single"]))
