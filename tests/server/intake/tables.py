"""Small clean tables of counts, to be spoilt one way at a time."""

from collections.abc import Iterable
from dataclasses import replace

from server.intake.mapping import Mapping
from server.intake.parsing import Handed

Row = dict[str, object]

AGES = {  # deaths and people at each age, every year
    "0": (21, 950),
    "1-4": (12, 3_800),
    "5-14": (14, 9_400),
    "15-44": (88, 27_000),
    "45-64": (260, 16_500),
    "65-84": (910, 9_200),
    "85+": (640, 1_400),
}
YEARS = range(2010, 2015)
COLUMNS = Mapping(
    year="year", sex="sex", age="age", area="area", deaths="deaths", population="population"
)


def rows(
    areas: Iterable[str] = ("north", "south"),
    *,
    years: Iterable[int] = YEARS,
    sexes: Iterable[str] = "fm",
    times: int = 1,
) -> list[Row]:
    """One row for each area, year, sex and age; row 2 of the file is the first. No two areas, sexes
    and years have the same counts; the isle with `times=2` is north and south together."""
    return [
        {
            "area": area,
            "year": year,
            "sex": sex,
            "age": age,
            "deaths": times * (deaths + year - 2010 + 5 * (sex == "m")) + _own(area, number),
            "population": times * (people + year - 2010 + 5 * (sex == "m")) + _own(area, number),
        }
        for number, area in enumerate(areas)
        for year in years
        for sex in sexes
        for age, (deaths, people) in AGES.items()
    ]


def _own(area: str, number: int) -> int:
    """What sets the counts of an area apart from those of others."""
    return {"north": 0, "south": 10, "isle": 10}.get(area, 20 + 10 * number)


def persons(table: list[Row]) -> list[Row]:
    """Women and men of a table together."""
    men = {(row["area"], row["year"], row["age"]): row for row in where(table, sex="m")}
    together = []
    for woman in where(table, sex="f"):
        man = men[woman["area"], woman["year"], woman["age"]]
        sums = {
            name: _number(woman, name) + _number(man, name) for name in ("deaths", "population")
        }
        together.append({**woman, "sex": "persons", **sums})
    return together


def _number(row: Row, name: str) -> int:
    return int(str(row[name]))


def where(table: list[Row], **values: object) -> list[Row]:
    """The rows that have these values."""
    return [row for row in table if all(row[name] == value for name, value in values.items())]


def setting(table: list[Row], picked: Iterable[Row], **values: object) -> list[Row]:
    """The table with these values set in the picked rows."""
    chosen = [id(row) for row in picked]
    return [row | values if id(row) in chosen else row for row in table]


def without(table: list[Row], picked: Iterable[Row]) -> list[Row]:
    chosen = [id(row) for row in picked]
    return [row for row in table if id(row) not in chosen]


def csv(table: list[Row], columns: Iterable[str] = ()) -> bytes:
    """As a file: only the named columns, or all."""
    names = list(columns) or list(table[0])
    lines = [",".join(names), *(",".join(_field(row[name]) for name in names) for row in table)]
    return "\n".join(lines).encode() + b"\n"


def _field(value: object) -> str:
    text = str(value)
    return f'"{text}"' if "," in text else text


def counts(table: list[Row] | bytes, **mapping: object) -> Handed:
    """Deaths and population in one file, mapped as usual but for these fields."""
    content = table if isinstance(table, bytes) else csv(table)
    return Handed("counts", "counts.csv", content, replace(COLUMNS, **mapping))  # type: ignore[arg-type]


def deaths(table: list[Row], **mapping: object) -> Handed:
    content = csv(table, ("area", "year", "sex", "age", "deaths"))
    mapped = replace(COLUMNS, population="", **mapping)  # type: ignore[arg-type]
    return Handed("deaths", "deaths.csv", content, mapped)


def population(table: list[Row], **mapping: object) -> Handed:
    content = csv(table, ("area", "year", "sex", "age", "population"))
    mapped = replace(COLUMNS, deaths="", **mapping)  # type: ignore[arg-type]
    return Handed("population", "population.csv", content, mapped)


def births(
    number: int, *, areas: Iterable[str] = ("north", "south"), sex: str = "p", **beside: int
) -> Handed:
    """Live births of each year, of both sexes together or of one; stillbirths and deaths before 28
    days where they are given."""
    counted = {"births": number, **beside}
    numbers = ",".join(map(str, counted.values()))
    lines = [f"{area},{year},{sex},{numbers}" for area in areas for year in YEARS]
    content = "\n".join([",".join(["area,year,sex", *counted]), *lines]).encode()
    columns = {name: name for name in counted}
    mapping = Mapping(year="year", sex="sex", area="area", **columns)
    return Handed("births", "births.csv", content, mapping)
