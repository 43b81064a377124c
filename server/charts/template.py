"""What all figures share. Colours are tokens ("@ink", "@s1/.15") that the page's script reads from
the style sheet, so paper, dark ground and print are one figure; no figure carries a height."""

from dataclasses import dataclass
from typing import Any

LAYOUT: dict[str, Any] = {
    "font": {
        "family": "Ysabeau Ebb, Gill Sans, Candara, sans-serif",
        "size": 14.5,
        "color": "@ink",
        "weight": 480,
    },
    "paper_bgcolor": "rgba(0,0,0,0)",
    "plot_bgcolor": "rgba(0,0,0,0)",
    "showlegend": False,
    "dragmode": False,
    "hovermode": "closest",
    "hoverdistance": 30,
    "hoverlabel": {
        "bgcolor": "@ground",
        "bordercolor": "@ink",
        "align": "left",
        "font": {"family": "Ysabeau Ebb, Gill Sans, sans-serif", "size": 14.5, "color": "@ink"},
    },
    "bargap": 0,
    "xaxis": {
        "ticklabelstandoff": 0,
        "showgrid": False,
        "zeroline": False,
        "showline": False,
        "ticks": "outside",
        "ticklen": 9,
        "tickwidth": 1,
        "tickcolor": "rgba(0,0,0,0)",
        "tickformat": "d",
        "fixedrange": True,
        "tickfont": {"color": "@ink"},
    },
    "yaxis": {
        "showgrid": True,
        "gridcolor": "@ink-2/.55",
        "gridwidth": 1,
        "griddash": "1px,4px",
        "zeroline": False,
        "showline": False,
        "ticks": "",
        "ticklabelstandoff": 7,
        "fixedrange": True,
        "automargin": False,
        "tickfont": {"color": "@ink-2"},
    },
}
DASH = {"f": "solid", "m": "7px,4px", "p": "1.5px,3.5px"}
WIDTH = {"this": 2.4, "that": 1.6, "one": 2.0, "many": 1.6}
DIVISION = {"age": 10, "year": 5}  # of the graduated rule
RULE = 6  # its height, px
CHARACTER = 6.7  # mean width at 14.5 px, measured


@dataclass(frozen=True, slots=True)
class Measure:
    """One of the three widths a figure is laid out for; lengths in px."""

    width: int
    heights: dict[str, int]  # by size of chart; the style sheet says the same
    left: int
    right: int
    top: int
    bottom: int
    text: float
    foot: float  # text of the row of figures under bars; 0: no room for it
    narrow: bool = False


WIDE = Measure(872, {"low": 270, "std": 380, "tall": 500, "rows": 560}, 52, 64, 34, 46, 14.5, 12.5)
NARROW = Measure(
    354, {"low": 240, "std": 300, "tall": 400, "rows": 560}, 46, 12, 32, 44, 13.5, 0, narrow=True
)
PRINT = Measure(640, {"low": 160, "std": 200, "tall": 230, "rows": 430}, 40, 60, 34, 46, 12, 9)
