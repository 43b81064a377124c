"""Distances between colours, in normal sight and in three kinds of colour blindness.

Sources: CIEDE2000 after Sharma, Wu and Dalal (2005), Color Research and Application 30(1); colour
blindness after Machado, Oliveira and Fernandes (2009), IEEE TVCG 15(6), severity 1; contrast after
WCAG 2.2; hue after Ottosson's OKLCH.
"""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

Colours = NDArray[np.float64]  # [..., 3]

_XYZ = np.array(
    [
        [0.4124564, 0.3575761, 0.1804375],
        [0.2126729, 0.7151522, 0.0721750],
        [0.0193339, 0.1191920, 0.9503041],
    ]
)
_WHITE = np.array([0.95047, 1.0, 1.08883])
_BLINDNESS = {
    "protan": [
        [0.152286, 1.052583, -0.204868],
        [0.114503, 0.786281, 0.099216],
        [-0.003882, -0.048116, 1.051998],
    ],
    "deutan": [
        [0.367322, 0.860646, -0.227968],
        [0.280085, 0.672501, 0.047413],
        [-0.011820, 0.042940, 0.968881],
    ],
    "tritan": [
        [1.255528, -0.076749, -0.178779],
        [-0.078411, 0.930809, 0.147602],
        [0.004733, 0.691367, 0.303900],
    ],
}
_LMS = np.array(
    [
        [0.4122214708, 0.5363325363, 0.0514459929],
        [0.2119034982, 0.6806995451, 0.1073969566],
        [0.0883024619, 0.2817188376, 0.6299787005],
    ]
)
_OKLAB = np.array(
    [
        [0.2104542553, 0.7936177850, -0.0040720468],
        [1.9779984951, -2.4285922050, 0.4505937099],
        [0.0259040371, 0.7827717662, -0.8086757660],
    ]
)


def linear(hexes: list[str]) -> Colours:
    """Linear light of "#RRGGBB"."""
    raw = np.array([[int(one[at : at + 2], 16) / 255 for at in (1, 3, 5)] for one in hexes])
    return np.where(raw <= 0.04045, raw / 12.92, ((raw + 0.055) / 1.055) ** 2.4)


def lab(light: Colours) -> Colours:
    ratio = light @ _XYZ.T / _WHITE
    bent = np.where(ratio > 216 / 24389, np.cbrt(ratio), (24389 / 27 * ratio + 16) / 116)
    x, y, z = np.moveaxis(bent, -1, 0)
    return np.stack([116 * y - 16, 500 * (x - y), 200 * (y - z)], axis=-1)


def distance(one: Colours, other: Colours) -> NDArray[np.float64]:
    """CIEDE2000 between colours in Lab."""
    (L1, a1, b1), (L2, a2, b2) = np.moveaxis(one, -1, 0), np.moveaxis(other, -1, 0)
    mean = (np.hypot(a1, b1) + np.hypot(a2, b2)) / 2
    stretch = 1.5 - 0.5 * np.sqrt(mean**7 / (mean**7 + 25.0**7))
    C1, C2 = np.hypot(a1 * stretch, b1), np.hypot(a2 * stretch, b2)
    h1 = np.degrees(np.arctan2(b1, a1 * stretch)) % 360
    h2 = np.degrees(np.arctan2(b2, a2 * stretch)) % 360
    turn = (h2 - h1 + 180) % 360 - 180
    dH = 2 * np.sqrt(C1 * C2) * np.sin(np.radians(turn) / 2)
    L, C = (L1 + L2) / 2, (C1 + C2) / 2
    h = np.where(np.abs(h1 - h2) > 180, (h1 + h2 + 360) / 2, (h1 + h2) / 2)
    T = (
        1
        - 0.17 * np.cos(np.radians(h - 30))
        + 0.24 * np.cos(np.radians(2 * h))
        + 0.32 * np.cos(np.radians(3 * h + 6))
        - 0.20 * np.cos(np.radians(4 * h - 63))
    )
    light = (L2 - L1) / (1 + 0.015 * (L - 50) ** 2 / np.sqrt(20 + (L - 50) ** 2))
    chroma, hue = (C2 - C1) / (1 + 0.045 * C), dH / (1 + 0.015 * C * T)
    blue = np.sin(np.radians(60 * np.exp(-(((h - 275) / 25) ** 2))))
    turned = -2 * np.sqrt(C**7 / (C**7 + 25.0**7)) * blue
    return np.sqrt(np.maximum(light**2 + chroma**2 + hue**2 + turned * chroma * hue, 0))


def sights(light: Colours) -> Iterator[tuple[str, Colours]]:
    """How each kind of eye sees these colours."""
    yield "normal", light
    for name, matrix in _BLINDNESS.items():
        yield name, np.clip(light @ np.array(matrix).T, 0, 1)


def smallest(hexes: list[str]) -> dict[str, float]:
    """Smallest distance of any two, by kind of sight; and smallest step of lightness, for print."""
    light = linear(hexes)
    i, j = np.triu_indices(len(hexes), 1)
    found = {
        name: float(distance(lab(seen)[i], lab(seen)[j]).min()) for name, seen in sights(light)
    }
    return found | {"grey": float(np.diff(np.sort(lab(light)[:, 0])).min())}


def contrast(one: str, other: str) -> float:
    low, high = sorted(float(linear([tone])[0] @ _XYZ[1]) for tone in (one, other))
    return (high + 0.05) / (low + 0.05)


def hue(tone: str) -> tuple[float, float]:
    """OKLCH lightness and hue in degrees."""
    lightness, a, b = _OKLAB @ np.cbrt(_LMS @ linear([tone])[0])
    return float(lightness), float(np.degrees(np.arctan2(b, a)) % 360)
