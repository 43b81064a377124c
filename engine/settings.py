"""Named, frozen chains of choices that turn counts into numbers.

An entry is never edited once figures were published under it: a better choice is a new name.
"""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Stage:
    """One step of a chain, as the methods page prints it."""

    name: str
    sentence: str


@dataclass(frozen=True, slots=True)
class Settings:
    """One named chain. Keys of stages are those of the tables in engine/stages."""

    key: str
    label: str
    open_interval: str  # key of engine.stages.open_interval.OPEN_INTERVALS
    first_year: str = "andreev_kingkade"  # key of engine.stages.separation.FIRST_YEAR
    child: str = "coale_demeny"  # key of engine.stages.separation.CHILD
    level: float = 0.95  # confidence level of intervals
    fit_from: int = 70  # age from which a law is fitted
    least_exposure: float = 5000.0  # person-years below which no figure is given
    few_exposure: float = 20000.0  # person-years below which a figure is flagged
    open_share: float = 0.05  # share of births that may reach an open group whose spread is read
    draws: int = 400  # simulated tables behind an interval of an indicator that is not smooth
    ageing_span: tuple[int, int] = (40, 84)  # completed ages over which the ageing rate is read
    years: int = 1  # years whose counts are added up: the one named and those before it
    smoothing: str = "none"  # key of engine.stages.smoothing.SMOOTHINGS
    borrow: bool = False  # an open group without deaths takes the rate of the whole
    inside: str = "midpoint"  # key of engine.stages.inside.INSIDE
    least_open_age: int = (
        0  # closed by its own rate below this age, no expectation of life is given
    )
    sound_open_age: int = 0  # and below this one, with a caution
    # from which age on person-years are uncertain by how many per cent (one standard deviation)
    population_error: tuple[tuple[int, float], ...] = ()
    rate_limits: str = "gamma"  # or "dobson": limits of rates

    @property
    def stages(self) -> tuple[Stage, ...]:
        """The chain in order, in words."""
        return (
            *([Stage("Years", YEARS.format(years=self.years))] if self.years > 1 else []),
            Stage("Rates", RATES),
            *([Stage("Smoothing", SMOOTHING[self.smoothing])] if self.smoothing != "none" else []),
            Stage("Open age group", self._open_group),
            Stage("Years lived by those who die: first year", FIRST_YEAR[self.first_year]),
            Stage("Years lived by those who die: ages 1 to 4", CHILD[self.child]),
            Stage("Years lived by those who die: other ages", INSIDE[self.inside]),
            *([Stage("Intervals", self._intervals)] if self.population_error else []),
            *([Stage("Intervals of rates", DOBSON)] if self.rate_limits == "dobson" else []),
        )

    @property
    def _open_group(self) -> str:
        limits = LEAST_OPEN_AGE.format(least=self.least_open_age, sound=self.sound_open_age)
        return " ".join(
            (
                OPEN_INTERVAL[self.open_interval].format(age=self.fit_from),
                *([BORROWED] if self.borrow else []),
                *([limits] if self.least_open_age else []),
            )
        )

    @property
    def _intervals(self) -> str:
        steps = (f"by {percent:g} % from age {age}" for age, percent in self.population_error)
        return POPULATION_ERROR.format(steps=", ".join(steps))


def span(period: str, years: int) -> tuple[str, ...]:
    """The years that are added up, in order: the one named and those before it.

    Raises: ValueError where the period is no year, or the years reach before the year 1.
    >>> span("2014", 3)
    ('2012', '2013', '2014')
    """
    if not (len(period) == 4 and period.isdecimal() and int(period) >= years >= 1):
        raise ValueError(
            f"{period!r} with {years - 1} years before it is no span of years; "
            "name its last year by four digits"
        )
    return tuple(f"{year:04}" for year in range(int(period) - years + 1, int(period) + 1))


