"""One spoilt upload for each kind of problem."""

from collections.abc import Callable

from server.intake.parsing import Handed
from tests.server.intake.cause_cases import MAPPED_CASES
from tests.server.intake.form_cases import COLUMN_CASES, FORM_CASES, WORKED_OUT_CASES, Case
from tests.server.intake.tables import (
    births,
    counts,
    csv,
    deaths,
    persons,
    population,
    rows,
    setting,
    where,
    without,
)

SOUND = rows()
NORTH_2012 = where(SOUND, area="north", year=2012)
OLDEST = where(NORTH_2012, age="85+")
WOMEN = where(NORTH_2012, sex="f")


def _set(picked: list[dict[str, object]], **values: object) -> Callable[[], list[Handed]]:
    return lambda: [counts(setting(SOUND, picked, **values))]


def _mapped(**mapping: object) -> Callable[[], list[Handed]]:
    return lambda: [counts(SOUND, **mapping)]


def _persons(extra: int) -> list[dict[str, object]]:
    """The table with persons beside the sexes, some too many in one cell."""
    people = persons(SOUND)
    picked = where(people, area="north", year=2012, age="85+")
    return SOUND + setting(people, picked, deaths=int(str(picked[0]["deaths"])) + extra)


WHOLE = rows(("isle",), times=2)
ONE = OLDEST[:1]
BY_NAME = {"area": "", "area_name": "area"}
UNKNOWN_SEX = [{**row, "sex": "not stated", "deaths": 1, "population": 0} for row in WOMEN]
UNKNOWN_AGE = [{**WOMEN[0], "age": "not stated", "deaths": 9, "population": 0}]
UNKNOWN_AREA = [{**row, "area": "not stated", "deaths": 1, "population": 0} for row in WOMEN]
MANY = setting(UNKNOWN_AGE, UNKNOWN_AGE, deaths=400)
ALL_AGES = [{**WOMEN[0], "age": "all ages", "deaths": 2_000, "population": 68_259}]

CASES = (
    *FORM_CASES,
    Case(
        "doubled_heading",
        lambda: [counts(csv(SOUND).replace(b"population", b"deaths", 1), population="")],
        "missing_column",
    ),
    Case("missing_column", _mapped(age="")),
    Case("unknown_column", _mapped(deaths="dead")),
    Case("no_area", _mapped(area="")),
    Case("column_used_twice", _mapped(area_name="sex")),
    Case("bad_sex_setting", _mapped(sex_codes=(("1", "man"),))),
    Case("bad_provisional_year", _mapped(provisional_years=("14",))),
    Case("bad_area_setting", _mapped(area="", only_area="north east")),
    *COLUMN_CASES,
    *MAPPED_CASES,
    Case("area_names_differ", lambda: [_named("South shore", area="area")]),
    Case(
        "wholes_differ",
        lambda: [deaths(SOUND, whole="isle"), population(SOUND, whole="island")],
    ),
    Case("unknown_delivered", _mapped(delivered=("isle",))),
    Case("total_among_areas", lambda: [counts(SOUND + rows(("All areas",), times=2), **BY_NAME)]),
    Case("unreadable_year", _set(WOMEN, year="12")),
    Case("unknown_sex", _set(WOMEN, sex="F/M")),
    Case("unreadable_age", _set(ONE, age="the oldest")),
    Case("date_for_age", _set(where(SOUND, age="1-4")[:3], age="2026-01-04")),
    Case("unreadable_area_code", _set(NORTH_2012, area="north east")),
    Case("missing_area_name", lambda: [_named("", area="")]),
    Case("area_names_share_code", lambda: [_named("Nörth", area="", area_name="name")]),
    Case("unknown_status", lambda: [_status("maybe")]),
    Case("thousands_separator", _set(ONE, deaths="1,204")),
    Case("decimal_comma", _set(ONE, deaths="12,5")),
    Case("not_a_number", _set(ONE, deaths="twelve")),
    Case("count_not_available", lambda: [_signed("not_available")]),
    Case("count_withheld", lambda: [_signed("withheld")]),
    Case("missing_count", _set(ONE, deaths="")),
    Case("negative_count", _set(ONE, deaths="-4")),
    Case("not_finite", _set(ONE, population="inf")),
    Case("duplicate_cell", lambda: [counts(SOUND + ONE)]),
    Case("gap_of_ages", lambda: [counts(without(SOUND, where(WOMEN, age="15-44")))]),
    Case("overlap_of_ages", _set(where(WOMEN, age="15-44"), age="10-44")),
    Case("ages_start_late", lambda: [counts(without(SOUND, where(WOMEN, age="0")))]),
    Case("no_open_interval", _set(ONE, age="85-99")),
    Case("in_two_files", lambda: [counts(SOUND), deaths(WOMEN)]),
    Case("deaths_without_population", lambda: [deaths(SOUND), population(without(SOUND, WOMEN))]),
    Case("population_without_deaths", lambda: [deaths(SOUND[:-14]), population(SOUND)]),
    Case("grids_differ", lambda: [deaths(SOUND), population(_joined("5-14", "15-44", "5-44"))]),
    Case("no_common_grid", lambda: [deaths(SOUND), population(_only_old())]),
    Case("deaths_where_nobody_lived", _set(ONE, population=0), "jump_of_population"),
    Case("years_missing", lambda: [counts(without(SOUND, NORTH_2012))]),
    Case("persons_differ", lambda: [counts(_persons(1))]),
    Case("whole_differs", lambda: [counts(_whole(1), whole="isle")]),
    Case(
        "parts_missing",
        lambda: [counts(without(_whole(0), where(SOUND, area="north", year=2014)), whole="isle")],
    ),
    Case("all_ages_differ", lambda: [counts(SOUND + ALL_AGES)]),
    Case("only_all_ages", lambda: [counts(without(SOUND, WOMEN) + ALL_AGES)]),
    Case("sex_not_stated", lambda: [counts(SOUND + UNKNOWN_SEX)]),
    Case("age_not_stated", lambda: [counts(SOUND + UNKNOWN_AGE)]),
    Case("area_not_stated", lambda: [counts(SOUND + UNKNOWN_AREA)]),
    Case("too_many_not_stated", lambda: [_unstated(MANY, age="spread")], "jump_of_deaths"),
    Case("many_left_out", lambda: [_unstated(MANY, age="left_out")]),
    Case("nothing_to_share_by", lambda: [_unstated(_only_unstated(), age="spread")]),
    Case(
        "shared_beside_unknown",
        lambda: [_signed("not_available", {**UNKNOWN_AGE[0], "sex": "m"}, age="spread")],
        "count_not_available",
    ),
    Case("not_stated_twice", lambda: [_unstated(UNKNOWN_AGE * 2, age="spread")]),
    *WORKED_OUT_CASES,
    Case("infant_deaths_exceed_births", lambda: [counts(SOUND), births(46)]),
    Case(
        "neonatal_deaths_exceed_infant_deaths",
        lambda: [counts(SOUND), births(4_000, sex="f", areas=("north",), neonatal_deaths=90)],
    ),
    Case("fractional_deaths", _set(ONE, deaths=640.5)),
    Case("age_groups_change", lambda: [counts(_joined("5-14", "15-44", "5-44", WOMEN))]),
    Case(
        "deaths_exceed_population",
        _mapped(deaths="population", population="deaths"),
        "infant_share old_age_rates_fall sex_ratio_of_rates",
    ),
    Case(
        "points_between_thousands",
        lambda: [deaths(SOUND), population(_pointed())],
        "deaths_exceed_population",
    ),
)


