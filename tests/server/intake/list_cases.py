"""One spoilt table of areas over time or of breaks for each kind of problem."""

from dataclasses import replace

from server.intake.mapping import Mapping
from server.intake.parsing import Handed, parse
from server.intake.standing import Standing
from server.store.records import Area, Basis, Break
from tests.server.intake.form_cases import Case
from tests.server.intake.tables import counts, population, rows

SOUND = rows(("north", "south", "cape"))
BASIS = Basis("residents", "death", "midyear", "1 July", "office", "after the 2001 census")
BREAKS = (Break("", "2012", "population"), Break("north", "2013", "coding"))
STANDING = Standing(
    areas=(Area("isle", "Isle"), *(Area(one, "", "isle") for one in ("cape", "north", "south"))),
    held={key: cell.grid for key, cell in parse([counts(SOUND)]).cells.items()},
    basis=BASIS,
    breaks=BREAKS,
)
AREAS = "code,becomes,from,to,share,counts,sex,age,name,parent"
BREAK = "area,year,kind,cause,note,ratio,ratio_error"


def areas(*lines: str, heading: str = AREAS) -> Handed:
    """A table of areas over time; fields that are left out at the end are empty."""
    return Handed("areas", "areas.csv", _csv(heading, lines), Mapping())


def breaks(*lines: str, heading: str = BREAK) -> Handed:
    return Handed("breaks", "breaks.csv", _csv(heading, lines), Mapping())


def _csv(heading: str, lines: tuple[str, ...]) -> bytes:
    width = heading.count(",")
    filled = [line + "," * (width - line.count(",")) for line in lines]
    return "\n".join([heading, *filled]).encode()


def _case(key: str, *files: Handed, also: str = "") -> Case:
    return Case(key, lambda: list(files), also=also, standing=STANDING)


MERGED = ("north,coast,,,", "south,coast,,,")
LIST_CASES = (
    _case("list_without_column", areas("north", heading="code,share")),
    _case("list_too_long", breaks(*["north,2012,coding"] * 5_001)),
    _case("list_unreadable", breaks("north,2012,census")),
    _case("list_backwards", areas("north,coast,2013,2011")),
    _case("unknown_old_code", areas("nort,coast")),
    _case("unknown_new_parent", areas("north,coast,,,,,,,,main")),
    _case("whole_becomes", areas("isle,island")),
    _case("years_overlap", areas("north,coast,2010,2012", "north,bay,2012,2014")),
    _case("becomes_in_a_circle", areas("north,south,2010,2012", "south,north,2012,2014")),
    _case("share_missing", areas("north,coast,,,1", "north,bay")),
    _case("new_series_without_year", areas("north,coast", "north,bay")),
    _case(
        "share_ages",
        areas("north,coast,,,1,,,0-14", "north,coast,,,1,,,45+"),
    ),
    _case("shares_not_one", areas("north,coast,,,0.3", "north,bay,,,0.6")),
    _case("share_of_one_sex", areas("north,coast,,,1,,f")),
    _case(
        "merged_part_missing",
        areas("north,coast,2015,2015", "south,coast,2015,2015"),
        counts(rows(("north",), years=(2015,))),
    ),
    _case(
        "moved_counts_twice",
        areas("north,coast,2015,2015"),
        counts(rows(("north", "coast"), years=(2015,))),
    ),
    _case("moved_onto_counts", areas("north,south")),
    _case(
        "ended_code_goes_on",
        areas("north,coast,2015", "north,bay,2015"),
        counts(rows(("north",), years=(2015,))),
        also="new_series_begin",
    ),
    _case(
        "shares_finer_than_counts",
        areas("north,coast,,,1,,,0-9", "north,coast,,,1,,,10+"),
    ),
    _case("counts_without_share", areas("north,coast,,,1,deaths")),
    _case("new_series_begin", areas("north,coast,2015", "north,bay,2015")),
    _case("break_of_unknown_area", breaks("nort,2012,coding")),
    _case("break_outside_years", breaks(",2010,definition")),
    _case("break_twice", breaks(",2013,definition", ",2013,definition")),
    _case("break_ends_nothing", breaks("south,2012,none")),
    _case("ratio_of_other_break", breaks(",2013,population,,,1.02,0.01")),
    _case("ratio_without_error", breaks(",2013,coding,,,1.02")),
)


def _basis(key: str, *files: Handed, **stated: str) -> Case:
    """A basis that differs in these points from the one that stands."""
    own = replace(BASIS, **stated)  # type: ignore[arg-type]
    return Case(key, lambda: list(files), standing=STANDING, basis=own)


PEOPLE = population(SOUND)
AGAIN = population(rows(("north", "south", "cape"), years=(2013, 2014)))
BASIS_CASES = (
    Case(
        "occurrences_over_residents",
        lambda: [counts(SOUND)],
        basis=replace(BASIS, people="occurrences"),
    ),
    Case(
        "registered_over_lived",
        lambda: [counts(SOUND)],
        basis=replace(BASIS, dated_by="registration"),
    ),
    _basis("basis_changes", counts(rows(years=(2015,))), population_date="1 January"),
    _basis("rebase_without_name", PEOPLE),
    _basis("vintage_in_part", AGAIN, vintage="after the 2011 census"),
)
