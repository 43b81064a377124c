"""Laws of every number by cause: its slopes, batches, gaps, intervals; and what adds up."""

from dataclasses import fields, replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine.causes import decrements, deletion, losses
from engine.causes.counts import CauseCounts
from engine.causes.number import CauseNumber, estimates
from engine.causes.parting import part
from engine.estimates import Estimate, Reason
from engine.indicators import estimates as of_all
from engine.indicators import find
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from tests.engine.stepping import STEP
from tests.factories import GRIDS, gompertz_panel, parted

NUMBERS = (
    *decrements.FAMILY,
    *losses.FAMILY,
    *deletion.FAMILY,
    deletion.gain(part=0.3),
    deletion.gain(part=0.3, law="uniform"),
)
PLAIN = SETTINGS["almanac-1"]
APART = {
    replace(one, key="", label="", years=1): one for one in reversed(SETTINGS.values())
}.values()
every_chain = pytest.mark.parametrize("settings", APART, ids=lambda s: s.key)
every_number = pytest.mark.parametrize("one", NUMBERS, ids=lambda one: one.key)


def some(grid: str = "abridged", people: float = 3e6) -> tuple[Panel, CauseCounts]:
    slope = np.array([0.092, 0.1, 0.105])
    panel = gompertz_panel(
        GRIDS[grid],
        seed=3,
        slope=slope,
        level=0.1 / np.exp(86 * slope),
        people=people,
        infant=0.01,
    )
    return panel, parted(panel)


@every_number
def test_an_entry_says_what_it_is(one: CauseNumber) -> None:
    assert len(fields(one)) <= 12
    for name in ("key", "symbol", "label", "definition", "formula", "source"):
        assert getattr(one, name).strip() == getattr(one, name) != ""
    assert any(letter.isdigit() for letter in one.source)
    assert one.definition.endswith(".")


@every_chain
@pytest.mark.parametrize("x", [0, 1, 4, 12, -2, -1])
def test_slopes_by_deaths_of_the_cause_and_of_others(settings: Settings, x: int) -> None:
    """By a step of the deaths into the complex plane, of which no slope knows."""
    panel, causes = some()
    whole = part(panel, causes, settings)
    for cause in range(3):
        stepped = causes.deaths.astype(complex)
        stepped[..., cause, x] += 1j * STEP
        beside = part(replace(panel, deaths=stepped.sum(axis=-2)), CauseCounts(stepped), settings)
        for one in NUMBERS:
            moves = whole.moves(one.read(whole))
            own, others = (whole.chain.rates.per_death(by) for by in (moves.by_rate, moves.all))
            expected = one.read(beside).value.imag / STEP  # [cause, ...]
            own_row = (np.arange(3) == cause)[:, None]
            found = np.where(own_row, own[..., x], others[..., x])
            size = np.abs(own).max(axis=-1)
            assert_allclose(found / size, expected / size, atol=1e-11, err_msg=one.key)


def test_slopes_where_nobody_died() -> None:
    """A first death at an age moves a number as the slope there says."""
    panel, causes = some(people=400_000)
    deaths = causes.deaths.copy()
    deaths[..., 4] = 0.0
    panel = replace(panel, deaths=deaths.sum(axis=-2))
    whole = part(panel, CauseCounts(deaths), PLAIN)
    for cause in range(3):
        first = deaths.copy()
        first[..., cause, 4] = 1e-3
        beside = part(replace(panel, deaths=first.sum(axis=-2)), CauseCounts(first), PLAIN)
        for one in NUMBERS:
            slopes = one.read(whole)
            moves = whole.moves(slopes)
            own, others = (
                whole.chain.rates.per_death(by)[..., 4] for by in (moves.by_rate, moves.all)
            )
            found = np.where((np.arange(3) == cause)[:, None], own, others)
            step = (one.read(beside).value - slopes.value) / 1e-3
            assert_allclose(found, step, rtol=2e-3, atol=1e-4 * np.abs(own).max(), err_msg=one.key)


@every_chain
def test_a_split_of_the_batch_changes_no_bit(settings: Settings) -> None:
    panel, causes = some()
    together = estimates(NUMBERS, panel, causes, settings)
    for where in (1, slice(1, 3)):
        own = causes.over(lambda array, where=where: array[where])
        for key, found in estimates(NUMBERS, panel[where], own, settings).items():
            for name in Estimate.__slots__:
                whole = getattr(together[key], name)[where]
                assert_array_equal(getattr(found, name), whole, f"{key} {name}")


def test_a_gap_is_of_its_own_population() -> None:
    panel, causes = some()
    torn = causes.deaths.copy()
    torn[1, 0, 7] = np.nan
    whole = estimates(NUMBERS, panel, causes, PLAIN)
    gapped = replace(panel, deaths=torn.sum(axis=-2))
    for key, found in estimates(NUMBERS, gapped, CauseCounts(torn), PLAIN).items():
        assert np.isnan(found.value[1]).all()
        assert (found.reason[1] == Reason.NOT_AVAILABLE).all()
        assert_array_equal(found.value[[0, 2]], whole[key].value[[0, 2]], key)


