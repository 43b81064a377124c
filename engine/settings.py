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

    @property
    def stages(self) -> tuple[Stage, ...]:
        """The chain in order, in words."""
        return (
            Stage("Rates", RATES),
            Stage("Open age group", OPEN_INTERVAL[self.open_interval].format(age=self.fit_from)),
            Stage("Years lived by those who die: first year", FIRST_YEAR[self.first_year]),
            Stage("Years lived by those who die: ages 1 to 4", CHILD[self.child]),
            Stage("Years lived by those who die: other ages", MIDPOINT),
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
FIRST_YEAR = {
    "andreev_kingkade": (
        "From the infant death rate by the rules of Andreev and Kingkade (2015), one for each sex; "
        "for persons the mean of the two, weighted by infant deaths."
    ),
}
CHILD = {
    "coale_demeny": (
        "Where ages 1 to 4 are one group, from the infant death rate by the West rules of Coale "
        "and Demeny (1983), with the same weights as in the first year."
    ),
}
MIDPOINT = (
    "Half the width of the group. Where the rate is so high that more would die than enter, all "
    "who enter die in the group after 1 / m years on average. In the single years of a fitted law "
    "the rate is constant within the year."
)

SETTINGS: dict[str, Settings] = {
    settings.key: settings
    for settings in (
        Settings("almanac-1", "Open age group closed by its own death rate", "one_over_m"),
        Settings("almanac-1-gompertz", "Open age group spread by a Gompertz law", "gompertz"),
        Settings("almanac-1-kannisto", "Open age group spread by a Kannisto law", "kannisto"),
    )
}


def find(key: str) -> Settings:
    """The named settings; ValueError lists the names there are."""
    if key not in SETTINGS:
        raise ValueError(f"no settings are named {key!r}; the names are {', '.join(SETTINGS)}")
    return SETTINGS[key]
