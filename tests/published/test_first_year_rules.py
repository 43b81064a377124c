"""The rules for ax in the first years of life: printed coefficients and worked examples."""

import json
from pathlib import Path

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import run
from engine.panel import Panel
from engine.settings import find
from engine.stages.separation import ANDREEV_KINGKADE, COALE_DEMENY

PRINTED = json.loads((Path(__file__).parent / "first_year_rules.json").read_text(encoding="utf-8"))
SEXES = ("female", "male")  # in the order of a panel
GRID = AgeGrid((0, 1, 5, 10))


def ax(infant: float, panel: Panel) -> np.ndarray:
    mx = np.array([infant, infant / 15, 0.001, 0.1])
    return run(panel, find("almanac-1"), mx=mx).table.ax


def of_sex(sex: str) -> Panel:
    return Panel.of(GRID, np.ones(4), np.ones(4), sex=sex[0])


@pytest.mark.fast
@pytest.mark.parametrize("example", PRINTED["examples"], ids=lambda e: f"{e['sex']} {e['m0']}")
def test_worked_examples(example: dict[str, float]) -> None:
    found = ax(example["m0"], of_sex(str(example["sex"])))
    assert found[0] == pytest.approx(example["a0_ak"], abs=5e-6)
    assert found[1] == pytest.approx(example["a1_4_cd"], abs=5e-6)


@pytest.mark.fast
@pytest.mark.parametrize(
    ("ours", "theirs"),
    [
        (ANDREEV_KINGKADE, PRINTED["andreev_kingkade_a0"]),
        (COALE_DEMENY, PRINTED["coale_demeny_west"]["4a1"]),
    ],
    ids=["Andreev and Kingkade", "Coale and Demeny"],
)
def test_coefficients(ours: tuple, theirs: dict[str, list[list[float]]]) -> None:
    for sex, pieces in zip(SEXES, ours, strict=True):
        assert [list(piece) for piece in pieces] == [[a, c, b] for a, _, c, b in theirs[sex]]


@pytest.mark.fast
def test_persons_take_the_mean_weighted_by_infant_deaths() -> None:
    women = Panel.of(GRID, np.array([30.0, 1, 1, 1]), np.array([6000.0, 9, 9, 9]), sex="f")
    men = Panel.of(GRID, np.array([50.0, 1, 1, 1]), np.array([6250.0, 9, 9, 9]), sex="m")
    persons = run(Panel.persons(women, men), find("almanac-1")).table.ax
    apart = [run(panel, find("almanac-1")).table.ax for panel in (women, men)]
    np.testing.assert_allclose(persons[:2], (30 * apart[0] + 50 * apart[1])[:2] / 80, rtol=1e-14)
    assert apart[0][0] != apart[1][0]
