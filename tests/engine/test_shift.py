"""Shift, squeeze and early deaths: what is known of populations made to differ in one thing."""

from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.estimates import Reason
from engine.hazards import GOMPERTZ, MAKEHAM_INFANT, SILER, Law, grouped, local
from engine.indicators import INDICATORS, difference
from engine.panel import Panel
from engine.settings import find
from engine.shift import PARTS, VALUES, ShiftSqueeze, shift_squeeze
from engine.survival import adult_mode
from tests.published import denmark

GRID = AgeGrid((0, 1, *range(5, 100, 5)))
PLAIN = find("almanac-1")
ALL = (*VALUES, "difference")
LAWS = pytest.mark.parametrize("law", [MAKEHAM_INFANT, SILER], ids=lambda law: law.key)
BASE = {"mode": 83.0, "slope": 0.1, "background": 5e-4, "infant": 0.006, "decline": 1.5}
OTHER = {"mode": 86.0, "slope": 0.11, "background": 2e-4, "infant": 0.003, "decline": 1.5}


def population(law: Law, *, people: float = 2e6, **changed: float) -> Panel:
    """Deaths that the law expects in a population that thins out, on five-year groups; the open
    group has the rate that closes the law's own table."""
    given = BASE | changed
    n, mids = GRID.widths[:-1], GRID.mids[:-1]
    exposure = people * n / 80 * np.exp(-((mids / 75) ** 4))
    centre = float(mids.mean())
    logs = {
        "level": np.log(given["slope"]) - given["slope"] * (given["mode"] - centre),
        "slope": given["slope"],
        "background": np.log(given["background"]),
        "infant": np.log(given["infant"]),
        "decline": given["decline"],
    }
    at = np.array([logs[name] for name in law.names])
    rates = local(law, grouped(mids, n, exposure, centre), at).mu
    old = np.arange(95.005, 150, 0.01)
    alive = np.exp(-0.01 * np.cumsum(law.hazard(old, at, centre)))
    rates, exposure = np.append(rates, 1 / (0.01 * alive.sum())), np.append(exposure, people / 5e3)
    return Panel.of(GRID, rates * exposure, exposure, sex="f")


def life_expectancy(law: Law, **changed: float) -> float:
    """By steps of a five hundredth of a year, written out."""
    given, x = BASE | changed, np.arange(0.001, 150, 0.002)
    hazard = given["slope"] * np.exp(given["slope"] * (x - given["mode"])) + given["background"]
    if law is SILER:
        hazard += given["infant"] * np.exp(-given["decline"] * x)
    else:
        hazard += given["infant"] * (x < 1)
    return float(0.002 * np.exp(-(np.cumsum(hazard) - hazard / 2) * 0.002).sum())


def values(found: ShiftSqueeze, names: tuple[str, ...] = ALL) -> np.ndarray:
    return np.stack([getattr(found, name).value for name in names])


def errors(found: ShiftSqueeze) -> np.ndarray:
    return np.stack([getattr(found, name).se for name in ALL])


@pytest.mark.fast
@LAWS
@pytest.mark.parametrize(
    ("part", "name"),
    [("shift", "mode"), ("squeeze", "slope"), ("background", "background"), ("infant", "infant")],
)
def test_populations_that_differ_in_one_thing(law: Law, part: str, name: str) -> None:
    """All of the laws' difference is that part, and its sign is the difference's own."""
    this, that = population(law, **{name: OTHER[name]}), population(law)
    found = shift_squeeze(this, that, PLAIN, law=law)
    expected = life_expectancy(law, **{name: OTHER[name]}) - life_expectancy(law)
    for other in PARTS:
        value = getattr(found, other).value
        assert value == pytest.approx(expected if other == part else 0.0, abs=1e-6)
    assert expected > 0.1
    assert getattr(found, part).low < expected < getattr(found, part).high


@pytest.mark.fast
def test_a_steeper_fall_after_birth_counts_with_the_infants() -> None:
    this, that = population(SILER, decline=3.0), population(SILER)
    found = shift_squeeze(this, that, PLAIN, law=SILER)
    expected = life_expectancy(SILER, decline=3.0) - life_expectancy(SILER)
    assert expected > 0.1
    np.testing.assert_allclose(values(found, PARTS), [0, 0, 0, expected], atol=1e-6)


@pytest.mark.fast
@LAWS
def test_parts_and_rest_add_up_and_change_sides(law: Law) -> None:
    one, other = population(law, **OTHER), population(law)
    forth, back = (shift_squeeze(*pair, PLAIN, law=law) for pair in ((one, other), (other, one)))
    found = values(forth)
    assert found[:-1].sum() == pytest.approx(found[-1], abs=1e-12)
    laws = life_expectancy(law, **OTHER) - life_expectancy(law)
    assert values(forth, PARTS).sum() == pytest.approx(laws, abs=1e-6)
    np.testing.assert_allclose(values(back), -found, atol=1e-11)
    np.testing.assert_allclose(errors(back), errors(forth), rtol=1e-9)


