"""One spoilt upload by cause for each kind of problem."""

from collections.abc import Callable

from server.intake.causes.lists import SHORT
from server.intake.parsing import Handed, parse
from server.intake.standing import Standing
from tests.server.intake.by_cause import PARTS, by_cause, own, parted, totals
from tests.server.intake.form_cases import Case
from tests.server.intake.tables import Row, counts, population, rows, setting, where

SOUND = rows()
PARTED = parted(SOUND)
ONE = where(PARTED, area="north", year=2012, sex="f", age="85+")
LUNG = where(ONE, cause="C34")
YOUNG = where(PARTED, area="north", year=2012, sex="f", age="1-4", cause="C34")
PEOPLE = population(SOUND)
LATER = where(SOUND, area="north", year=2014)


def _deaths(table: list[Row], *beside: Handed, **mapping: object) -> Callable[[], list[Handed]]:
    return lambda: [by_cause(table, **mapping), PEOPLE, *beside]


def _with(*more: Row) -> Callable[[], list[Handed]]:
    return _deaths(PARTED + list(more))


def _own(*lines: str) -> Callable[[], list[Handed]]:
    return lambda: [own(*lines)]


def _later(**parts: int) -> Callable[[], list[Handed]]:
    """The north of 2014 with other parts of its deaths."""
    early = [row for row in SOUND if row not in LATER]
    return _deaths(parted(early) + parted(LATER, {**PARTS, **parts}))


def _all_ages() -> list[Handed]:
    """Deaths of all causes by age, of causes at all ages alone, in one year of the north."""
    named = where(SOUND, area="north", year=2012)
    table = [row for row in PARTED if (row["area"], row["year"]) != ("north", 2012)]
    for sex in "fm":
        of_sex = where(named, sex=sex)
        died = sum(int(str(row["deaths"])) for row in of_sex)
        bare = {**of_sex[0], "age": "all ages", "deaths": died}
        table += [*totals([*of_sex, bare]), *parted([bare])]
    return [by_cause(table), PEOPLE]


def stood(table: list[Row]) -> Standing:
    """An edition that holds this table by cause, under the short list."""
    parsed = parse([by_cause(table), PEOPLE])
    held = {key: cell.grid for key, cell in parsed.cells.items()}
    return Standing(parsed.areas, held, cells=parsed.cells, causes=SHORT)


MAPPED_CASES = (
    Case("cause_list_not_stated", _deaths(PARTED, cause_list="")),
    Case("own_list_missing", _deaths(PARTED, cause_list="own")),
)
CAUSE_CASES = (
    Case("cause_code_twice", _own("a,One", "a,Two")),
    Case("unknown_group", _own("a,One,b")),
    Case("causes_in_a_circle", _own("a,One,b", "b,Two,a")),
    Case("bad_code_range", _own("a,One,,A00-", "b,Two,,first")),
    Case("ranges_overlap", _own("a,One,,001-139", "b,Two,,130-239")),
    Case("codes_in_no_cause", _own("a,One,,001-139", "b,Two,,150-239")),
    Case("unknown_cause", lambda: [by_cause(setting(PARTED, LUNG, cause="E95")), PEOPLE]),
    Case("cause_twice", _with({**LUNG[0], "cause": "c34.-", "deaths": 0})),
    Case(
        "range_of_several_causes",
        lambda: [by_cause(setting(PARTED, LUNG, cause="A00-B99")), PEOPLE],
    ),
    Case(
        "group_alone",
        lambda: [by_cause(setting(PARTED, where(PARTED, cause="W19"), cause="external")), PEOPLE],
    ),
    Case(
        "people_by_cause_differ",
        lambda: [
            counts(
                setting(PARTED, LUNG, population=1),
                cause="cause",
                cause_list="short",
            )
        ],
    ),
    Case("not_underlying_cause", _deaths(setting(PARTED, LUNG, cause="S06"))),
    Case("cause_of_other_sex", _deaths(setting(PARTED, YOUNG, cause="C61"))),
    Case("cause_at_odd_age", _deaths(setting(PARTED, YOUNG, cause="O95"))),
    Case("causes_exceed_total", _deaths(PARTED + totals(SOUND, more=-1))),
    Case("deaths_without_cause", _deaths(PARTED + totals(SOUND, more=2))),
    Case("causes_exceed_group", _with({**LUNG[0], "cause": "C00-C97", "deaths": 1})),
    Case("group_differs", _with({**LUNG[0], "cause": "C00-C97", "deaths": 999})),
    Case("code_is_sum", _with(*totals(where(PARTED, cause="C34"), "C34.9"))),
    Case("code_beside_longer", _with({**LUNG[0], "cause": "C34.9", "deaths": 3})),
    Case("causes_without_ages", _all_ages),
    Case("cause_list_changed", _deaths(PARTED, cause_list="chapters"), standing=stood(PARTED)),
    Case("causes_left_out", lambda: [counts(SOUND)], standing=stood(PARTED)),
    Case("ill_defined_high", _deaths(parted(SOUND, {**PARTS, "R54": 25}))),
    Case("ill_defined_jumps", _later(R54=14)),
    Case("still_pending", _deaths(parted(SOUND, {**PARTS, "R99": 8}))),
    Case("cause_share_jumps", _later(C34=10, J44=20)),
    Case("cause_disappears", _later(J44=0)),
    Case("cause_appears", _later(K70=8)),
)