@every_chain
def test_what_adds_up_adds_up_to_the_number_of_all(settings: Settings) -> None:
    panel, causes = some("irregular")
    found = estimates(NUMBERS, panel, causes, settings)
    all_ = of_all([find("edagger"), find("H"), find("75q0")], panel, settings)
    assert_allclose(found["chance"].value.sum(axis=-1), 1, atol=1e-12)
    for key, whole in (("edagger", "edagger"), ("H", "H"), ("chance75", "75q0")):
        assert_allclose(found[key].value.sum(axis=-1), all_[whole].value, atol=1e-12)
    cells = losses.years_lost(panel, causes, settings)
    assert_allclose(cells.sum(axis=-1), found["edagger"].value, atol=1e-12)
    assert_allclose(cells.sum(axis=(-2, -1)), all_["edagger"].value, atol=1e-12)


@every_chain
def test_a_cause_of_all_deaths_has_the_numbers_of_all(settings: Settings) -> None:
    """Nothing else moves it: value and standard error are the same; limits nearly, since a first
    death of another cause, which there might have been, weighs nearly as one of this."""
    panel, _ = some()
    alone = CauseCounts(np.stack([panel.deaths, 0 * panel.deaths], axis=-2))
    found = estimates((*losses.FAMILY, decrements.BEFORE_75), panel, alone, settings)
    whole = of_all([find("edagger"), find("H"), find("75q0")], panel, settings)
    for key, other in (("edagger", "edagger"), ("H", "H"), ("chance75", "75q0")):
        for name in ("value", "low", "high", "se"):
            one, same = getattr(found[key], name)[..., 0], getattr(whole[other], name)
            exact = 1e-9 if name in ("value", "se") else 1e-4
            assert_allclose(one, same, rtol=exact, err_msg=f"{key} {name}")


def test_a_death_counted_weighs_by_those_it_stands_for() -> None:
    """Each counted death worth two: twice the variance. Worths may differ from cause to cause."""
    panel, causes = some()
    plain = estimates(NUMBERS, panel, causes, PLAIN)
    halved = CauseCounts(causes.deaths, causes.deaths / 2)
    for key, found in estimates(NUMBERS, panel, halved, PLAIN).items():
        assert_allclose(found.value, plain[key].value, rtol=1e-12)
        assert_allclose(found.se, np.sqrt(2) * plain[key].se, rtol=1e-9, err_msg=key)
    worth = np.array([1.0, 1.5, 2.0])[:, None]
    unlike = CauseCounts(causes.deaths, causes.deaths / worth)
    whole = part(panel, unlike, PLAIN)
    for one in NUMBERS:
        slopes = one.read(whole)
        moves = whole.moves(slopes)
        own, others = (whole.chain.rates.per_death(by) for by in (moves.by_rate, moves.all))
        for cause in range(3):
            weights = np.stack([own[cause] if j == cause else others[cause] for j in range(3)])
            deaths = np.moveaxis(causes.deaths, -2, 0)
            expected = (weights**2 * deaths * worth[:, None]).sum(axis=(0, -1))
            found = whole.chance(slopes).variance[cause]
            assert_allclose(found, expected, rtol=1e-9, err_msg=one.key)


def test_persons_counted_wrongly_widen_every_interval() -> None:
    panel, causes = some()
    plain = estimates(NUMBERS, panel, causes, PLAIN)
    for key, found in estimates(NUMBERS, panel, causes, SETTINGS["almanac-1-population-2"]).items():
        assert_array_equal(found.value, plain[key].value)
        assert (found.high - found.low > plain[key].high - plain[key].low).all(), key


def test_causes_that_do_not_add_up_are_refused() -> None:
    panel, causes = some()
    with pytest.raises(ValueError, match="give every death a cause"):
        estimates(NUMBERS, panel, CauseCounts(causes.deaths[..., :2, :]), PLAIN)


@pytest.mark.parametrize("people", [60_000, 1_000_000])
def test_intervals_hold_the_truth_about_as_often_as_they_say(people: float) -> None:
    """Short version: 300 populations of one law, whose causes are known shares."""
    law = gompertz_panel(people=people, slope=np.full(300, 0.1))
    rng = np.random.default_rng(8)
    share = np.stack([np.linspace(0.1, 0.6, len(law.grid)), np.linspace(0.3, 0.1, len(law.grid))])
    share = np.concatenate([share, 1 - share.sum(axis=0, keepdims=True)])
    expected = law.deaths[..., None, :] * share
    drawn = rng.poisson(expected).astype(float)
    truth = {
        one.key: one.read(part(law, CauseCounts(expected), PLAIN)).value[:, 0] for one in NUMBERS
    }
    panel = replace(law, deaths=drawn.sum(axis=-2))
    for key, found in estimates(NUMBERS, panel, CauseCounts(drawn), PLAIN).items():
        held = (found.low <= truth[key]) & (truth[key] <= found.high)
        known = np.isfinite(found.low)
        assert known.mean() > 0.5
        for cause in range(3):
            often = held[:, cause][known[:, cause]].mean()
            assert 0.91 <= often <= 0.995, (key, cause, often)
