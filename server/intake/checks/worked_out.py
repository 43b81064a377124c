"""What making people at risk of 1 Januaries, and deaths of rates, leaves to be said."""

from collections.abc import Callable, Sequence

from server.intake.checks.check import Check
from server.intake.forms.found import Found, faults
from server.intake.problems import Fault, Problem


def _told(key: str) -> Callable[[Sequence[Found]], list[Fault]]:
    return lambda found: faults(found, key)


CHECKS: tuple[Check[Sequence[Found]], ...] = (
    Check(
        key="last_january",
        severity="warning",
        meaning="People on 1 January become the people at risk of a year together with those of "
        "the next 1 January. The last of a series has no next one, so it closes the year before "
        "and gives none of its own.",
        found="a population of 1 January {year} without that of the year after",
        expected="the population of the next 1 January too, or that this year needs none",
        remedy="Nothing, if deaths end with the year before; else add the next 1 January.",
        find=_told("last_january"),
        source="Preston, Heuveline & Guillot (2001), Demography, ch. 1",
    ),
    Check(
        key="one_january",
        severity="error",
        meaning="People on 1 January are averaged with those of the next 1 January, and no two "
        "follow each other.",
        found="populations of 1 January with none of the year after",
        expected="populations of two 1 Januaries in a row, for the same area and sex",
        remedy="Add the populations of the next 1 January, or say that the population is that of "
        "the middle of the year.",
        find=_told("one_january"),
    ),
    Check(
        key="january_groups_differ",
        severity="warning",
        meaning="Two 1 Januaries in a row have different age groups, so that their mean is taken "
        "in the groups both have.",
        found="other age groups than on the next 1 January, in {years}",
        expected="the same age groups on both; those both have are {groups}",
        remedy="Give both in the same groups if the ages in between are wanted.",
        find=_told("january_groups_differ"),
    ),
    Check(
        key="rates_without_population",
        severity="error",
        meaning="Rates have no population to be multiplied by, so that no deaths can be worked "
        "out.",
        found="rates without population in {area}: {sexes}, {years}",
        expected="a population for the same areas, sexes and years",
        remedy="Add the population, as a column of this file or as a file of its own.",
        find=_told("rates_without_population"),
    ),
    Check(
        key="people_coarser_than_rates",
        severity="error",
        meaning="The population stands in wider age groups than the rates, so that it is not known "
        "how many people each rate is of.",
        found="rates at ages {ages} in {area}, {sex}, {year}, with a population by {groups}",
        expected="a population in the age groups of the rates or in narrower ones",
        remedy="Give the population in the age groups of the rates.",
        find=_told("people_coarser_than_rates"),
    ),
    Check(
        key="rate_too_high",
        severity="error",
        meaning="A death rate is beyond any that people have; it may be counted per thousand or "
        "more.",
        found="{value} deaths per person-year at age {age}",
        expected="a rate below five",
        remedy="Say in the mapping what rates are to be multiplied by: 1/1000 where they are per "
        "thousand.",
        find=_told("rate_too_high"),
    ),
    Check(
        key="probability_above_one",
        severity="error",
        meaning="A probability is above one; it may be counted per thousand or more, or be a rate.",
        found="{value} at age {age}",
        expected="a probability from 0 to 1",
        remedy="Say in the mapping what probabilities are to be multiplied by: 1/1000 where they "
        "are per thousand; or that they are rates.",
        find=_told("probability_above_one"),
    ),
    Check(
        key="open_group_unknown",
        severity="error",
        meaning="In the open age group all die, at whatever rate: its probability is 1 and does "
        "not say how many die in a year. The probabilities below it do not show it either: there "
        "are fewer than three groups from age 60 on, or they do not rise.",
        found="a probability of dying for the open age group {age}",
        expected="death rates, or deaths, with an open age group; or probabilities in at least "
        "three groups from age 60 on",
        remedy="Hand in death rates or deaths instead.",
        find=_told("open_group_unknown"),
    ),
    Check(
        key="open_group_worked_out",
        severity="warning",
        meaning="In the open age group all die, at whatever rate: its probability is 1 and does "
        "not say how many die in a year. Its rate is worked out by going on with the rise of the "
        "rates from age 60.",
        found="a probability of dying for the open age group {age}",
        expected="death rates or deaths, if they are to be had",
        remedy="Say in the note that the rate of the open age group is worked out; compare life "
        "expectancy with a published one.",
        find=_told("open_group_worked_out"),
        source="Gompertz (1825), Philosophical Transactions of the Royal Society 115",
    ),
    Check(
        key="rate_of_unknown",
        severity="error",
        meaning="A rate is said to be of unknown age or sex, where it can be of nobody.",
        found="a rate where age, sex or area is not stated",
        expected="rates of known age, sex and area",
        remedy="Take these rows out; in rates those not stated are shared out already.",
        find=_told("rate_of_unknown"),
    ),
)


def problems_of(found: Sequence[Found]) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(found)]
