"""Single ages from groups: sums and limits, dense algebra, and Denmark's own single ages."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import settings as how
from hypothesis import strategies as st

from engine.ages import AgeGrid
from engine.ungrouping import PENALTIES, interpolated, ungrouped
from tests.factories import GRIDS, gompertz_panel
from tests.published import denmark

FIVES = AgeGrid((0, 1, *range(5, 96, 5)))
SHORT = AgeGrid((0, 1, 5, 10, 15, 20, 25, 30, 40))
COUNTS = np.array([[60.0, 30, 12, 9, 25, 40, 38, 90, 500], [8.0, 2, 0, 1, 3, 2, 6, 9, 70]])


def dense(counts: np.ndarray, widths: list[int], years: np.ndarray, weight: float) -> np.ndarray:
    """The model as its paper writes it, on full matrices: logarithms by age."""
    link = np.repeat(np.eye(len(widths)), widths, axis=1)
    penalty = weight * (d := np.diff(np.eye(len(years)), 2, axis=0)).T @ d
    eta = np.full(len(years), np.log(counts.sum() / years.sum()))
    for _ in range(500):
        before = eta
        gamma = years * np.exp(eta)
        mu = link @ gamma
        x = link * gamma / mu[:, None]
        w = np.diag(mu)
        new = np.linalg.solve(x.T @ w @ x + penalty, x.T @ (counts - mu) + x.T @ w @ x @ eta)
        eta = eta + (new - eta) / max(1.0, np.abs(new - eta).max())
        if np.abs(eta - before).max() < 1e-9:
            break
    return eta


def score(
    counts: np.ndarray, widths: list[int], years: np.ndarray, weight: float, price: float
) -> tuple[float, np.ndarray, np.ndarray]:
    gamma = years * np.exp(dense(counts, widths, years, weight))
    link = np.repeat(np.eye(len(widths)), widths, axis=1)
    mu = link @ gamma
    x = link * gamma / mu[:, None]
    info = x.T @ np.diag(mu) @ x
    d = np.diff(np.eye(len(years)), 2, axis=0)
    spread = np.linalg.inv(info + weight * d.T @ d)
    logs = np.where(counts > 0, counts * np.log(np.where(counts > 0, counts, 1) / mu), 0)
    deviance = 2 * (logs - counts + mu).sum()
    return deviance + price * np.trace(spread @ info), gamma, np.sqrt(np.diag(spread))


@pytest.mark.parametrize("criterion", ["aic", "bic"])
@pytest.mark.parametrize("row", [0, 1])
def test_fit_penalty_and_errors_are_those_of_dense_algebra(row: int, criterion: str) -> None:
    years = np.linspace(900, 300, 50)
    got = ungrouped(SHORT, COUNTS[row], exposure=years, last=50, criterion=criterion)
    widths = [4, 5, 5, 5, 5, 5, 10, 10]
    price = 2.0 if criterion == "aic" else np.log(9)
    tried = [score(COUNTS[row, 1:], widths, years[1:], weight, price) for weight in PENALTIES[::4]]
    at = score(COUNTS[row, 1:], widths, years[1:], float(got.penalty), price)
    np.testing.assert_allclose(got.counts[1:], at[1], rtol=1e-5)
    np.testing.assert_allclose(got.log_errors[1:], at[2], rtol=1e-5)
    assert at[0] <= min(one[0] for one in tried) + 1e-6
    assert got.counts[0] == COUNTS[row, 0]
    assert got.log_errors[0] == pytest.approx(COUNTS[row, 0] ** -0.5)


@pytest.mark.parametrize("sex", ["female", "male"])
@pytest.mark.parametrize("year", [1980, 2005])
def test_denmarks_single_ages_are_found_again_from_groups(sex: str, year: int) -> None:
    """Nearly as near to the counts by single age as chance lets them be, nearer than by the plain
    choice, and within the errors said."""
    single = denmark.one(sex, year)
    grouped = single.regroup(FIVES)
    truth = single.deaths[1:95]
    by_rates = ungrouped(FIVES, grouped.deaths, exposure=single.exposure[:95])
    by_counts = ungrouped(FIVES, grouped.deaths)
    plain = interpolated(FIVES, grouped.deaths)[1:]

    def distance(found: np.ndarray) -> float:
        return float(((truth - found) ** 2 / np.maximum(found, 0.5)).mean())

    rates, counts = by_rates.counts[1:], by_counts.counts[1:]
    assert distance(rates) < 1.15  # about 1 by chance alone
    assert distance(rates) < distance(counts) < distance(plain)
    assert distance(by_rates.counts_kept[1:]) < 1.15
    error = np.hypot(by_rates.log_errors[1:] * rates, np.sqrt(rates))
    assert 0.9 < (np.abs(truth - rates) < 1.96 * error).mean() <= 1


def test_the_spread_of_the_open_group_is_like_that_counted() -> None:
    single = denmark.one("female", 2000)
    at_85 = single.regroup(AgeGrid((0, 1, *range(5, 86, 5))))
    got = ungrouped(at_85.grid, at_85.deaths, last=110)
    np.testing.assert_allclose(got.counts[85:95], single.deaths[85:95], rtol=0.3)
    plain = interpolated(at_85.grid, at_85.deaths, last=110)
    assert plain[85:].sum() == pytest.approx(at_85.deaths[-1])
    assert np.abs(plain[85:95] - single.deaths[85:95]).sum() > (
        np.abs(got.counts[85:95] - single.deaths[85:95]).sum()
    )


def test_a_law_with_straight_logarithms_is_found_exactly() -> None:
    panel = gompertz_panel(GRIDS["single"], accidents=0, infant=0.0)
    grouped = panel.regroup(FIVES)
    got = ungrouped(FIVES, grouped.deaths, exposure=panel.exposure[:95])
    np.testing.assert_allclose(got.counts, panel.deaths[:95], rtol=1e-6)
    np.testing.assert_allclose(got.sums, grouped.deaths[:-1], rtol=1e-6)


def test_sums_come_near_and_can_be_set() -> None:
    panel = gompertz_panel(FIVES, seed=2, people=3e5)
    got = ungrouped(FIVES, panel.deaths)
    off = (got.sums - panel.deaths[:-1]) / np.sqrt(panel.deaths[:-1])
    assert np.abs(off[1:]).max() < 2
    assert np.abs(off).max() > 1e-3
    np.testing.assert_allclose(got.sums.sum(), panel.deaths[:-1].sum(), rtol=1e-9)
    kept = np.add.reduceat(got.counts_kept, FIVES.starts[:-1])
    np.testing.assert_allclose(kept, panel.deaths[:-1], rtol=1e-12)


def test_units_of_person_years_do_not_matter() -> None:
    panel = gompertz_panel(GRIDS["single"], seed=2, people=1e5)
    deaths, years = panel.regroup(FIVES).deaths, panel.exposure[:95]
    one, other = (ungrouped(FIVES, deaths, exposure=years * times) for times in (1, 1000))
    np.testing.assert_allclose(other.counts, one.counts, rtol=1e-6)
    np.testing.assert_allclose(other.log_errors, one.log_errors, rtol=1e-6)


def test_gaps() -> None:
    panel = gompertz_panel(FIVES, seed=2, people=1e5, slope=np.full(4, 0.1))
    deaths = panel.deaths.copy()
    deaths[1, 3] = np.nan
    deaths[2, 1:] = 0
    got = ungrouped(FIVES, deaths)
    assert np.isnan(got.counts[:, 1:]).any(axis=-1).tolist() == [False, True, True, False]
    sound = ungrouped(FIVES, panel.deaths)
    np.testing.assert_array_equal(got.counts[[0, 3]], sound.counts[[0, 3]])
    plain = interpolated(FIVES, deaths)
    assert np.isnan(plain).any(axis=-1).tolist() == [False, True, False, False]
    years = np.full(95, 1e4)
    years[20:25] = 0  # nobody lived there: other ages tell
    deaths[0, FIVES.position(20)] = 0
    bridged = ungrouped(FIVES, deaths[0], exposure=years)
    assert np.isfinite(bridged.counts).all()
    np.testing.assert_array_equal(bridged.counts[20:25], 0)


def test_rows_do_not_know_one_another() -> None:
    panel = gompertz_panel(FIVES, seed=2, people=1e5, slope=np.linspace(0.08, 0.11, 5))
    for last in (None, 100):
        whole = ungrouped(FIVES, panel.deaths, last=last)
        plain = interpolated(FIVES, panel.deaths, last=last)
        for where in (slice(0, 1), slice(2, 5), 4):
            part = ungrouped(FIVES, panel.deaths[where], last=last)
            for name in ("counts", "log_errors", "penalty", "sums"):
                np.testing.assert_array_equal(getattr(part, name), getattr(whole, name)[where])
            alone = interpolated(FIVES, panel.deaths[where], last=last)
            np.testing.assert_array_equal(alone, plain[where])


@how(max_examples=30, deadline=None)
@given(
    counts=st.lists(st.integers(0, 10_000), min_size=21, max_size=21),
    last=st.one_of(st.none(), st.integers(96, 120)),
)
def test_the_plain_choice_keeps_every_sum(counts: list[int], last: int | None) -> None:
    found = interpolated(FIVES, np.array(counts, float), last=last)
    sums = np.add.reduceat(found, FIVES.starts[: None if last else -1])
    np.testing.assert_allclose(sums, counts[: None if last else -1], atol=1e-8)
    assert (found >= 0).all()


def test_the_plain_choice_leaves_even_counts_even() -> None:
    even = np.append(np.diff(FIVES.starts), 50).astype(float)
    np.testing.assert_allclose(interpolated(FIVES, even), 1, atol=1e-9)


def test_what_is_refused() -> None:
    with pytest.raises(ValueError, match="the open group begins at 95; it cannot end at 95"):
        interpolated(FIVES, np.ones(21), last=95)
    with pytest.raises(ValueError, match="exposure has 90 ages but the groups 95"):
        ungrouped(FIVES, np.ones(21), exposure=np.ones(90))
    with pytest.raises(ValueError, match="no criterion 'gcv'; there are aic, bic"):
        ungrouped(FIVES, np.ones(21), criterion="gcv")
