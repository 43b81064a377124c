"""The second collection of the demonstration: of what the people of Quillmere's mainland die."""

import datetime as dt
from dataclasses import replace

from seed_scenarios import quillmere
from seed_scenarios.quillmere import OFFICE, Files, hand_in
from seed_scenarios.quillmere_causes_counts import MAINLAND, comparability, parted
from seed_scenarios.quillmere_causes_files import breaks_csv, deaths_csv
from seed_scenarios.quillmere_counts import YEARS, counted, recounted
from seed_scenarios.quillmere_files import births_csv, population_csv
from server.actions import Mapping, Session
from server.actions.create_collection import create_collection

CODE, NAME = "quillmere-causes", "Deaths by cause, Quillmere"
STORY = (
    "The deaths of the four regions of Quillmere that give their ages up to 100, 1999 to 2023, "
    "parted into causes by chance. Ill-defined causes fall from some 9 to 3 per cent of deaths. "
    "Those men of working age of Tollbay who die on top of what was usual, after the closing of "
    "the plant in 2009, die of overdose, suicide and liver disease; those of the hot summer of "
    "2018 of diseases of the heart, the circulation and the lungs. From 2011 on new rules count a "
    "fifth of what was pneumonia as dementia; the office coded the deaths of 2010 twice, and "
    "gives the ratios. Of 2023, which is provisional, many deaths of the young wait for an "
    "inquest."
)
NOTE = "Deaths of the mainland by cause, 1999 to 2022 final, 2023 provisional."
WHOLE, WHOLE_NAME = "mainland", "Mainland of Quillmere"
BASIS = replace(quillmere.BASIS, vintage=quillmere.VINTAGE)


def _of_mainland(mapping: Mapping) -> Mapping:
    return replace(mapping, whole=WHOLE, whole_name=WHOLE_NAME, delivered=())


MAPPINGS = {
    "deaths": replace(
        _of_mainland(quillmere.MAPPINGS["deaths"]), cause="cause", cause_list="short"
    ),
    "population": _of_mainland(quillmere.MAPPINGS["population"]),
    "births": _of_mainland(quillmere.MAPPINGS["births"]),
    "breaks": quillmere.MAPPINGS["breaks"],
}


def build(session: Session, *, now: dt.datetime) -> None:
    """Open the collection and hand in its edition."""
    create_collection(session, code=CODE, name=NAME, owner=OFFICE.name, by=OFFICE, now=now)
    hand_in(
        session,
        files(),
        collection=CODE,
        mappings=MAPPINGS,
        basis=BASIS,
        note=NOTE,
        now=now,
    )


def files() -> Files:
    counts = counted(revised=True)
    people, areas = recounted(counts), tuple(region.code for region in MAINLAND)
    by_cause = {region.code: parted(counts[region.code], region) for region in MAINLAND}
    of_people = population_csv(people, YEARS, areas, districts=False)
    of_births = births_csv(counts, YEARS, areas, districts=False)
    return {
        "deaths": ("quillmere-deaths-by-cause.csv", deaths_csv(counts, by_cause)),
        "population": ("quillmere-mainland-population.csv", of_people),
        "births": ("quillmere-mainland-births.csv", of_births),
        "breaks": ("quillmere-mainland-breaks.csv", breaks_csv(comparability(by_cause))),
    }
