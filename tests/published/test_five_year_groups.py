"""Years lived in five-year groups, against the single ages they were made of and a printed table.

Danish women and men through 39 years: a table from five-year groups under each rule, less the table
from the same counts in single years, closed at the same age.
"""

import csv
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import Chain, run
from engine.indicators import find as indicator
from engine.panel import Panel
from engine.settings import find
from tests.published import denmark

PLAIN = find("almanac-1")
RULES = ("midpoint", "constant_rate", "keyfitz")


@cache
def truth(sex: str, open_age: int) -> Chain:
    return run(denmark.panel(sex).regroup(AgeGrid(tuple(range(open_age + 1)))), PLAIN)


def off(key: str, open_age: int, inside: str) -> np.ndarray:
    """By how much an indicator from five-year groups is off, [sex, year]."""
    fives, read = AgeGrid((0, 1, *range(5, open_age + 1, 5))), indicator(key)
    return np.array(
        [
            read.value(run(denmark.panel(sex).regroup(fives), replace(PLAIN, inside=inside)))
            - read.value(truth(sex, open_age))
            for sex in denmark.SEXES
        ]
    )


def size(key: str, open_age: int, inside: str) -> float:
    """Root mean square of it over both sexes and all years."""
    return float(np.sqrt(np.mean(off(key, open_age, inside) ** 2)))


@pytest.mark.fast
@pytest.mark.parametrize("open_age", [85, 90, 95])
def test_the_groups_beside_place_deaths_best(
    open_age: int, capsys: pytest.CaptureFixture[str]
) -> None:
    found = {key: [size(key, open_age, rule) for rule in RULES] for key in ("e0", "edagger", "H")}
    with capsys.disabled():
        for key, sizes in found.items():
            said = ", ".join(f"{rule} {one:.4f}" for rule, one in zip(RULES, sizes, strict=True))
            print(f"\n  fives open at {open_age}, {key} off by {said}", end="")
    for midpoint, constant, keyfitz in found.values():
        assert keyfitz < 0.9 * midpoint
        assert keyfitz < 0.8 * constant
    assert found["e0"][RULES.index("keyfitz")] < 0.02
    assert found["edagger"][RULES.index("keyfitz")] < 0.035


@pytest.mark.fast
def test_a_constant_rate_shortens_life_by_what_the_settings_say() -> None:
    means = [off("e0", open_age, "constant_rate").mean(axis=1) for open_age in (85, 90, 95)]
    assert np.min(means) > -0.085
    assert np.max(means) < -0.055


@pytest.mark.fast
@pytest.mark.parametrize(("open_age", "most"), [(75, 1.3), (70, 2.4), (65, 3.9)])
def test_an_open_age_so_low_lengthens_life_by_what_the_settings_say(
    open_age: int, most: float
) -> None:
    grid = AgeGrid(tuple(range(open_age + 1)))
    longest = max(
        (run(panel.regroup(grid), PLAIN).table.ex[:, 0] - run(panel, PLAIN).table.ex[:, 0]).max()
        for panel in map(denmark.panel, denmark.SEXES)
    )
    assert most - 0.1 < longest < most
    said = next(s for s in find("almanac-2").stages if s.name == "Open age group").sentence
    assert f"{most:g}" in said


@pytest.mark.fast
def test_near_the_printed_years_lived_of_austrian_men() -> None:
    """Those were graduated by another iteration, which also reads how the population's size changes
    from group to group; from 15 on, where deaths are many, the two are near each other."""
    with open(Path(__file__).parent / "austria_males_1992.csv", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    grid = AgeGrid(tuple(int(row["age"]) for row in rows))
    deaths, exposure, printed = (
        np.array([float(row[name]) for row in rows]) for name in ("deaths", "population", "ax")
    )
    panel = Panel.of(grid, deaths, exposure, sex="m")
    table = run(panel, find("almanac-1-keyfitz")).table
    adult = slice(grid.position(15), grid.position(80))
    assert np.abs(table.ax[adult] - printed[adult]).max() < 0.045
    assert np.abs(2.5 - printed[adult]).max() > 0.2
    plain = run(panel, PLAIN).table.ex[0]
    assert abs(table.ex[0] - 72.889) < abs(plain - 72.889)
