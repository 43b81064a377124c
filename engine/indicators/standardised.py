"""Death rates as they would be at the ages of a standard population, and deaths against those that
the rates of a larger area would have brought."""

import re
from collections.abc import Callable

import numpy as np

from engine.ages import AgeGrid, Array
from engine.chain import Chain
from engine.estimates import Reason
from engine.indicator import Indicator, Needs, Unit
from engine.indicators.pattern import AGE, Pattern, require_ages
from engine.indicators.rates import PER_100000
from engine.panel import Panel
from engine.standardisation import (
    LEAST_DEATHS,
    Weighted,
    direct,
    indirect,
    observed_over_expected,
)
from engine.standards import STANDARDS, Standard

Read = Callable[[Chain], Weighted]

LIMITS = "Fay & Feuer (1997), Statistics in Medicine 16, 791-801 (limits)"
NO_RATE = f"With fewer than {LEAST_DEATHS} deaths there is no rate (common practice)."


def by_standard(standard: Standard) -> Indicator:
    """The death rate at the ages of a printed standard population."""

    def read(chain: Chain) -> Weighted:
        return _direct(chain, np.array(standard.weights, float), standard.grid)

    return _standardised(
        read,
        key=f"asr_{standard.key}",
        symbol=f"ASR {standard.symbol}",
        label=f"Age-standardised death rate ({standard.label})",
        of=f"the {standard.label}",
        note=standard.note,
        source=f"{standard.source} (the weights); {LIMITS}",
        needs=Needs(least_deaths=LEAST_DEATHS),
    )


def before_age(age: int, key: str) -> Indicator:
    """The death rate before an exact age, at the ages of a printed standard before it."""
    require_ages(0, age)
    standard = STANDARDS[key]
    if not standard.grid.has(age):
        raise ValueError(
            f"no age group of the {standard.label} begins at {age}; those are {standard.grid.code}"
        )
    people = np.where(np.array(standard.starts) < age, standard.weights, 0.0)

    def read(chain: Chain) -> Weighted:
        grid, rates = chain.panel.grid, chain.rates
        if not grid.has(age):
            return _nothing(chain)
        younger = np.array(grid.starts) < age
        deaths = (np.real(rates.mx * rates.exposure) * younger).sum(axis=-1)
        found = _direct(chain, people, standard.grid)
        return Weighted(np.where(deaths >= LEAST_DEATHS, found.value, np.nan), found.gradient)

    return _standardised(
        read,
        key=f"asr{age}_{key}",
        symbol=f"ASR {age} {standard.symbol}",
        label=f"Age-standardised death rate before {age} ({standard.label})",
        of=f"the {standard.label} before {age}",
        note=f"Deaths from {age} on do not count, nor the years lived there.",
        source=f"{standard.source} (the weights); {LIMITS}",
        needs=Needs(ages=(age,), least_deaths=LEAST_DEATHS, otherwise=Reason.TOO_FEW_DEATHS),
    )


def by_population(code: str) -> Indicator:
    """The death rate at the ages of a population-year of the collection: area, sex and year."""

    def read(chain: Chain) -> Weighted:
        people = chain.panel.standard
        if people is None:
            return _nothing(chain)
        return _direct(chain, people.exposure, people.grid)

    return _standardised(
        read,
        key=f"asr_by_{code}",
        symbol=f"ASR {code}",
        label=f"Age-standardised death rate (ages of {code})",
        of=f"{code}, a population of this collection",
        note="The weights are its person-years.",
        source=(
            "Breslow & Day (1987), Statistical Methods in Cancer Research II, chapter 2 (the rate);"
            f" {LIMITS}"
        ),
        needs=Needs(standard=code, least_deaths=LEAST_DEATHS, otherwise=Reason.NO_STANDARD),
    )


def _direct(chain: Chain, people: Array, ages: AgeGrid) -> Weighted:
    return direct(chain.panel.grid, chain.rates.mx, chain.rates.exposure, people, ages)


def _nothing(chain: Chain) -> Weighted:
    return Weighted(
        np.full(chain.rates.mx.shape[:-1], np.nan), np.full(chain.rates.mx.shape, np.nan)
    )