@pytest.mark.fast
@LAWS
def test_the_parts_are_integrals_along_the_straight_line(law: Law) -> None:
    """Against the sum over 20 short steps, in each of which the parameters move one by one, read
    at their middle."""
    found = shift_squeeze(population(law, **OTHER), population(law), PLAIN, law=law)
    owner = {"mode": "shift", "slope": "squeeze", "background": "background", "infant": "infant"}
    steps = 20
    for name, part in owner.items():
        total = 0.0
        for step in range(steps):
            at = {k: BASE[k] + (step + 0.5) / steps * (OTHER[k] - BASE[k]) for k in BASE}
            reach = (OTHER[name] - BASE[name]) / steps / 2
            ahead, behind = ({**at, name: at[name] + side * reach} for side in (1, -1))
            total += life_expectancy(law, **ahead) - life_expectancy(law, **behind)
        assert getattr(found, part).value == pytest.approx(total, abs=2e-3)


@pytest.mark.fast
@LAWS
@pytest.mark.parametrize("overlap", [0.0, 0.4])
def test_standard_errors_are_what_single_deaths_move(law: Law, overlap: float) -> None:
    """var = sum (d value / d deaths)^2 D, by differences of the whole; shared deaths move both."""
    this, that = population(law, people=4e5, **OTHER), population(law, people=8e5)
    shared = Panel.of(GRID, overlap * this.deaths, overlap * this.exposure, sex="f")
    found = shift_squeeze(this, that, PLAIN, law=law, shared=shared)

    def moved(which: int) -> np.ndarray:
        step = 1e-3 * (this, that)[which].deaths
        weights = []
        for sign in (1, -1):
            counts = [np.broadcast_to(one.deaths, (21, 21)).copy() for one in (this, that)]
            counts[which] += sign * np.diag(step)
            sides = (
                Panel.of(GRID, deaths, np.broadcast_to(one.exposure, deaths.shape), sex="f")
                for deaths, one in zip(counts, (this, that), strict=True)
            )
            weights.append(values(shift_squeeze(*sides, PLAIN, law=law)))
        return np.asarray((weights[0] - weights[1]) / (2 * step))

    g, h = moved(0), moved(1)
    variance = (g**2 * this.deaths + h**2 * that.deaths + 2 * g * h * shared.deaths).sum(axis=-1)
    np.testing.assert_allclose(errors(found), np.sqrt(variance), rtol=1e-4)


@pytest.mark.fast
@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-population-2"])
def test_the_difference_is_given_as_everywhere(settings: str) -> None:
    this, that = population(MAKEHAM_INFANT, people=4e4, **OTHER), population(MAKEHAM_INFANT)
    found = shift_squeeze(this, that, find(settings)).difference
    expected = difference(INDICATORS["e0"], this, that, find(settings))
    for name in ("value", "low", "high", "se"):
        assert getattr(found, name) == getattr(expected, name)


@pytest.mark.fast
def test_an_error_of_the_population_moves_the_parts() -> None:
    """Of very many people hardly any chance is left. 2 % more persons make every rate 2 % lower:
    with the same slope b, the mode comes log(1.02) / b later and the background is 2 % less."""
    this, that = (population(MAKEHAM_INFANT, people=1e14, **one) for one in (OTHER, {}))
    found = shift_squeeze(this, that, find("almanac-1-population-2"))
    squares = dict.fromkeys(("shift", "background"), 0.0)
    for fewer, more in (((0.98, 1), (1.02, 1)), ((1, 0.98), (1, 1.02))):
        ends = []
        for times in (fewer, more):
            sides = (
                replace(one, exposure=one.exposure * by)
                for one, by in zip((this, that), times, strict=True)
            )
            ends.append(shift_squeeze(*sides, PLAIN))
        for name in squares:
            moved = getattr(ends[0], name).value - getattr(ends[1], name).value
            squares[name] += float(moved / 2) ** 2
    for name, square in squares.items():
        assert float(getattr(found, name).se) == pytest.approx(np.sqrt(square), rel=1e-6)
    # d e0 / d mode is nearly 1
    by_mode = np.hypot(0.02 / BASE["slope"], 0.02 / (BASE | OTHER)["slope"])
    assert float(found.shift.se) == pytest.approx(by_mode, rel=0.1)


@pytest.mark.fast
def test_intervals_hold_what_they_say() -> None:
    """200 pairs of samples: the limits of each part hold the true one in 95 % within chance."""
    law, rng = MAKEHAM_INFANT, np.random.default_rng(5)
    true = values(shift_squeeze(population(law, **OTHER), population(law), PLAIN, law=law))
    sides = []
    for changed in (OTHER, {}):
        one = population(law, people=1e6, **changed)
        deaths = rng.poisson(one.deaths, (200, len(GRID))).astype(float)
        sides.append(Panel.of(GRID, deaths, np.broadcast_to(one.exposure, deaths.shape), sex="f"))
    found = shift_squeeze(*sides, PLAIN, law=law)
    assert np.isfinite(values(found)).mean() > 0.99
    for name, expected in zip(ALL, true, strict=True):
        one = getattr(found, name)
        held = ((one.low < expected) & (expected < one.high))[np.isfinite(one.low)]
        assert held.mean() == pytest.approx(0.95, abs=0.05), name


