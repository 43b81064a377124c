"""One spoilt file for each way in which it can fail to be a table."""

import re
from collections.abc import Callable
from dataclasses import dataclass, replace
from gzip import compress

from openpyxl.worksheet.worksheet import Worksheet

from server.intake.forms.sheet_rows import MOST_COLUMNS
from server.intake.forms.unpacking import MOST_UNPACKED
from server.intake.mapping import Form, Mapping
from server.intake.parsing import Handed
from server.intake.standing import NOTHING_STANDS, Standing
from server.store.records import Basis
from tests.server.intake.tables import (
    AGES,
    COLUMNS,
    Row,
    counts,
    csv,
    population,
    rows,
    setting,
    where,
    without,
)
from tests.server.intake.workbooks import (
    SHEET,
    repacked,
    table_cells,
    with_kept_values,
    xlsx,
)

SOUND = rows()


@dataclass(frozen=True)
class Case:
    key: str
    files: Callable[[], list[Handed]]
    also: str = ""  # other kinds that the same fault must trip, between blanks
    standing: Standing | None = NOTHING_STANDS
    basis: Basis | None = None


def _bytes(content: bytes) -> Callable[[], list[Handed]]:
    return lambda: [counts(content)]


def _formed(content: bytes = b"", **form: object) -> Callable[[], list[Handed]]:
    return lambda: [counts(content or csv(SOUND), form=Form(**form))]  # type: ignore[arg-type]


def book(content: bytes, **form: object) -> Handed:
    return Handed("counts", "counts.xlsx", content, replace(COLUMNS, form=Form(**form)))  # type: ignore[arg-type]


def with_formula(sheet: Worksheet) -> None:
    sheet["E3"] = "=E2-1"


def hidden_row(sheet: Worksheet) -> None:
    sheet.row_dimensions[5].hidden = True


def merging(first: str, last: str) -> Callable[[Worksheet], None]:
    return lambda sheet: sheet.merge_cells(f"{first}:{last}")


def overlapping() -> bytes:
    """A workbook in which one range is merged again and again."""
    merged = '<mergeCell ref="A2:A141"/>' * 8_000
    closed = f"</sheetData><mergeCells>{merged}</mergeCells>"
    return repacked(BOOK, {SHEET: lambda text: text.replace("</sheetData>", closed)})


def crowded() -> bytes:
    """A sheet of few bytes that would be a table of a thousand million fields."""
    row = '<row r="{0}"><c r="BXX{0}"><v>1</v></c></row>'
    rows = "".join(row.format(number * 8) for number in range(1, 100_000))
    return repacked(BOOK, {SHEET: lambda text: re.sub("<row.*</row>", rows, text)})