YEARS = (
    "The deaths and the person-years of {years} years, the one named and those before it, are "
    "added up at each age (women and men each for themselves); a rate is that of the years "
    "together, and the figure is labelled by the first and the last of them. Years that are set "
    "side by side share data where their spans overlap."
)
RATES = (
    "Deaths divided by person-years. An age group without person-years is joined with the one "
    "below it: both take the rate of the two together."
)
OPEN_INTERVAL = {
    "one_over_m": (
        "Those who reach the open age group live on for 1 / m years on average. Where the group "
        "begins at 85 this can make life expectancy at birth too long by 0.2 of a year; where at "
        "80, by 0.6 of a year; where at 75, by more than a year."
    ),
    "gompertz": (
        "Above the open age a Gompertz law takes the place of the data: fitted by Poisson "
        "likelihood to the closed groups from age {age}, it is read in single years up to 130."
    ),
    "kannisto": (
        "Above the open age a Kannisto law takes the place of the data: fitted by Poisson "
        "likelihood to the closed groups from age {age}, it is read in single years up to 130."
    ),
}
BORROWED = (
    "Where nobody died in the group, the death rate that the larger area has there is borrowed, "
    "and the figure is marked. It is taken as known: the interval leaves out its own chance."
)
LEAST_OPEN_AGE = (
    "Where the group begins below {least}, no expectation of life is given, and below {sound} only "
    "with a caution: in Danish counts of 39 years it came out up to 1.3 years too long at 75, 2.4 "
    "at 70 and 3.9 at 65."
)
SMOOTHING = {
    "p_spline": (
        "From age 10 to the open age group, death rates are read off a smooth curve fitted by "
        "Poisson likelihood to the counts (P-spline); how smooth it is, each population's own "
        "counts decide. The other rates are kept as counted."
    ),
}
FIRST_YEAR = {
    "andreev_kingkade": (
        "From the infant death rate by the rules of Andreev and Kingkade (2015), one for each sex; "
        "for persons the mean of the two, weighted by infant deaths."
    ),
    "coale_demeny": (
        "From the infant death rate by the West rules of Coale and Demeny (1983), one for each "
        "sex; for persons the mean of the two, weighted by infant deaths. At a rate of 0.107 the "
        "printed rules step down by some 0.002 of a year."
    ),
    "midpoint": (
        "Half a year. Today most infants who die do so in their first weeks, so that this is too "
        "long; life expectancy hardly minds."
    ),
    "constant_rate": (
        "As if the death rate were the same throughout the year. Today most infants who die do so "
        "in their first weeks, so that this is too long; life expectancy hardly minds."
    ),
}
CHILD = {
    "coale_demeny": (
        "Where ages 1 to 4 are one group, from the infant death rate by the West rules of Coale "
        "and Demeny (1983), with the same weights as in the first year."
    ),
    "midpoint": "Where ages 1 to 4 are one group, two years.",
    "constant_rate": (
        "Where ages 1 to 4 are one group, as if the death rate were the same throughout it."
    ),
}
POPULATION_ERROR = (
    "Besides chance in deaths, intervals allow for person-years that are wrong {steps}, upwards or "
    "downwards alike (one standard deviation)."
)
DOBSON = (
    "Limits of death rates, standardised ones too, lie as far from the rate, in its standard "
    "errors, as the exact limits of the count of all deaths lie from that count (Dobson and "
    "others, 1991). They are narrower than those of the gamma law, and with few deaths hold the "
    "truth less often."
)
BOUND = (
    "Where the rate is so high that more would die than enter, all who enter die in the group "
    "after 1 / m years on average. In the single years of a fitted law the rate is constant within "
    "the year."
)
INSIDE = {
    "midpoint": f"Half the width of the group. {BOUND}",
    "constant_rate": (
        "As if the death rate were the same throughout the group. At old ages, where it rises "
        "steeply, this is too short: in Danish counts of 39 years in five-year groups it took 0.06 "
        "to 0.08 of a year off life expectancy."
    ),
    "keyfitz": (
        "In groups of five years, from the deaths of the table in the group and the two beside it "
        "by Keyfitz’s iteration (1966), kept between nothing and the width of the group. The first "
        "of these groups is taken at half its width, and the last, below the open age group, as if "
        "its death rate were constant. Groups of other widths are taken at half their width. "
        f"{BOUND}"
    ),
}

SETTINGS: dict[str, Settings] = {
    settings.key: settings
    for settings in (
        Settings("almanac-1", "Open age group closed by its own death rate", "one_over_m"),
        Settings("almanac-1-gompertz", "Open age group spread by a Gompertz law", "gompertz"),
        Settings("almanac-1-kannisto", "Open age group spread by a Kannisto law", "kannisto"),
        Settings(
            "almanac-1-borrow",
            "Open age group without deaths closed by the rate of the larger area",
            "one_over_m",
            borrow=True,
        ),
        Settings(
            "almanac-1-3-years", "Three years of counts taken together", "one_over_m", years=3
        ),
        Settings("almanac-1-5-years", "Five years of counts taken together", "one_over_m", years=5),
        Settings(
            "almanac-1-smooth",
            "Death rates smoothed over age",
            "one_over_m",
            smoothing="p_spline",
        ),
        Settings(
            "almanac-1-keyfitz",
            "Deaths placed within five-year groups by the groups beside them",
            "one_over_m",
            inside="keyfitz",
        ),
        Settings(
            "almanac-1-constant-rate",
            "Death rates constant within each age group",
            "one_over_m",
            first_year="constant_rate",
            child="constant_rate",
            inside="constant_rate",
        ),
        Settings(
            "almanac-1-coale-demeny",
            "First year of life by the rules of Coale and Demeny",
            "one_over_m",
            first_year="coale_demeny",
        ),
        Settings(
            "almanac-1-population-2",
            "Person-years uncertain by 2 %",
            "one_over_m",
            population_error=((0, 2.0),),
        ),
        Settings(
            "almanac-1-dobson",
            "Limits of death rates from the count of all deaths",
            "one_over_m",
            rate_limits="dobson",
        ),
        Settings(
            "almanac-2",
            "Last ages borrowed where nobody died, five-year groups by Keyfitz’s iteration",
            "one_over_m",
            borrow=True,
            inside="keyfitz",
            least_open_age=75,
            sound_open_age=85,
        ),
    )
}


def find(key: str) -> Settings:
    """The named settings; ValueError lists the names there are."""
    if key not in SETTINGS:
        raise ValueError(f"no settings are named {key!r}; the names are {', '.join(SETTINGS)}")
    return SETTINGS[key]
