"""Pairs of populations on which every method is tried: kinks crossed, zeros held, far apart."""

from dataclasses import dataclass, replace

import numpy as np

from engine.ages import Array
from engine.chain import run
from engine.panel import Panel
from engine.settings import Settings, find
from tests.factories import GRIDS, gompertz_panel
from tests.published import denmark

GRID = GRIDS["abridged"]
PLAIN = find("almanac-1")


@dataclass(frozen=True)
class Pair:
    this: Panel
    that: Panel

    @classmethod
    def beside_others(cls, this: Panel, that: Panel) -> "Pair":
        """With a whole that both are part of, people to standardise by, and births."""
        whole = gompertz_panel(this.grid, people=1e7, level=3e-5)
        births = np.array([12_000.0, 50.0, 30.0])
        return cls(
            *(replace(one, whole=whole, standard=whole, births=births) for one in (this, that))
        )

    def same_years(self, settings: Settings = PLAIN) -> "Pair":
        """That with the person-years of this, so that rates are all that differs."""
        rates = run(self.that, settings).rates.mx
        exposure = self.this.exposure
        return Pair(self.this, replace(self.that, exposure=exposure, deaths=rates * exposure))


def zero_cell() -> Pair:
    """The rate at 95-99 passes the one at which all who enter die, too."""
    this = gompertz_panel(GRID, sex="m", level=2e-5)
    this.deaths[4] = 0
    return Pair(this, gompertz_panel(GRID, sex="m", infant=0.01))


def crossing(sex: str, infants: tuple[float, float], ratio: tuple[float, float]) -> Pair:
    """Infant rates on both sides of a break point, the sexes' mix changing as well for persons."""
    this, that = (
        gompertz_panel(GRID, sex=sex, infant=infant, level=level, slope=0.095)
        for infant, level in zip(infants, (1.8e-5, 2.4e-5), strict=True)
    )
    if sex == "p":
        this.infant_weight[:], this.infant_ratio[:] = (0.45, 0.55), ratio
        that.infant_weight[:], that.infant_ratio[:] = (0.42, 0.58), (0.85, 1.15)
    return Pair(this, that)


def danes() -> Pair:
    this, that = (denmark.one("male", year).regroup(denmark.ABRIDGED) for year in (2012, 1974))
    return Pair(this, that)


def far_apart() -> Pair:
    """More than forty years of life expectancy between the two."""
    this = gompertz_panel(GRID, level=1e-5, infant=0.003)
    that = gompertz_panel(GRID, level=2.5e-4, infant=0.2)
    that.deaths[-1] *= 3
    return Pair(this, that)


PAIRS = {
    name: Pair.beside_others(pair.this, pair.that)
    for name, pair in {
        "Danish men 1974 to 2012": danes(),
        "men across the break of a0": crossing("m", (0.008, 0.045), (1, 1)),
        "women across all breaks, upwards": crossing("f", (0.13, 0.005), (1, 1)),
        "a group without deaths": zero_cell(),
        "far apart": far_apart(),
        "persons across a break, mix changing": crossing("p", (0.006, 0.019), (0.9, 1.08)),
    }.items()
}
ONE_SEX = {name: pair for name, pair in PAIRS.items() if "persons" not in name}


def scale(by_age: Array, difference: Array) -> float:
    """What the rounding of a decomposition is measured by."""
    return max(abs(float(difference)), float(np.abs(by_age).sum()))
