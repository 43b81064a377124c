"""One upload with doubtful figures for each kind of doubt."""

from collections.abc import Callable

from server.intake.parsing import Handed, parse
from server.intake.standing import Standing
from server.store.records import Area
from tests.server.intake.form_cases import Case
from tests.server.intake.lives import FIVES, SINGLE, lives, numbered, start, times
from tests.server.intake.tables import Row, counts, rows, setting, where, without

SOUND = rows()
NORTH_2012 = where(SOUND, area="north", year=2012)
WOMEN = where(NORTH_2012, sex="f")
ONE = where(WOMEN, age="85+")
TWO = ("north", "south")
OLD = range(85, 100)
COUNTS = ("deaths", "population")
CROSSING = {"f": (2e-5, 0.1), "m": (2.45e-4, 0.07)}  # even at 83
FLAT = {"f": (8.3e-5, 0.082), "m": (1.25e-4, 0.082)}  # with the usual laws even at 79


def stood(table: list[Row]) -> Standing:
    """An edition that holds this table."""
    parsed = parse([counts(table)])
    held = {key: cell.grid for key, cell in parsed.cells.items()}
    areas = tuple(Area(area.code, area.code) for area in parsed.areas)
    return Standing(areas, held, cells=parsed.cells)


THREE = rows(("north", "south", "cape"))
STOOD = stood(THREE)


def _of(make: Callable[[], list[Row]]) -> Callable[[], list[Handed]]:
    return lambda: [counts(make())]


def copied(table: list[Row], to: list[Row], of: list[Row], *names: str) -> list[Row]:
    """The table with numbers of some rows put into others, age by age."""
    taken = {row["age"]: {name: row[name] for name in names} for row in of}
    return [row | taken.get(row["age"], {}) if row in to else row for row in table]


def _year_repeated() -> list[Row]:
    later = where(SOUND, area="north", year=2013, sex="f")
    return copied(SOUND, later, WOMEN, "deaths", "population")


def _rates_repeated() -> list[Row]:
    """2013 with one death more at each age than 2012, among as many more people."""
    later = where(SOUND, area="north", year=2013, sex="f")
    table = copied(SOUND, later, WOMEN, "deaths", "population")
    return [
        row
        | {
            "deaths": numbered(row, "deaths") + 1,
            "population": numbered(row, "population") * (1 + 1 / numbered(row, "deaths")),
        }
        if row["area"] == "north" and row["year"] == 2013 and row["sex"] == "f"
        else row
        for row in table
    ]


def _counts_copied() -> list[Row]:
    to = where(SOUND, area="south", year=2011, sex="m")
    return copied(SOUND, to, WOMEN[:5], "population")


def _more_men() -> list[Row]:
    table = times(SOUND, 1.5, "population", area="north", sex="m")
    return times(table, 1.5, "deaths", area="north", sex="m")


def _few_infants() -> list[Row]:
    young = [row for row in SOUND if row["area"] == "north" and row["age"] in ("0", "1-4")]
    few = [row for row in young if row["age"] == "0"]
    many = [row for row in young if row["age"] == "1-4"]
    return setting(setting(SOUND, few, deaths=11), many, deaths=38)


def moved(table: list[Row], share: float, to: Callable[[int], int]) -> list[Row]:
    """People and deaths of some ages put in part at another, with the same share of both."""
    given: dict[tuple[object, ...], int] = {}
    for row in table:
        for name in COUNTS:
            part = round(share * numbered(row, name)) if to(start(row)) != start(row) else 0
            for age, more in ((start(row), -part), (to(start(row)), part)):
                place = (name, row["area"], row["year"], row["sex"], age)
                given[place] = given.get(place, 0) + more
    return [
        row
        | {
            name: numbered(row, name)
            + given[name, row["area"], row["year"], row["sex"], start(row)]
            for name in COUNTS
        }
        for row in table
    ]


def round_age(age: int) -> int:
    return age if age >= 90 else age // 5 * 5


def _two_for_three(age: int) -> int:
    return age - 1 if age % 10 == 3 and age < 93 else age


def _uneven_ages() -> list[Row]:
    """Every second five-year group of men is too large."""
    table = lives(grid=FIVES)
    for name in ("population", "deaths"):
        table = times(table, 1.2, name, ages=range(5, 80, 10), sex="m")
    return table


def _open_age() -> list[Row]:
    return times(lives(TWO), 1.6, "population", ages=range(90, 100), area="north")


def _drifting() -> list[Row]:
    table = SOUND
    for number, year in enumerate(range(2010, 2015)):
        table = times(table, 1.09**number, area="north", year=year)
    return table


DATA_CASES = (
    Case("jump_of_deaths", _of(lambda: setting(SOUND, ONE, deaths=1_010))),
    Case("jump_of_population", _of(lambda: setting(SOUND, WOMEN[3:4], population=41_000))),
    Case("year_repeated", _of(_year_repeated)),
    Case("rates_repeated", _of(_rates_repeated)),
    Case("counts_copied", _of(_counts_copied)),
    Case("areas_gone", _of(lambda: SOUND), standing=STOOD),
    Case(
        "years_gone",
        _of(lambda: without(THREE, where(THREE, area="north", year=2012))),
        standing=STOOD,
    ),
    Case("sex_ratio_of_population", _of(_more_men)),
    Case("sex_ratio_of_deaths", _of(lambda: times(SOUND, 2.2, area="north", sex="m"))),
    Case("sex_ratio_of_rates", _of(lambda: times(SOUND, 0.75, area="north", sex="m"))),
    Case("infant_share", _of(_few_infants)),
    Case("old_age_rates_fall", _of(lambda: times(SOUND, 0.15, area="north", ages=OLD))),
    Case("spike_at_round_age", _of(lambda: times(lives(grid=SINGLE, people=2e7), 1.08, ages=[70]))),
    Case("sexes_cross", _of(lambda: lives(laws=CROSSING))),
    Case("areas_cross", _of(lambda: lives(TWO, laws=FLAT))),
    Case("open_age_population", _of(_open_age)),
    Case("whipple_index", _of(lambda: moved(lives(grid=SINGLE), 0.05, round_age))),
    Case("myers_index", _of(lambda: moved(lives(grid=SINGLE), 0.9, _two_for_three))),
    Case("age_sex_accuracy", _of(_uneven_ages)),
    Case("deaths_drift", _of(_drifting)),
    Case("registered_share", _of(lambda: times(lives(), 0.7))),
)
