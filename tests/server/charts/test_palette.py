"""The colours in the style sheet, by computation: apart for every kind of eye and in grey print.

Measured for paper: 18.3 normal, 18.0 protan, 18.4 deutan, 18.5 tritan; the first four 28.7, 24.1,
18.5, 18.9; contrast on the ground 9.4 3.8 6.0 3.2 11.5 4.6 13.7; L* 28 53 40 57 22 47 16. On the
dark ground 17.0, 16.6, 16.7, 16.2.
"""

import re

import numpy as np
import pytest

from tests.house.tree import ROOT
from tests.server.charts.colour import contrast, distance, hue, lab, linear, smallest

CSS = (ROOT / "static/css/tokens.css").read_text(encoding="utf-8")


def tokens(css: str) -> dict[str, str]:
    return dict(re.findall(r"--([a-z0-9-]+): (#[0-9A-F]{6})", css))


PAPER = tokens(CSS.partition("@media")[0])
DARK = tokens(CSS.partition("prefers-color-scheme: dark")[2].partition("color-scheme: light")[0])
GROUNDS = pytest.mark.parametrize("sheet", [PAPER, DARK], ids=["paper", "dark"])
SERIES = [f"s{number}" for number in range(1, 8)]


def series(sheet: dict[str, str], count: int = 7) -> list[str]:
    return [sheet[name] for name in SERIES[:count]]


@pytest.mark.parametrize(
    ("one", "other", "expected"),
    [  # Sharma, Wu and Dalal (2005), table 1
        ((50.0, 2.6772, -79.7751), (50.0, 0.0, -82.7485), 2.0425),
        ((50.0, 3.1571, -77.2803), (50.0, 0.0, -82.7485), 2.8615),
        ((50.0, -1.3802, -84.2814), (50.0, 0.0, -82.7485), 1.0000),
        ((50.0, 2.5, 0.0), (73.0, 25.0, -18.0), 27.1492),
        ((50.0, 2.5, 0.0), (61.0, -5.0, 29.0), 22.8977),
        ((50.0, 2.5, 0.0), (56.0, -27.0, -3.0), 31.9030),
        ((50.0, 2.5, 0.0), (58.0, 24.0, 15.0), 19.4535),
    ],
)
def test_the_distance_is_the_published_one(
    one: tuple[float, ...], other: tuple[float, ...], expected: float
) -> None:
    assert float(distance(np.array(one), np.array(other))) == pytest.approx(expected, abs=5e-5)


@pytest.mark.parametrize(
    ("sheet", "count", "floors"),
    [
        (PAPER, 7, {"normal": 18.3, "protan": 17.9, "deutan": 18.4, "tritan": 18.4, "grey": 4.7}),
        (PAPER, 4, {"normal": 28.6, "protan": 24.0, "deutan": 18.4, "tritan": 18.9}),
        (PAPER, 3, {"grey": 11.0}),
        (DARK, 7, {"normal": 16.9, "protan": 16.5, "deutan": 16.6, "tritan": 16.2}),
    ],
)
def test_no_two_series_are_nearer_than_this(
    sheet: dict[str, str], count: int, floors: dict[str, float]
) -> None:
    found = smallest(series(sheet, count))
    assert {name: found[name] for name, floor in floors.items() if found[name] < floor} == {}


@GROUNDS
def test_every_series_stands_out_from_its_ground(sheet: dict[str, str]) -> None:
    assert min(contrast(tone, sheet["ground"]) for tone in series(sheet)) >= 3.24


@GROUNDS
def test_every_text_can_be_read(sheet: dict[str, str]) -> None:
    texts = ["ink", "ink-2", "accent", "rubric", *(f"{name}t" for name in SERIES)]
    weak = {name: contrast(sheet[name], sheet["ground"]) for name in texts}
    floors = {"ink": 13.0, "ink-2": 6.8, "accent": 8.0, "rubric": 6.8}
    assert {name: ratio for name, ratio in weak.items() if ratio < floors.get(name, 4.5)} == {}


@GROUNDS
def test_the_text_of_a_series_has_its_hue(sheet: dict[str, str]) -> None:
    for name in SERIES:
        turn = hue(sheet[name])[1] - hue(sheet[f"{name}t"])[1]
        assert abs((turn + 180) % 360 - 180) < 3


@GROUNDS
def test_no_series_is_pink(sheet: dict[str, str]) -> None:
    for tone in series(sheet):
        lightness, angle = hue(tone)
        assert not (lightness > 0.48 and (angle > 302 or angle < 38)), tone


def test_lightness_orders_the_first_three() -> None:
    lightness = lab(linear(series(PAPER, 3)))[:, 0]
    assert float(np.ptp(lightness)) > 20