def bomb() -> bytes:
    """Some hundred kilobytes that unpack to more than an upload may hold."""
    part = compress(b"0" * 2**24)
    return part * (MOST_UNPACKED // 2**24 + 1)


def wide(content: bytes = b"", **form: object) -> Handed:
    """Deaths of women in the north, with a column for each age."""
    columns = tuple((age, age) for age in AGES)
    said = {"across": ("age",), "across_columns": columns, "across_number": "deaths"} | form
    mapping = Mapping(year="year", only_area="north", only_sex="f", form=Form(**said))  # type: ignore[arg-type]
    return Handed("deaths", "wide.csv", content or csv_rows(1), mapping)


def csv_rows(count: int) -> bytes:
    counted = ",".join(str(deaths) for deaths, _ in AGES.values())
    return f"year,{','.join(AGES)}\n".encode() + f"2010,{counted}\n".encode() * count


def headed(population: bytes) -> Handed:
    """Deaths and population, the latter under this heading."""
    content = csv(SOUND).replace(b"population", population, 1)
    return counts(content, population=population.decode())


def rated(table: list[Row] = SOUND, **mapping: object) -> Handed:
    """Rates and the population they are of."""
    told = [row | {"rate": int(str(row["deaths"])) / int(str(row["population"]))} for row in table]
    columns = {"deaths": "", "rate": "rate", "rate_is": "rate"} | mapping
    return replace(counts(csv(told), **columns), role="rates", name="rates.csv")


def by_fives() -> list[Row]:
    """Deaths that rise by half from group to group, among people that thin out."""
    ages = ["0", "1-4", *(f"{age}-{age + 4}" for age in range(5, 85, 5)), "85+"]
    return [
        {"area": "north", "year": year, "sex": "f", "age": age, "deaths": d, "population": 9_000}
        for year in (2010, 2011)
        for number, age in enumerate(ages)
        for d in [round(9 * 1.5 ** (number / 1.5)) + year % 3]
    ]


def january(table: list[Row]) -> Handed:
    return population(table, population_is="january")


def wider(table: list[Row]) -> list[Row]:
    """The table with ages 0 to 4 in one group."""
    return setting(without(table, where(table, age="1-4")), where(table, age="0"), age="0-4")


JOINED = without(SOUND, where(SOUND, year=2012)) + wider(where(SOUND, year=2012))
CELLS = table_cells(SOUND)
BOOK = xlsx(CELLS)
WIDE = ",".join(f"c{number}" for number in range(MOST_COLUMNS + 1)).encode() + b"\n1\n"
ISLE = csv(SOUND).replace(b"north", "Nørre".encode("latin-1"))

FORM_CASES = (
    Case("not_text", _bytes(b"%PDF-1.7 and so on")),
    Case("broken_package", _bytes(compress(csv(SOUND))[:-9])),
    Case("package_too_large", lambda: [counts(bomb())]),
    Case("package_in_package", _bytes(compress(compress(csv(SOUND))))),
    Case("packed_too_tightly", lambda: [book(repacked(BOOK, {SHEET: b"<a/>" + b" " * 2**25}))]),
    Case("broken_workbook", lambda: [book(BOOK[:2_000])]),
    Case("sheet_too_large", lambda: [book(crowded())]),
    Case("unknown_sheet", lambda: [book(BOOK, sheet="Deaths")]),
    Case("sheet_not_chosen", lambda: [book(xlsx(CELLS, more={"More": CELLS}))]),
    Case("formula_without_value", lambda: [book(xlsx(CELLS, change=with_formula))]),
    Case("formulas_kept", lambda: [book(with_kept_values(xlsx(CELLS, change=with_formula)))]),
    Case("hidden_cells", lambda: [book(xlsx(CELLS, change=hidden_row))]),
    Case("merged_filled", lambda: [book(xlsx(CELLS, change=merging("A2", "A71")))]),
    Case("too_many_merged", lambda: [book(overlapping())]),
    Case("beside_the_sheet", lambda: [book(repacked(BOOK, {"xl/vbaProject.bin": b"macro"}))]),
    Case("unknown_encoding", _formed(encoding="utf-7")),
    Case("wrong_encoding", _formed(ISLE, encoding="utf-8")),
    Case("encoding_guessed", lambda: [counts(ISLE, area="", area_name="area")]),
    Case("unknown_delimiter", _formed(delimiter="x")),
    Case("bad_heading_setting", _formed(heading=0)),
    Case("unknown_marks", _formed(decimal=",", thousands=",")),
    Case("notes_left_out", _bytes(csv(SOUND) + b"\nSource: the registry\n")),
    Case("empty_file", _bytes(b"\n\n")),
    Case("no_rows", _bytes(csv(SOUND).split(b"\n")[0])),
    Case("stray_quote", _bytes(csv(SOUND).replace(b"north,2012", b'no"rth,2012', 1))),
    Case("blank_heading", _bytes(b"\n" + csv(SOUND))),
    Case("too_many_columns", _bytes(WIDE)),
    Case("too_many_rows", _bytes(b"a\n" + b"1\n" * 3_000_001)),
    Case("uneven_rows", _bytes(csv(SOUND).replace(b"85+,642", b"85+,1,642", 1))),
)

COLUMN_CASES = (
    Case("bad_across", lambda: [wide(across_number="people")], "missing_column"),
    Case("too_many_counts", lambda: [wide(csv_rows(430_000))]),
    Case("merged_number", lambda: [book(xlsx(CELLS, change=merging("E2", "E3")))], "merged_filled"),
    Case("unit_not_stated", lambda: [headed(b"population (in thousands)")]),
    Case("bad_unit", lambda: [counts(SOUND, units=(("deaths", "some"),))]),
    Case("rate_kind_not_stated", lambda: [rated(rate_is="ratio")]),
    Case("bad_population_kind", lambda: [counts(SOUND, population_is="february")]),
)

WORKED_OUT_CASES = (
    Case("last_january", lambda: [january(SOUND)]),
    Case("one_january", lambda: [january(rows(years=(2010,)))]),
    Case("january_groups_differ", lambda: [january(JOINED)], "last_january"),
    Case("rates_without_population", lambda: [rated(population="")]),
    Case("people_coarser_than_rates", lambda: [rated(population=""), population(wider(SOUND))]),
    Case("rate_too_high", lambda: [rated(units=(("rate", "1000"),))]),
    Case("probability_above_one", lambda: [rated(units=(("rate", "10"),), rate_is="probability")]),
    Case("open_group_unknown", lambda: [rated(rate_is="probability")]),
    Case("open_group_worked_out", lambda: [rated(by_fives(), rate_is="probability")]),
    Case(
        "rate_of_unknown",
        lambda: [rated([*SOUND, SOUND[0] | {"age": "not stated"}])],
        "age_not_stated",
    ),
)
