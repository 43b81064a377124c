"""The death rate of all ages together."""

from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs, Unit
from engine.standardisation import Weighted, crude

PER_100000 = Unit("per_100000", "per 100,000 person-years", 100_000, 1, limits="gamma")


def _crude(chain: Chain) -> Weighted:
    return crude(chain.panel.grid, chain.rates.mx, chain.rates.exposure)


def _value(chain: Chain) -> Array:
    return _crude(chain).value


def _gradient(chain: Chain) -> Array:
    return _crude(chain).gradient


FAMILY = (
    Indicator(
        key="cdr",
        symbol="CDR",
        label="Crude death rate",
        unit=PER_100000,
        definition=(
            "Deaths for every 100,000 years lived in the population. It says how many deaths there"
            " are to count with, and rises as a population grows older though nobody's risk at a"
            " given age rises: to compare areas or years take a standardised rate."
        ),
        formula="sum of D(x) / sum of N(x), D deaths and N person-years, all ages",
        source=(
            "Preston, Heuveline & Guillot (2001), Demography, chapter 1 (the rate); Garwood (1936),"
            " Biometrika 28, 437-442 (exact limits)"
        ),
        why_not_smooth="",
        needs=Needs(),
        value=_value,
        partials=_gradient,
    ),
)
