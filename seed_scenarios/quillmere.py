"""The demonstration collection: an invented island, told as its office would have handed it in."""

import datetime as dt
from dataclasses import replace

from seed_scenarios.quillmere_counts import (
    CENSUS,
    REBASED,
    REGIONS,
    REVISED,
    WHOLE,
    YEARS,
    Counts,
    counted,
    recounted,
)
from seed_scenarios.quillmere_files import (
    areas_csv,
    births_csv,
    breaks_csv,
    deaths_csv,
    population_csv,
)
from server.actions import LOCAL, Basis, Mapping, Session, Terms, Viewer
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.create_collection import create_collection
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.actions.set_policy import set_policy

CODE, NAME = "quillmere", "All deaths, Quillmere"
STORY = (
    "Six regions of an island country that is nowhere, 1999 to 2023, women and men, drawn by "
    "chance from published mortality laws. Length of life grows everywhere, but: in Tollbay a "
    "plant closes in 2009, and men of working age stop gaining for eight years; in 2018 a hot "
    "summer lifts deaths at ages 75 and over, most in Elderwick; in Harrowfen infant mortality, "
    "twice the country's, comes down to it within seven years from 2006. Little Auk is so small "
    "that its figures jump by chance alone. Stonereach closes its ages at 85 and over, and its "
    "pages show what that costs. 2023 is provisional: about one death in a hundred is not yet "
    "reported. Tollbay was two districts up to 2004, and its files of these years still have their "
    "codes. Edition 2 revises 2021 in Northlade, where deaths under inquest had been left out. "
    "Edition 3 has the population that the census of 2021 found, back to 2012: fewer young adults "
    "and fewer of the oldest than the register had, so that the years before 2012 stand apart."
)
OFFICE = Viewer("Statistical Office of Quillmere", LOCAL.rights)
BASIS = Basis(
    people="residents",
    dated_by="death",
    population="midyear",
    population_date="1 July of each year",
    source="Statistical Office of Quillmere: civil register, population register",
    vintage="population register, carried on from the census of 2001",
)
VINTAGE = "after the census of 2021, carried back to 2012"
NOTES = (
    "First delivery: 1999 to 2022 final, 2023 provisional.",
    f"Revision of {REVISED} in Northlade: deaths under inquest, left out at first.",
    f"Population from {REBASED} on after the census of {CENSUS}; deaths as they stood.",
)
POLICY = "One or two deaths of an age in a small region could name a person."
_COLUMNS = Mapping(
    year="year",
    sex="sex",
    area="area",
    area_name="area_name",
    sex_codes=(("women", "f"), ("men", "m")),
    whole=WHOLE.code,
    whole_name=WHOLE.name,
    delivered=(WHOLE.code,),  # the national office counts the whole itself
)
MAPPINGS = {
    "deaths": replace(_COLUMNS, age="age", deaths="deaths", status="status"),
    "population": replace(_COLUMNS, age="age", population="population"),
    "births": replace(
        _COLUMNS, births="births", stillbirths="stillbirths", neonatal_deaths="neonatal_deaths"
    ),
    "areas": Mapping(),
    "breaks": Mapping(),
}
EVERYWHERE = (*(region.code for region in REGIONS), WHOLE.code)
Files = dict[str, tuple[str, bytes]]  # role: name and content


def build(session: Session, *, now: dt.datetime) -> None:
    """Open the collection, hand in its three editions, and set what small counts it shows."""
    deliver(session, now=now)
    recount(session, now=now)
    protect(session, now=now)


def deliver(session: Session, *, now: dt.datetime) -> None:
    """The collection, its first delivery and the revision of one year: two editions."""
    create_collection(session, code=CODE, name=NAME, owner=OFFICE.name, by=OFFICE, now=now)
    files = _files(counted(revised=False), YEARS, EVERYWHERE)
    files["areas"] = ("quillmere-areas.csv", areas_csv())
    hand_in(session, files, note=NOTES[0], now=now)
    files = _files(counted(revised=True), (REVISED,), ("northlade", WHOLE.code))
    hand_in(session, files, note=NOTES[1], now=now)


def recount(session: Session, *, now: dt.datetime) -> None:
    """The population after the census, with the breaks it makes: one more edition."""
    since = tuple(year for year in YEARS if year >= REBASED)
    people = population_csv(recounted(counted(revised=True)), since, EVERYWHERE)
    files = {
        "population": ("quillmere-population-after-census.csv", people),
        "breaks": ("quillmere-breaks.csv", breaks_csv()),
    }
    hand_in(session, files, note=NOTES[2], now=now, basis=replace(BASIS, vintage=VINTAGE))


def protect(session: Session, *, now: dt.datetime) -> None:
    """The policy of the office: one or two deaths are withheld, most of them in Little Auk."""
    terms = Terms(threshold=3)
    set_policy(session, collection=CODE, terms=terms, note=POLICY, by=OFFICE, now=now)


def _files(counts: dict[str, Counts], years: tuple[int, ...], areas: tuple[str, ...]) -> Files:
    return {
        "deaths": ("quillmere-deaths.csv", deaths_csv(counts, years, areas)),
        "population": ("quillmere-population.csv", population_csv(counts, years, areas)),
        "births": ("quillmere-births.csv", births_csv(counts, years, areas)),
    }


def hand_in(
    session: Session,
    files: Files,
    *,
    note: str,
    now: dt.datetime,
    collection: str = CODE,
    mappings: dict[str, Mapping] = MAPPINGS,
    basis: Basis = BASIS,
) -> None:
    """One upload of the office, from the bytes to an edition."""
    upload = receive_upload(
        session,
        collection=collection,
        files=[(role, name, content) for role, (name, content) in files.items()],
        by=OFFICE,
        now=now,
    )
    map_upload(
        session,
        upload_id=upload.id,
        mappings={role: mappings[role] for role in files},
        basis=basis,
        by=OFFICE,
        now=now,
    )
    check_upload(session, upload_id=upload.id)
    commit_upload(session, upload_id=upload.id, note=note, by=OFFICE, now=now)