def _unstated(table: list[dict[str, object]], **chosen: str) -> Handed:
    """These rows beside the sound ones, and what is to be done with what they do not state."""
    return counts(SOUND + table, unstated=tuple(chosen.items()))


def _signed(meaning: str, *more: dict[str, object], **chosen: str) -> Handed:
    """A dash for the deaths of one row, and what it was said to mean."""
    table = setting(SOUND, ONE, deaths="–") + list(more)
    return counts(table, signs=(("–", meaning),), unstated=tuple(chosen.items()))


def _only_unstated() -> list[dict[str, object]]:
    """Deaths of a further year, all of them of unknown age."""
    return [{**UNKNOWN_AGE[0], "year": 2015}]


def _named(name: str, **mapping: object) -> Handed:
    """Names beside codes: North and South, but this one for the last row."""
    table = [row | {"name": str(row["area"]).title()} for row in SOUND]
    table[-1]["name"] = name
    return counts(table, **({"area_name": "name"} | mapping))


def _status(word: str) -> Handed:
    table = [row | {"state": "final"} for row in SOUND]
    table[-1]["state"] = word
    return counts(table, status="state")


def _joined(
    first: str, second: str, together: str, among: list[dict[str, object]] = SOUND
) -> list[dict[str, object]]:
    """The table with two age groups in one, everywhere or among some rows."""
    table = without(SOUND, where(among, age=second))
    return setting(table, where(among, age=first), age=together)


def _pointed() -> list[dict[str, object]]:
    """The table with a point between the thousands of the populations: 27.000, 950."""
    return [
        row | {"population": f"{people // 1000}.{people % 1000:03d}" if people > 999 else people}
        for row in SOUND
        if (people := int(str(row["population"])))
    ]


def _only_old() -> list[dict[str, object]]:
    table = [row for row in SOUND if row["age"] in ("0", "1-4")]
    table = setting(table, where(table, age="0"), age="0-49")
    return setting(table, where(table, age="1-4"), age="50+")


def _whole(extra: int) -> list[dict[str, object]]:
    """The table with the whole beside its parts, some too many in one cell."""
    picked = where(WHOLE, year=2012, age="85+", sex="f")
    return SOUND + setting(WHOLE, picked, deaths=int(str(picked[0]["deaths"])) + extra)