def _standardised(
    read: Read,
    *,
    key: str,
    symbol: str,
    label: str,
    of: str,
    note: str,
    source: str,
    needs: Needs,
) -> Indicator:
    return Indicator(
        key=key,
        symbol=symbol,
        label=label,
        unit=PER_100000,
        definition=" ".join(
            part
            for part in (
                "The deaths there would be for every 100,000 years lived if the population died at"
                f" its own rates but had the ages of {of}. It serves to compare areas and years"
                " whose people differ in age, by one standard on both sides; it is not the rate of"
                " any real population.",
                note,
                NO_RATE,
            )
            if part
        ),
        formula=(
            "sum of w(x) m(x) / sum of w(x), w the people of the standard, over the finest age"
            " groups that counts and standard share, counts summed first"
        ),
        source=source,
        why_not_smooth="",
        needs=needs,
        value=lambda chain: read(chain).value,
        partials=lambda chain: read(chain).gradient,
    )


def _against_whole(chain: Chain, read: Callable[[Array, Array, Panel], Weighted]) -> Weighted:
    whole = chain.panel.whole
    return _nothing(chain) if whole is None else read(chain.rates.mx, chain.rates.exposure, whole)


def _ratio(chain: Chain) -> Weighted:
    return _against_whole(chain, observed_over_expected)


def _indirect(chain: Chain) -> Weighted:
    return _against_whole(chain, indirect)


NEEDS_WHOLE = Needs(whole=True, otherwise=Reason.NO_WHOLE)
INDIRECT = (
    "Breslow & Day (1987), Statistical Methods in Cancer Research II, chapter 2 (indirect"
    " standardisation); Garwood (1936), Biometrika 28, 437-442 (exact limits)"
)
NOT_COMPARABLE = (
    "Two of them do not compare with one another, since each is weighted by its own people: each"
    " compares with the larger area only."
)
AS_KNOWN = (
    "The rates of the larger area are taken as known; the deaths of the population are among its"
    " own."
)

FAMILY = (
    *(by_standard(standard) for standard in STANDARDS.values()),
    Indicator(
        key="smr",
        symbol="SMR",
        label="Deaths over those expected (standardised mortality ratio)",
        unit=Unit("ratio_to_expected", "ratio", 1, 2, limits="gamma"),
        definition=(
            "The deaths there were over those there would have been if people of each age had died"
            " at the rates of the larger area: 1.00 is as many as expected, 1.10 a tenth more."
            f" {NOT_COMPARABLE} {AS_KNOWN}"
        ),
        formula=(
            "sum of D(x) / sum of M(x) N(x), D deaths, N person-years, M the death rates of the"
            " larger area"
        ),
        source=INDIRECT,
        why_not_smooth="",
        needs=NEEDS_WHOLE,
        value=lambda chain: _ratio(chain).value,
        partials=lambda chain: _ratio(chain).gradient,
    ),
    Indicator(
        key="isr",
        symbol="ISR",
        label="Indirectly standardised death rate",
        unit=PER_100000,
        definition=(
            "The crude death rate of the larger area times the deaths there were over those"
            " expected at its rates: a way to put that ratio in deaths for every 100,000 years"
            f" lived, where deaths are too few for a directly standardised rate. {NOT_COMPARABLE}"
            f" {AS_KNOWN}"
        ),
        formula="SMR times the crude death rate of the larger area",
        source=INDIRECT,
        why_not_smooth="",
        needs=NEEDS_WHOLE,
        value=lambda chain: _indirect(chain).value,
        partials=lambda chain: _indirect(chain).gradient,
    ),
)
CODE = r"[A-Za-z0-9_.-]{1,32}\.[fmp]\.[0-9]{4}"  # area, sex, year
PATTERNS = (
    Pattern("asr_by_north.f.2020", re.compile(f"asr_by_({CODE})"), by_population),
    Pattern("asr75_esp2013", re.compile(f"asr{AGE}_({'|'.join(STANDARDS)})"), before_age),
)
