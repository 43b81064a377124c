"""Denmark 1974-2012 from the counts, against values computed elsewhere."""

import numpy as np
import pytest

from engine.chain import gradient, run
from engine.decomposition import arriaga
from engine.indicators import find as indicator
from engine.settings import find
from engine.tables import LifeTable, Partials, pull
from tests.published import denmark

DIGITS = 1e-6  # relative; the values have eight digits


def tables(sex: str) -> LifeTable:
    return run(denmark.panel(sex), find("almanac-1")).table


@pytest.mark.fast
@pytest.mark.parametrize("sex", denmark.SEXES)
@pytest.mark.parametrize(("column", "age"), [("e0", 0), ("e65", 65), ("e80", 80)])
def test_life_expectancy(sex: str, column: str, age: int) -> None:
    np.testing.assert_allclose(
        tables(sex).ex[:, age], denmark.summary(sex, column), rtol=0, atol=DIGITS
    )


def chiang_weights(table: LifeTable) -> np.ndarray:
    """What multiplies var(qx) in Chiang's variance of e0; nothing for the open group."""
    n, a = table.grid.widths[:-1], table.ax[..., :-1]
    return (table.lx[..., :-1] * (n - a + table.ex[..., 1:])) ** 2


def binomial_variance(table: LifeTable, deaths: np.ndarray) -> np.ndarray:
    q = table.qx[..., :-1]
    return np.where(deaths > 0, q**2 * (1 - q) / np.maximum(deaths, 1), 0.0)


@pytest.mark.fast
@pytest.mark.parametrize("sex", denmark.SEXES)
def test_chiangs_standard_error(sex: str) -> None:
    """Chiang (1984): var(e0) = sum l^2 (n - a + e)^2 q^2 (1 - q) / D over the closed groups."""
    table, deaths = tables(sex), denmark.panel(sex).deaths[:, :-1]
    variance = (chiang_weights(table) * binomial_variance(table, deaths)).sum(axis=-1)
    np.testing.assert_allclose(
        np.sqrt(variance), denmark.summary(sex, "se_e0"), rtol=DIGITS, atol=0
    )


@pytest.mark.fast
@pytest.mark.parametrize("sex", denmark.SEXES)
def test_the_adjoint_with_binomial_variance_and_no_open_group_is_chiangs(sex: str) -> None:
    table, deaths = tables(sex), denmark.panel(sex).deaths[:, :-1]
    binomial = binomial_variance(table, deaths)
    g = pull(table, Partials(ex=np.eye(100)[0])).mx[..., :-1]  # ax held, as Chiang does
    n, m, a = table.grid.widths[:-1], table.mx[..., :-1], table.ax[..., :-1]
    per_m = n / (1 + (n - a) * m) ** 2
    ours = (g**2 * binomial / per_m**2).sum(axis=-1)
    np.testing.assert_allclose(ours, (chiang_weights(table) * binomial).sum(axis=-1), rtol=1e-12)


@pytest.mark.fast
@pytest.mark.parametrize("sex", denmark.SEXES)
@pytest.mark.parametrize("years", [(1974, 1994), (1994, 2012), (2011, 2012)])
def test_arriaga(sex: str, years: tuple[int, int]) -> None:
    first, last = (run(denmark.one(sex, year), find("almanac-1")).table for year in years)
    asked = {"sex": sex, "year1": str(years[0]), "year2": str(years[1])}
    expected = [
        float(row["contribution_years"])
        for row in denmark.rows("denmark_arriaga.csv")
        if asked.items() <= row.items()
    ]
    found = arriaga(last, first)
    assert len(expected) == 100
    np.testing.assert_allclose(found, expected, rtol=0, atol=1e-6)
    assert found.sum() == pytest.approx(last.ex[0] - first.ex[0], abs=1e-9)
    assert sum(expected) == pytest.approx(last.ex[0] - first.ex[0], abs=1e-6)


@pytest.mark.fast
@pytest.mark.parametrize("sex", denmark.SEXES)
def test_what_the_first_year_rule_adds_to_e_dagger(
    sex: str, capsys: pytest.CaptureFixture[str]
) -> None:
    """-sum m de0/dm through the whole chain is e-dagger and what a0 moves with m0: measured."""
    chain = run(denmark.panel(sex), find("almanac-1"))
    table, rates = chain.table, chain.rates
    whole = -(rates.mx * gradient(indicator("e0"), chain)).sum(axis=-1)
    remainder = whole - denmark.summary(sex, "edagger_A")
    np.testing.assert_allclose(  # with a0 held the identity is exact
        whole + rates.mx[:, 0] * chain.separation.own[:, 0] * _by_first_year(table),
        indicator("edagger").value(chain),
        rtol=1e-12,
    )
    with capsys.disabled():
        print(
            f"\n  of e-dagger, {sex}: a0(m0) adds {remainder.min():.6f} to {remainder.max():.6f}",
            end="",
        )
    assert (remainder > 1e-6).all()
    assert (remainder < 5e-4).all()


def _by_first_year(table: LifeTable) -> np.ndarray:
    """d e0 / d a0 with all mx held, in closed form."""
    q, m = table.qx[:, 0], table.mx[:, 0]
    return np.asarray(
        q - q * m / (1 + (1 - table.ax[:, 0]) * m) * (1 - table.ax[:, 0] + table.ex[:, 1])
    )