@pytest.mark.fast
@pytest.mark.parametrize("sex", denmark.SEXES)
def test_danish_years(sex: str) -> None:
    """1974 to 1994 and to 2012: the difference is the published summary's; the law explains all but
    0.1 of a year of it, and most of what 38 years brought is shift."""
    grid = AgeGrid(tuple(range(96)))
    years = denmark.panel(sex)
    this, that = years[np.array([20, 38])], years[np.array([0, 0])]
    found = shift_squeeze(this.regroup(grid), that.regroup(grid), PLAIN)
    e0 = denmark.summary(sex, "e0")
    np.testing.assert_allclose(found.difference.value, e0[[20, 38]] - e0[0], atol=0.02)
    assert (np.abs(found.unexplained.value) < 0.1).all()
    assert found.shift.value[1] > 0.7 * found.difference.value[1]
    assert (found.shift.low > 0).all()
    moved = adult_mode(found.laws[0]).age - adult_mode(found.laws[1]).age
    np.testing.assert_allclose(found.shift.value, moved, rtol=0.2)
    for misfit in found.misfits:
        assert (np.abs(misfit) < 0.15).all()


@pytest.mark.fast
def test_a_background_of_0_takes_part() -> None:
    """On one side, on both, and its part is that of a background that is nearly 0."""
    few = np.where((GRID.mids[:-1] > 5) & (GRID.mids[:-1] < 50), 0.3, 1.0)
    none, some = population(MAKEHAM_INFANT, background=1e-12), population(MAKEHAM_INFANT)
    none = replace(none, deaths=none.deaths * np.append(few, 1.0))
    one = shift_squeeze(none, some, PLAIN)
    assert one.laws[0].at_bound.any()
    found = values(one)
    assert np.isfinite(found).all()
    assert np.isfinite(errors(one)).all()
    assert one.background.value > 0.2
    assert found[:-1].sum() == pytest.approx(found[-1], abs=1e-12)
    both = shift_squeeze(none, replace(none, deaths=1.1 * none.deaths), PLAIN)
    assert both.background.value == 0
    assert np.isnan(both.background.low)
    assert np.isfinite(both.shift.low)


@pytest.mark.fast
def test_each_pair_for_itself() -> None:
    this, that = denmark.panel("male")[20:26].regroup(GRID), denmark.panel("male")[:6].regroup(GRID)
    together = shift_squeeze(this, that, PLAIN)
    for row in range(6):
        alone = shift_squeeze(this[row], that[row], PLAIN)
        np.testing.assert_array_equal(values(alone), values(together)[:, row])
        np.testing.assert_array_equal(errors(alone), errors(together)[:, row])


@pytest.mark.fast
def test_no_law_and_a_law_that_fits_badly() -> None:
    """No parts, and why; the difference stands, and so does by how much the law is off."""
    sound = population(MAKEHAM_INFANT)
    falling = replace(sound, deaths=0.02 * np.exp(-0.02 * np.array(GRID.starts)) * sound.exposure)
    old = (np.array(GRID.starts) >= 60) & (np.array(GRID.starts) < 75)
    struck = replace(sound, deaths=sound.deaths + 0.1 * old * sound.exposure)
    found = shift_squeeze(Panel.stack([falling, struck, sound]), Panel.stack([sound] * 3), PLAIN)
    assert found.shift.reason.tolist() == [Reason.NO_LAW, Reason.NO_LAW, Reason.NONE]
    for name in (*PARTS, "unexplained"):
        assert np.isnan(getattr(found, name).value).tolist() == [True, True, False]
    assert np.isfinite(found.difference.value).all()
    assert np.isnan(found.misfits[0][0])
    assert found.misfits[0][1] < -1


@pytest.mark.fast
def test_what_keeps_life_expectancy_from_being_read_keeps_the_parts_too() -> None:
    sound = population(MAKEHAM_INFANT)
    gap, none = sound.deaths.copy(), sound.deaths.copy()
    gap[4], none[-1] = np.nan, 0.0
    this = Panel.stack([replace(sound, deaths=deaths) for deaths in (gap, none)])
    found = shift_squeeze(this, Panel.stack([sound, sound]), PLAIN)
    for name in ALL:
        one = getattr(found, name)
        assert one.reason.tolist() == [Reason.NOT_AVAILABLE, Reason.NO_DEATHS_IN_OPEN_GROUP]
        assert np.isnan(one.value).all()


@pytest.mark.fast
def test_what_is_refused() -> None:
    sound = population(MAKEHAM_INFANT)
    with pytest.raises(ValueError, match="the age groups differ"):
        shift_squeeze(sound, sound.regroup(AgeGrid((0, 1, 5, 60, 85))), PLAIN)
    with pytest.raises(ValueError, match="Gompertz has no background"):
        shift_squeeze(sound, sound, PLAIN, law=GOMPERTZ)
