"""What is left of a probability of dying: Chiang's identity, evenly lying deaths, slopes."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from engine.causes.parting import part
from engine.causes.remaining import LAWS, constant_ratio, lived, uniform
from engine.settings import SETTINGS
from tests.engine.stepping import STEP
from tests.factories import gompertz_panel, parted

pytestmark = pytest.mark.fast
QX = np.array([1e-9, 0.001, 0.02, 0.3, 0.7, 0.999])
SHARE = np.array([0.5, 0.999, 0.4, 0.25, 0.6, 0.1])


def test_chiangs_identity() -> None:
    """Survivors of each cause alone, multiplied, are the survivors of all: p = product of p_i; and
    the probability of a cause beside the others is its share of q."""
    shares = np.array([0.2, 0.5, 0.3])[:, None]
    alone = 1 - constant_ratio(QX, np.broadcast_to(shares, (3, len(QX)))).value
    assert_allclose(alone.prod(axis=0), 1 - QX, rtol=1e-12)
    # forces r mu(t) of one shape, constant in the group: q_i = integral of p(t) r mu dt
    for q, r in zip(QX, SHARE, strict=True):
        mu = -np.log1p(-q)
        beside, _ = quad(lambda t, mu=mu, r=r: np.exp(-mu * t) * r * mu, 0, 1, epsabs=0)
        assert beside == pytest.approx(r * q, rel=1e-9)


def test_evenly_lying_deaths_satisfy_what_defines_them() -> None:
    left, gone = uniform(QX, SHARE).value, uniform(QX, 1 - SHARE).value
    assert_allclose((1 - left) * (1 - gone), 1 - QX, rtol=1e-9)
    # of those left, deaths at even pace meet survivors 1 - t q'' of what was taken away
    for q, r, one, other in zip(QX, SHARE, left, gone, strict=True):
        beside, _ = quad(lambda t, one=one, other=other: one * (1 - t * other), 0, 1)
        assert beside == pytest.approx(r * q, rel=1e-7)


@pytest.mark.parametrize("law", LAWS)
def test_ends_and_order(law: str) -> None:
    every, none = np.ones_like(QX), np.zeros_like(QX)
    assert_allclose(LAWS[law](QX, every).value, QX, rtol=1e-12)
    assert_allclose(LAWS[law](QX, none).value, 0, atol=1e-15)
    steps = [LAWS[law](QX, np.full_like(QX, share)).value for share in np.linspace(0, 1, 11)]
    assert (np.diff(steps, axis=0) > 0).all()
    # where all die they die of what is left, if anything is
    sure = LAWS[law](np.ones(3), np.array([0.0, 0.6, 1.0])).value
    assert_allclose(sure, [0.0, 1.0, 1.0])


@pytest.mark.parametrize("law", LAWS)
def test_slopes_by_complex_step(law: str) -> None:
    found = LAWS[law](QX[1:], SHARE[1:])
    by_all = LAWS[law](QX[1:] + 1j * STEP, SHARE[1:]).value.imag / STEP
    by_share = LAWS[law](QX[1:], SHARE[1:] + 1j * STEP).value.imag / STEP
    assert_allclose(found.by_all, by_all, rtol=1e-9)
    assert_allclose(found.by_share, by_share, rtol=1e-9)


@pytest.mark.parametrize("law", LAWS)
def test_years_lived_lose_as_the_deaths_do(law: str) -> None:
    """(n - a') q' = R (n - a) q, also as hardly any deaths are left."""
    panel = gompertz_panel(seed=2, infant=0.02)
    whole = part(panel, parted(panel), SETTINGS["almanac-1"])
    table = whole.chain.table
    n, q, a = table.grid.widths[:-1], table.qx[:-1], table.ax[:-1]
    for share in (1.0, 0.7, 0.01, 1e-7, 0.0):
        left = LAWS[law](q, np.full_like(q, share))
        found = lived(whole.chain, left, np.full_like(q, share))
        assert_allclose((n - found.ax) * left.value, share * (n - a) * q, rtol=1e-9, atol=1e-15)
        assert ((found.ax >= a - 1e-12) & (found.ax < n)).all()
    nearly, none = (
        lived(whole.chain, LAWS[law](q, np.full_like(q, share)), np.full_like(q, share)).ax
        for share in (1e-7, 0.0)
    )
    assert_allclose(nearly, none, rtol=1e-5)


def test_a_steady_rate_stays_steady() -> None:
    panel = gompertz_panel(seed=2)
    chain = part(panel, parted(panel), SETTINGS["almanac-1-constant-rate"]).chain
    q, share = chain.table.qx[:-1], np.full(len(panel.grid) - 1, 0.6)
    found = lived(chain, constant_ratio(q, share), share)
    fewer = replace(panel, deaths=0.6 * panel.deaths)
    again = part(fewer, parted(fewer), SETTINGS["almanac-1-constant-rate"]).chain
    assert_allclose(found.ax, again.table.ax[:-1], rtol=1e-9)
