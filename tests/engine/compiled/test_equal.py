"""Compiled code gives what the numpy engine gives."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from engine import bulk
from engine.ages import AgeGrid
from engine.chain import run
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from engine.smoothing import Basis
from tests.factories import GRIDS, codes, gompertz_panel

PLAIN = SETTINGS["almanac-1"]
CHAINS = [PLAIN, SETTINGS["almanac-1-coale-demeny"]]
ALL = {
    **GRIDS,
    "110 and over": AgeGrid(tuple(range(111))),
    "85 and over": AgeGrid((0, 1, *range(5, 86, 5))),
    "no first year": AgeGrid((0, 5, 15, 40, 65, 80, 95)),
}


def drawn(grid: AgeGrid, sex: str, *, seed: int, batch: int = 37) -> Panel:
    """Small and large populations with empty cells of every kind and infant rates on both sides of
    every break; the last one has a gap."""
    rng = np.random.default_rng(seed)
    slope = rng.uniform(0.08, 0.12, batch)
    people = 10 ** rng.uniform(3, 6.5, batch)
    infant = rng.choice([0.003, 0.02, 0.07, 0.09, 0.11, 0.3], batch)
    panel = gompertz_panel(grid, slope=slope, level=0.1 / np.exp(86 * slope), infant=infant)
    exposure = np.round(panel.exposure * people[:, None] / 5e5, 3)
    deaths = rng.poisson(panel.deaths * people[:, None] / 5e5).astype(float)
    deaths[rng.random(deaths.shape) < 0.05] = 0.0
    exposure[rng.random(deaths.shape) < 0.03] = 0.0
    deaths[:4, -1], exposure[4:6, -3:], exposure[6, 0], deaths[-1, 3] = 0.0, 0.0, 0.0, np.nan
    high = exposure[7] > 0
    deaths[7, high] = (3 * exposure[7])[high]  # more die than half the width allows
    plain = Panel.of(grid, deaths, exposure, sex="f" if sex == "mixed" else sex)
    if sex != "mixed":
        return plain
    share = rng.dirichlet((1, 1), batch)
    share[::5] = (1.0, 0.0)
    return replace(plain, infant_weight=share, infant_ratio=rng.uniform(0.5, 1.6, (batch, 2)))


@pytest.fixture(params=ALL)
def grid(request: pytest.FixtureRequest) -> AgeGrid:
    return ALL[request.param]


@pytest.mark.parametrize("settings", CHAINS, ids=lambda one: one.key)
@pytest.mark.parametrize("sex", ["f", "m", "p", "mixed"])
def test_tables_and_the_numbers_read_off_them(grid: AgeGrid, sex: str, settings: Settings) -> None:
    panel = drawn(grid, sex, seed=len(grid))
    fast = bulk.tables(panel, settings, by="compiled")
    plain = bulk.tables(panel, settings, by="numpy")
    for name in bulk.COLUMNS:
        ours, theirs = getattr(fast.table, name), getattr(plain.table, name)
        if name == "ex":
            assert_allclose(ours, theirs, rtol=1e-12, atol=0, err_msg=name)
        else:
            assert_array_equal(ours, theirs, err_msg=name)
    for key in bulk.NUMBERS:
        assert_allclose(fast.numbers[key], plain.numbers[key], rtol=1e-12, atol=1e-12, err_msg=key)
    assert np.isfinite(plain.numbers["e0"]).sum() > 3


@pytest.mark.parametrize("count", [1, 2, 5, 68, 69, 400])
def test_tables_of_any_number_of_populations_are_the_same(count: int) -> None:
    panel = drawn(GRIDS["single"], "p", seed=2, batch=400)
    together = bulk.tables(panel, PLAIN, by="compiled")
    first = bulk.tables(panel[:count], PLAIN, by="compiled")
    for name in bulk.COLUMNS:
        assert_array_equal(getattr(first.table, name), getattr(together.table, name)[:count])
    for key in bulk.NUMBERS:
        assert_array_equal(first.numbers[key], together.numbers[key][:count])


def test_tables_keep_the_shape_of_their_batch() -> None:
    panel = drawn(GRIDS["abridged"], "f", seed=3, batch=12)
    square = panel.over(lambda array: array.reshape(3, 4, -1))
    for by in ("compiled", "numpy"):
        flat = bulk.tables(panel, PLAIN, by=by)  # type: ignore[arg-type]
        folded = bulk.tables(square, PLAIN, by=by)  # type: ignore[arg-type]
        assert_array_equal(folded.table.lx.reshape(12, -1), flat.table.lx)
        assert_array_equal(folded.numbers["gini"].ravel(), flat.numbers["gini"])


@pytest.mark.parametrize("sex", ["f", "mixed"])
def test_simulated_life_expectancies(grid: AgeGrid, sex: str) -> None:
    panel = drawn(grid, sex, seed=4, batch=10)
    fast, plain = (
        bulk.simulated(panel, PLAIN, codes(panel), draws=60, purpose="equal", by=by).e0
        for by in ("compiled", "numpy")
    )
    assert_allclose(fast, plain, rtol=1e-12)
    assert np.isfinite(plain).any()


@pytest.mark.parametrize("settings", CHAINS, ids=lambda one: one.key)
@pytest.mark.parametrize("sexes", [("f", "f"), ("m", "p"), ("mixed", "mixed")])
def test_contributions(grid: AgeGrid, sexes: tuple[str, str], settings: Settings) -> None:
    this, that = drawn(grid, sexes[0], seed=5), drawn(grid, sexes[1], seed=6)
    fast = bulk.contributions(this, that, settings, by="compiled").contributions
    plain = bulk.contributions(this, that, settings, by="numpy").contributions
    size = np.abs(plain.by_age).sum(axis=-1)
    for name in ("by_age", "remainder", "difference"):
        ours, theirs = getattr(fast, name), getattr(plain, name)
        # a difference of two expectations carries the rounding of both
        scale = size[:, None] if name == "by_age" else np.maximum(size, 1.0)
        assert_array_equal(np.isnan(ours), np.isnan(theirs), err_msg=name)
        assert not np.any(np.abs(ours - theirs) > 1e-12 * scale), name
    assert (size > 0).any()


def test_contributions_do_not_depend_on_the_pairs_beside() -> None:
    """Pairs whose lines are cut into few pieces and into many, through a jump or not."""
    this, that = (drawn(GRIDS["abridged"], "mixed", seed=seed, batch=80) for seed in (10, 11))
    together = bulk.contributions(this, that, PLAIN, by="compiled").contributions
    for part in (*(slice(p, p + 1) for p in range(80)), slice(3, 36), slice(40, 73)):
        alone = bulk.contributions(this[part], that[part], PLAIN, by="compiled").contributions
        assert_array_equal(alone.by_age, together.by_age[part])
        assert_array_equal(alone.difference, together.difference[part])
    assert np.isfinite(together.difference).sum() > 20


def test_contributions_where_the_open_rate_is_hundreds_of_times_the_other() -> None:
    that = gompertz_panel(GRIDS["abridged"])
    fewer = that.deaths.copy()
    fewer[..., -1] *= 0.002
    this = replace(that, deaths=fewer)
    fast, plain = (
        bulk.contributions(this, that, PLAIN, by=by).contributions.by_age
        for by in ("compiled", "numpy")
    )
    assert_allclose(fast, plain, rtol=1e-12, atol=1e-12)


def test_a_pair_of_equal_populations_has_no_difference_to_explain() -> None:
    panel = gompertz_panel(GRIDS["single"], slope=np.array([0.09, 0.1]))
    found = bulk.contributions(panel, panel, PLAIN, by="compiled").contributions
    assert_array_equal(found.by_age, 0.0)


def adult(grid: AgeGrid) -> slice:
    return slice(sum(start < 10 for start in grid.starts), len(grid) - 1)


@pytest.mark.parametrize(
    ("name", "seed", "batch"),
    [
        ("abridged", 7, 37),
        ("single", 7, 37),
        ("irregular", 7, 37),
        ("abridged", 12, 300),
        ("abridged", 19, 300),
    ],
)
def test_curves(name: str, seed: int, batch: int) -> None:
    """The two differ by what rounding moves a fit, the more the stronger the penalty is beside the
    deaths: the condition of the system."""
    grid = GRIDS[name]
    panel, groups = drawn(grid, "f", seed=seed, batch=batch), adult(grid)
    deaths, exposure = panel.deaths[..., groups], panel.exposure[..., groups]
    basis, ages = Basis(grid.starts[groups.start], grid.open_age, 18), grid.mids[groups]
    fast, plain = (
        bulk.curves(basis, ages, deaths, exposure, by=by).curve for by in ("compiled", "numpy")
    )
    read = np.arange(12.0, 98.0)
    known = np.isfinite(plain.coefficients).all(axis=-1)
    assert known.sum() > 10
    assert_array_equal(np.isfinite(fast.coefficients).all(axis=-1), known)
    assert_array_equal(fast.penalty[known], plain.penalty[known])
    apart = np.abs(fast.log_rates(read) - plain.log_rates(read)).max(axis=-1)
    condition = 16 * plain.penalty / deaths.sum(axis=-1)
    assert not np.any((apart > 1e-10 + 1e-12 * condition)[known])


def test_what_compiled_code_cannot_follow_is_refused_by_name() -> None:
    panel = gompertz_panel()
    assert bulk.maker(SETTINGS["almanac-1-keyfitz"]) == "numpy"
    with pytest.raises(ValueError, match="cannot follow almanac-1-keyfitz"):
        bulk.tables(panel, SETTINGS["almanac-1-keyfitz"], by="compiled")
    left_open = bulk.tables(panel, SETTINGS["almanac-1-keyfitz"])
    assert left_open.version == bulk.version("numpy")


def test_a_table_on_which_a_law_stands_is_made_by_numpy() -> None:
    panel = gompertz_panel(slope=np.array([0.09, 0.1, 0.11]))
    settings = SETTINGS["almanac-1-gompertz"]
    found, chain = bulk.tables(panel, settings), run(panel, settings)
    assert found.table.grid == chain.table.grid
    assert_array_equal(found.table.ex, chain.table.ex)


def test_the_record_says_what_made_it() -> None:
    panel = gompertz_panel()
    assert bulk.tables(panel, PLAIN).version.startswith("numba ")
    assert bulk.tables(panel, PLAIN, by="numpy").version == f"numpy {np.__version__}"


def test_without_numba_numpy_does_the_work(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(bulk.importlib.util, "find_spec", lambda name: None)
    assert bulk.maker(PLAIN) == "numpy"
    assert bulk.tables(gompertz_panel(), PLAIN).version.startswith("numpy ")
    with pytest.raises(ValueError, match="numba is not installed"):
        bulk.tables(gompertz_panel(), PLAIN, by="compiled")


def test_nothing_but_the_room_itself_brings_numba_in() -> None:
    import subprocess
    import sys

    code = "import engine.bulk, sys; assert 'numba' not in sys.modules"
    subprocess.run([sys.executable, "-c", code], check=True)
