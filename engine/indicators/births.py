"""Deaths before birth and in the first year of life, over births: counts of one year over counts of
the same year."""

from collections.abc import Callable

import numpy as np

from engine.ages import Array
from engine.chain import Chain, Tally
from engine.estimates import Reason
from engine.indicator import Indicator, Needs, Unit
from engine.panel import BIRTHS

LIMITS = "Garwood (1936), Biometrika 28, 437-442 (exact limits)"
RATES = f"Preston, Heuveline & Guillot (2001), Demography, chapter 2; {LIMITS}"
PER_LIVE = Unit("per_1000_live_births", "per 1,000 live births", 1000, 1, limits="count")
PER_ALL = Unit("per_1000_all_births", "per 1,000 births, live and still", 1000, 1, limits="count")
LIVE, STILL, NEONATAL = BIRTHS


def _births(chain: Chain, name: str) -> Array:
    return chain.panel.births[..., BIRTHS.index(name)]


def _infants(chain: Chain) -> Array:
    """Deaths before the first birthday; nan where they are no group of their own."""
    deaths = chain.rates.deaths
    alone = chain.panel.grid.starts[:2] == (0, 1)
    return deaths[..., 0] if alone else np.full(deaths.shape[:-1], np.nan)


def _over(count: Array, births: Array) -> Tally:
    """A count over births; nan where there are none, or where a count cannot be."""
    with np.errstate(all="ignore"):
        weight = np.where(births > 0, 1 / births, np.nan)
    return Tally(np.where(np.real(count) >= 0, count, np.nan), weight)


def _infant(chain: Chain) -> Tally:
    return _over(_infants(chain), _births(chain, LIVE))


def _neonatal(chain: Chain) -> Tally:
    return _over(_births(chain, NEONATAL), _births(chain, LIVE))


def _postneonatal(chain: Chain) -> Tally:
    return _over(_infants(chain) - _births(chain, NEONATAL), _births(chain, LIVE))


def _still(chain: Chain) -> Tally:
    still = _births(chain, STILL)
    return _over(still, _births(chain, LIVE) + still)


def _rate(
    read: Callable[[Chain], Tally],
    *,
    key: str,
    label: str,
    definition: str,
    formula: str,
    needs: Needs,
    unit: Unit = PER_LIVE,
    source: str = RATES,
) -> Indicator:
    def value(chain: Chain) -> Array:
        tally = read(chain)
        return np.asarray(tally.count * tally.weight)

    return Indicator(
        key=key,
        symbol=key.upper(),
        label=label,
        unit=unit,
        definition=definition,
        formula=formula,
        source=source,
        why_not_smooth="",
        needs=needs,
        value=value,
        partials=read,
    )


FIRST_YEAR = (0, 1)
NOT_ITS_OWN = (
    " Some of those who died were born the year before: where births rise or fall fast, the chance"
    " of dying of the children born in the year is another number."
)

FAMILY = (
    _rate(
        _infant,
        key="imr",
        label="Infant mortality rate",
        definition=(
            "Deaths before the first birthday for every 1,000 live births of the same year."
            + NOT_ITS_OWN
        ),
        formula="D(0) / B, D(0) deaths before age 1, B live births",
        needs=Needs(ages=FIRST_YEAR, births=(LIVE,), otherwise=Reason.NO_BIRTHS),
    ),
    _rate(
        _neonatal,
        key="nmr",
        label="Neonatal mortality rate",
        definition=(
            "Deaths in the first 28 days of life for every 1,000 live births of the same year."
        ),
        formula="D(under 28 days) / B, B live births",
        needs=Needs(births=(LIVE, NEONATAL), otherwise=Reason.NO_BIRTHS),
    ),
    _rate(
        _postneonatal,
        key="pnmr",
        label="Post-neonatal mortality rate",
        definition=(
            "Deaths from the 28th day of life to the first birthday for every 1,000 live births of"
            " the same year: infant deaths less neonatal ones. The three rates add up, since all"
            " are set over the same births."
        ),
        formula="(D(0) - D(under 28 days)) / B, D(0) deaths before age 1, B live births",
        needs=Needs(ages=FIRST_YEAR, births=(LIVE, NEONATAL), otherwise=Reason.NO_BIRTHS),
    ),
    _rate(
        _still,
        key="sbr",
        label="Stillbirth rate",
        definition=(
            "Stillbirths for every 1,000 births, live and still together. From which week of"
            " pregnancy a stillbirth counts differs between places, and is as in the counts"
            " handed in."
        ),
        formula="S / (B + S), S stillbirths, B live births",
        needs=Needs(births=(LIVE, STILL), otherwise=Reason.NO_BIRTHS),
        unit=PER_ALL,
        source=(
            "Blencowe et al. (2016), National, regional, and worldwide estimates of stillbirth"
            f" rates in 2015, Lancet Global Health 4, e98-e108; {LIMITS}"
        ),
    ),
)
