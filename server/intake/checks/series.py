"""Checks of deaths beside populations, and of years beside one another."""

from collections import defaultdict
from collections.abc import Iterator

import numpy as np

from engine.panel import SEXES
from server.intake.cells import Ints, parts_of
from server.intake.checks.check import Check, Marks, gathered
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.schedules import MEASURES


def _missed(ledger: Ledger, here: str, there: str) -> Ints:
    """Places that have one measure and not the other, neither handed in nor standing, where the
    other is not spoiled."""
    places = ledger.places(here)
    known = np.concatenate([ledger.places(there), ledger.spoiled, *_standing(ledger, there)])
    return np.zeros(0, np.int64) if ledger.unplaced else places[~np.isin(places, known)]


def _standing(ledger: Ledger, measure: str) -> list[Ints]:
    return [block.place for block in ledger.past if block.measure == measure]


def _by_area(ledger: Ledger, places: Ints, measure: str) -> Iterator[Fault]:
    """A fault for each area: which sexes and years."""
    area_of, sex_of, year_of = parts_of(places)  # in order, so that those of an area stand together
    areas, first = np.unique(area_of, return_index=True)
    each = np.split(np.arange(len(places)), first[1:])
    for area, here in zip(areas.tolist(), each[: len(areas)], strict=True):
        lines = [ledger.lines[measure][place] for place in places[here].tolist()]
        rows = np.concatenate([block.row[line] for block, line in lines])
        years = years_worded(np.unique(year_of[here]).tolist())
        sexes = ", ".join(SEXES[sex] for sex in np.unique(sex_of[here]))
        values = {"area": ledger.codes[area], "sexes": sexes, "years": years}
        yield lines[0][0].fault(rows, values)


def years_worded(years: list[int]) -> str:
    """2001, 2003–2007"""
    runs: list[list[int]] = []
    for year in years:
        if runs and runs[-1][1] == year - 1:
            runs[-1][1] = year
        else:
            runs.append([year, year])
    text = ", ".join(str(a) if a == b else f"{a}–{b}" for a, b in runs)
    return text if len(text) <= 120 else text[:120].rsplit(",", 1)[0] + " …"


def _twice(ledger: Ledger) -> Iterator[Fault]:
    for measure in MEASURES.values():
        places = ledger.places(measure)
        yield from _by_area(ledger, np.unique(places[1:][places[1:] == places[:-1]]), measure)


def _deaths_alone(ledger: Ledger) -> Iterator[Fault]:
    if ledger.standing is not None:
        yield from _by_area(ledger, _missed(ledger, "deaths", "person_years"), "deaths")


def _people_alone(ledger: Ledger) -> Iterator[Fault]:
    if ledger.of("deaths"):
        places = _missed(ledger, "person_years", "deaths")
        yield from _by_area(ledger, places, "person_years")


def _grids(ledger: Ledger, *, usable: bool) -> Iterator[Fault]:
    for pair in ledger.pairs:
        deaths, people = pair.deaths.grid, pair.people.grid
        if deaths != people and (len(pair.grid) > 1) == usable:
            values = {
                "deaths": _short(deaths.labels),
                "people": _short(people.labels),
                "common": _short(pair.grid.labels),
            }
            yield pair.deaths.fault(pair.deaths.row, values)


def _short(labels: tuple[str, ...]) -> str:
    if len(labels) <= 12:
        return ", ".join(labels)
    return f"{', '.join(labels[:6])} … {', '.join(labels[-3:])}"


def _nobody(ledger: Ledger) -> Iterator[Fault]:
    for pair in ledger.pairs:
        deaths, people = pair.deaths.regroup(pair.grid), pair.people.regroup(pair.grid)
        empty = (people.values == 0) & (deaths.values > 0)
        if empty.any():
            line, age = np.nonzero(empty)
            labels = np.array(pair.grid.labels, object)
            found = {
                "age": labels[age],
                "below": labels[np.maximum(age - 1, 0)],
                "deaths": deaths.values[line, age],
            }
            yield from gathered(
                Marks(people.column, np.ones(len(line), bool), found),
                people.row[line, age],
                people.file,
            )


def _years_missing(ledger: Ledger) -> Iterator[Fault]:
    """Years without deaths between years with them, by area and sex."""
    totals = [total.place for total in ledger.age_totals]
    places = [ledger.places("deaths"), ledger.spoiled, *totals, *_standing(ledger, "deaths")]
    known = np.unique(np.concatenate(places))
    if ledger.unplaced or len(known) < 2:
        return
    area, sex, year = parts_of(known)
    before = np.flatnonzero(
        (area[1:] == area[:-1]) & (sex[1:] == sex[:-1]) & (year[1:] > year[:-1] + 1)
    )
    gaps: dict[str, list[dict[str, Value]]] = defaultdict(list)
    for place in before.tolist():
        missing = years_worded(list(range(int(year[place]) + 1, int(year[place + 1]))))
        gaps[missing].append(ledger.named(int(known[place])))
    for missing, where in gaps.items():
        first = where[0]
        yield Fault(
            values={
                "years": missing,
                "area": first["area"],
                "sex": first["sex"],
                "series": len(where),
            }
        )


CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="in_two_files",
        severity="error",
        meaning="The same counts stand in two files of the upload.",
        found="{area}: {sexes}, {years} in another file too",
        expected="each area, sex and year in one file",
        remedy="Take the counts out of one of the files, or leave that file out.",
        find=_twice,
    ),
    Check(
        key="deaths_without_population",
        severity="error",
        meaning="Deaths have no population to stand against.",
        found="deaths without population in {area}: {sexes}, {years}",
        expected="a population for the same areas, sexes and years",
        remedy="Add the population to the upload, or correct the codes of areas and sexes so that "
        "both agree.",
        find=_deaths_alone,
    ),
    Check(
        key="population_without_deaths",
        severity="warning",
        meaning="A population has no deaths beside it. It is kept, but nothing can be computed "
        "from it.",
        found="population without deaths in {area}: {sexes}, {years}",
        expected="deaths for the same areas, sexes and years",
        remedy="Add the deaths, if they should be there.",
        find=_people_alone,
    ),
    Check(
        key="grids_differ",
        severity="warning",
        meaning="Deaths and population come in different age groups. Both are brought to the "
        "finest groups they have in common.",
        found="deaths by {deaths}, population by {people}",
        expected="the same age groups in both",
        remedy="Both will be summed into {common}; give the finer groups of both to keep more.",
        find=lambda ledger: _grids(ledger, usable=True),
    ),
    Check(
        key="no_common_grid",
        severity="error",
        meaning="The age groups of deaths and population have nothing in common but age 0.",
        found="deaths by {deaths}, population by {people}",
        expected="age groups that begin at the same ages",
        remedy="Give both in age groups that can be summed into the same ones.",
        find=lambda ledger: _grids(ledger, usable=False),
    ),
    Check(
        key="deaths_where_nobody_lived",
        severity="warning",
        meaning="People died in an age group whose population is 0. The group is joined with its "
        "neighbour for the rates.",
        found="population 0 at age {age}, where deaths are {deaths}",
        expected="a population above 0",
        remedy="The group will be joined with {below}; put the population right if people lived "
        "there.",
        find=_nobody,
    ),
    Check(
        key="years_missing",
        severity="warning",
        meaning="Years are missing in the middle of a series.",
        found="no deaths for {years} in {area}, {sex}; series with this gap: {series}",
        expected="every year between the first and the last",
        remedy="Add the missing years, or say in the note why they are not there.",
        find=_years_missing,
    ),
)
