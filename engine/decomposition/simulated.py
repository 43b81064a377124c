"""Limits of stepwise contributions, by keyed simulation."""

from dataclasses import replace
from typing import NamedTuple

import numpy as np

from engine.ages import AgeGrid, Array
from engine.blocks import blocks
from engine.chain import run
from engine.decomposition.stepwise import of_values, passed_through, stepwise
from engine.indicator import Indicator
from engine.panel import Panel
from engine.settings import Settings
from engine.simulation import widest
from engine.streams import PairDraws


class Limits(NamedTuple):
    low: Array
    high: Array


def stepwise_limits(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    drawn: PairDraws,
    lived: PairDraws,
    groups: AgeGrid,
) -> Limits:
    """Bias-corrected percentiles of the stepwise contributions of drawn populations. Choices made
    on the observed ones, such as of a smoothing, hold.

    Shape:   deaths drawn and person-years lived [draw, ..., age] -> [..., group].
    Missing: nan where the contribution is, or more than 1 % of the draws give none.
    """
    ours, theirs = (panel.over(lambda array: array[None]) for panel in (this, that))
    observed, found = run(passed_through(ours, theirs), settings), []
    for some in blocks(len(drawn.this), observed.rates.mx.size // len(this.grid)):
        these = (
            replace(panel, deaths=deaths[some], exposure=years[some], counted=None)
            for panel, deaths, years in zip((ours, theirs), drawn, lived, strict=True)
        )
        with np.errstate(all="ignore"):
            passed = run(passed_through(*these), settings)
            found.append(of_values(indicator.drawn(observed, passed)).by_age)
    redrawn = this.grid.regroup(np.concatenate(found), groups)
    value = this.grid.regroup(stepwise(indicator, this, that, settings).by_age, groups)
    ends = widest(redrawn.reshape(len(redrawn), -1), value.ravel(), settings.level)
    return Limits(*ends.reshape(2, *value.shape))
