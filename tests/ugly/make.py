"""Makes the ugly files: tables of an invented coast as offices really hand them in.

    python -m tests.ugly.make

Each holds the same counts (`truth`), or says in `stories` where it does not. The files are kept, so
that a reader can open them; a test makes them again and compares.
"""

import gzip
import io
from collections.abc import Iterable, Iterator, Sequence
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl

FOLDER = Path(__file__).parent
AREAS = {"north": "Northmarsh", "south": "Sønderfen", "isle": "Isle of Gåsholm"}
YEARS = (2019, 2020, 2021, 2022)
SEXES = ("f", "m")
STARTS = (0, 1, *range(5, 90, 5))
AGES = ("0", "1-4", *(f"{age}-{age + 4}" for age in range(5, 85, 5)), "85+")
Row = Sequence[object]
Truth = dict[tuple[str, str, str, int], np.ndarray]  # measure, area, sex, year -> [age]


def truth() -> Truth:
    """Deaths and people of three areas, four years, women and men; whole numbers."""
    rng = np.random.default_rng(20)
    mids = np.array([0.3, 3, *np.arange(7.5, 85, 5), 90])
    found: Truth = {}
    for number, area in enumerate(AREAS):
        for sex in SEXES:
            level = (3e-5 if sex == "f" else 5e-5) * np.exp(0.095 * mids) + 2e-4
            level[0] = 0.004
            size = (42_000, 27_500, 19_000)[number]
            for year in YEARS:
                people = (
                    size * np.minimum(1, np.exp(-((mids / 78) ** 4))) * (1 + 0.004 * (year - 2019))
                )
                people[:2] *= (0.2, 0.8)
                people = np.round(people + rng.normal(0, 12, len(mids)))
                found["person_years", area, sex, year] = people
                found["deaths", area, sex, year] = rng.poisson(level * people).astype(float)
    return found


def _lines(rows: Iterable[Row], sign: str, end: str = "\r\n") -> str:
    return end.join(sign.join(map(str, row)) for row in rows) + end


def _grouped(value: float, decimals: int, point: str, thousands: str) -> str:
    text = f"{value:,.{decimals}f}"
    return text.replace(",", "\0").replace(".", point).replace("\0", thousands)


def german(found: Truth) -> bytes:
    """Title rows, foot notes, semicolons, decimal commas and totals of ages, sexes and areas."""
    ages = ["unter 1", "1 bis unter 5"]
    ages += [f"{start} bis unter {start + 5}" for start in STARTS[2:-1]]
    ages += ["85 und älter"]
    rows: list[Row] = [
        ("Gestorbene und Bevölkerung der Küste nach Alter und Geschlecht",),
        ("Stand: 30. Juni 2023; Bevölkerung im Jahresmittel",),
        ("",),
        ("Jahr", "Region", "Geschlecht", "Alter", "Gestorbene", "Bevölkerung"),
    ]
    for year in YEARS:
        for area, name in {**AREAS, "": "Insgesamt"}.items():
            for sex, word in (("f", "weiblich"), ("m", "männlich"), ("p", "insgesamt")):
                own = [
                    sum(
                        found[measure, a, s, year]
                        for a in ([area] if area else AREAS)
                        for s in (SEXES if sex == "p" else [sex])
                    )
                    for measure in ("deaths", "person_years")
                ]
                for place, age in enumerate((*ages, "Insgesamt")):
                    deaths, people = (
                        float(one.sum() if age == "Insgesamt" else one[place])
                        for one in own  # type: ignore[union-attr]
                    )
                    rows.append(
                        (
                            year,
                            name,
                            word,
                            age,
                            _grouped(deaths, 0, ",", "."),
                            _grouped(people, 1, ",", "."),
                        )
                    )
    rows += [
        ("",),
        ("Quelle: Amt der Küste",),
        ("Abweichungen in den Summen erklären sich durch Runden.",),
    ]
    return _lines(rows, ";").encode("latin-1")


def workbook_by_age(found: Truth) -> bytes:
    """Two sheets, a title, ages across with a total, the area named in its first row only."""
    book = openpyxl.Workbook()
    notes = book.active
    notes.title = "Read me"
    notes.append(["Counts of the coast, made for the board"])
    for title, measure in (("Deaths", "deaths"), ("Population", "person_years")):
        sheet = book.create_sheet(title)
        sheet.append([f"{title} by age, sex and area"])
        sheet.append([])
        labels = ["Under 1", "1 to 4", *(f"{s} to {s + 4}" for s in STARTS[2:-1]), "85 and over"]
        sheet.append(["Area", "Year", "Sex", *labels, "All ages"])
        for area, name in AREAS.items():
            for year in YEARS:
                for sex, word in (("f", "Females"), ("m", "Males")):
                    counts = found[measure, area, sex, year].tolist()
                    sheet.append([name, year, word, *counts, sum(counts)])
    return _saved(book)


def _saved(book: Any) -> bytes:
    book.properties.created = book.properties.modified = datetime(2023, 7, 1)
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def two_rows_of_headings(found: Truth, measure: str) -> bytes:
    """Years over sexes in two rows of headings; a byte order mark; ages in rows."""
    top = ["Area", "Age"]
    below = ["", ""]
    for year in YEARS:
        top += [str(year), ""]
        below += ["Women", "Men"]
    rows: list[Row] = [top, below]
    for area, name in AREAS.items():
        for place, age in enumerate(AGES):
            cells = [int(found[measure, area, sex, year][place]) for year in YEARS for sex in SEXES]
            rows.append((name, age, *cells))
    return b"\xef\xbb\xbf" + _lines(rows, ",").encode()


def not_stated(found: Truth) -> bytes:
    """One death in a hundred without an age, and some without a sex; codes of numbers for both."""
    rng = np.random.default_rng(3)
    rows: list[Row] = [("area", "year", "sex", "age", "deaths", "population")]
    for area in AREAS:
        for year in YEARS:
            unknown_sex = 0
            for sex in SEXES:
                deaths = found["deaths", area, sex, year].copy()
                lost = rng.binomial(deaths.astype(int), 0.01)
                hidden = rng.binomial((deaths - lost).astype(int), 0.005)
                unknown_sex += int(hidden.sum())
                people = found["person_years", area, sex, year]
                for place, age in enumerate(AGES):
                    rest = int(deaths[place] - lost[place] - hidden[place])
                    rows.append((area, year, sex, age, rest, int(people[place])))
                rows.append((area, year, sex, "not stated", int(lost.sum()), 0))
            rows.append((area, year, "unknown", "not stated", unknown_sex, 0))
    return _lines(rows, ",", "\n").encode()


def old_codes(found: Truth) -> tuple[bytes, bytes]:
    """The north as two districts of old codes, and the table of what became of them."""
    rng = np.random.default_rng(4)
    rows: list[Row] = [("code", "year", "sex", "age group", "deaths", "population")]
    for area in AREAS:
        for year in YEARS:
            for sex in SEXES:
                deaths = found["deaths", area, sex, year].astype(int)
                people = found["person_years", area, sex, year].astype(int)
                parts = {f"{area}": (deaths, people)}
                if area == "north":
                    east = rng.binomial(deaths, 0.4), rng.binomial(people, 0.4)
                    parts = {"N-01": east, "N-02": (deaths - east[0], people - east[1])}
                for code, (dead, lived) in parts.items():
                    rows += [(code, year, sex, *row) for row in zip(AGES, dead, lived, strict=True)]
    became: list[Row] = [("code", "becomes", "name"), ("N-01", "north", "Northmarsh")]
    became.append(("N-02", "north", "Northmarsh"))
    return _lines(rows, ",", "\n").encode(), _lines(became, ",", "\n").encode()


def january(found: Truth) -> tuple[bytes, bytes]:
    """People on 1 January, in UTF-16 with tabs as a spreadsheet saves it; and the deaths."""
    people: list[Row] = [("Year", "Sex", "Age", "Area code", "Population on 1 January")]
    deaths: list[Row] = [("Year", "Sex", "Age", "Area code", "Deaths")]
    for area in AREAS:
        for sex in SEXES:
            for place, age in enumerate(AGES):
                # the counts of two January days have the mean of the year between them
                standing = found["person_years", area, sex, YEARS[0]][place] - 3
                for year in (*YEARS, YEARS[-1] + 1):
                    people.append((year, sex.upper(), age, area, int(standing)))
                    if year in YEARS:
                        standing = 2 * found["person_years", area, sex, year][place] - standing
                        dead = int(found["deaths", area, sex, year][place])
                        deaths.append((year, sex.upper(), age, area, dead))
    return _lines(people, "\t").encode("utf-16"), _lines(deaths, "\t").encode("utf-16")


def rates(found: Truth) -> bytes:
    """Death rates per 100,000 beside the people they are of."""
    rows: list[Row] = [("area", "year", "sex", "age", "rate per 100 000", "population")]
    for area in AREAS:
        for year in YEARS:
            for sex in SEXES:
                deaths = found["deaths", area, sex, year]
                people = found["person_years", area, sex, year]
                for place, age in enumerate(AGES):
                    rate = 1e5 * deaths[place] / people[place]
                    rows.append((area, year, sex, age, f"{rate:.6f}", int(people[place])))
    return _lines(rows, ",", "\n").encode()


def pasted(found: Truth) -> bytes:
    """As copied from a spreadsheet: tabs, thin blanks between thousands, a dash for nil."""
    rows: list[Row] = [("Area", "Year", "Sex", "Age", "Deaths", "Population")]
    for area, name in AREAS.items():
        for year in YEARS:
            for sex, word in (("f", "Women"), ("m", "Men")):
                for place, age in enumerate(AGES):
                    dead = int(found["deaths", area, sex, year][place])
                    lived = int(found["person_years", area, sex, year][place])
                    said = _grouped(dead, 0, ".", "\u202f") if dead else "–"
                    group = age.replace("-", "–")
                    rows.append((name, year, word, group, said, _grouped(lived, 0, ".", "\u202f")))
    return _lines(rows, "\t", "\n").encode()


def dates_for_ages(found: Truth) -> bytes:
    """A workbook in which some program took the ages 1-4 and 5-9 for days of the year."""
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "counts"
    sheet.append(["area", "year", "sex", "age", "deaths", "population"])
    for area in AREAS:
        for year in YEARS:
            for sex in SEXES:
                for place, age in enumerate(AGES):
                    label: object = age
                    if age in ("1-4", "5-9"):
                        month, day = map(int, age.split("-"))
                        label = datetime(2023, day, month)
                    dead = found["deaths", area, sex, year][place]
                    lived = found["person_years", area, sex, year][place]
                    sheet.append([area, year, sex, label, dead, lived])
    return _saved(book)


def packed(found: Truth) -> bytes:
    """Packed, with bars, old line ends, two columns of one name, codes and names, and a status."""
    rows: list[Row] = [
        (
            "code",
            "name",
            "period",
            "sex",
            "age",
            "note",
            "number of deaths",
            "person-years",
            "status",
            "note",
        )
    ]
    for area, name in AREAS.items():
        for year in YEARS:
            for sex, word in (("f", "female"), ("m", "male")):
                for place, age in enumerate(AGES):
                    dead = found["deaths", area, sex, year][place]
                    lived = found["person_years", area, sex, year][place]
                    state = "provisional" if year == YEARS[-1] else "final"
                    rows.append((area, name, year, word, age, "", f"{dead:.1f}", lived, state, ""))
    return gzip.compress(_lines(rows, "|", "\r").encode(), mtime=0)


CAUSES = {  # leaf of the short list, codes as this office writes them, hundredths of the deaths
    "cancer-lung": (("C34.1", 9), ("c349", 6)),
    "cancer-breast": (("C50.9", 8),),
    "stroke": (("I64", 14),),
    "respiratory-other": (("J84.1", 5),),
    "suicide": (("X70.-", 3),),
    "pending": (("R99", 3),),
    "heart-attack": (("I21 Akuter Myokardinfarkt", 30), ("I25.1†", 0)),
}
GROUPS = {"C00-C97": ("C34.1", "c349", "C50.9"), "I20-I25": ("I21 Akuter Myokardinfarkt", "I25.1†")}
LAST = "I25.1†"  # has what is left


def by_code(found: Truth, area: str, sex: str, year: int, place: int) -> dict[str, float]:
    """Deaths of one age under each code; together those of the truth."""
    dead = float(found["deaths", area, sex, year][place])
    shares = {code: part for codes in CAUSES.values() for code, part in codes}
    counts = {
        code: 0.0 if code == "X70.-" and STARTS[place] < 10 else float(dead * part // 100)
        for code, part in shares.items()
    }
    counts[LAST] = dead - sum(counts.values())
    return counts


def causes(found: Truth) -> bytes:
    """Deaths by code of ICD-10 in several ways of writing it, sums of chapters and of all causes
    among the rows, semicolons, decimal commas, and no row where nobody died."""
    rows: list[Row] = [("Gestorbene nach Todesursache, Geschlecht und Alter", *[""] * 5)]
    rows.append(
        ("Bundesland", "Jahr", "Geschlecht", "Alter", "Todesursache (ICD-10)", "Gestorbene")
    )
    for area, name in AREAS.items():
        for year in YEARS:
            for sex, word in (("f", "weiblich"), ("m", "männlich")):
                for place, age in enumerate(AGES):
                    counts = by_code(found, area, sex, year, place)
                    sums = {
                        group: sum(counts[code] for code in codes)
                        for group, codes in GROUPS.items()
                    }
                    every = {"Insgesamt": sum(counts.values())} | sums | counts
                    label = age.replace("85+", "85 und älter").replace("-", "–")
                    rows += [
                        (name, year, word, label, code, _grouped(count, 1, ",", ""))
                        for code, count in every.items()
                        if count or code == "Insgesamt"
                    ]
    rows.append(("Quelle: Statistisches Amt", *[""] * 5))
    return _lines(rows, ";").encode("cp1252")


def people_alone(found: Truth) -> bytes:
    """The people of the same areas, as plainly as can be."""
    rows: list[Row] = [("area", "year", "sex", "age", "population")]
    for area, name in AREAS.items():
        for year in YEARS:
            for sex in SEXES:
                lived = found["person_years", area, sex, year]
                rows += [(name, year, sex, age, n) for age, n in zip(AGES, lived, strict=True)]
    return _lines(rows, ",").encode()


def files() -> Iterator[tuple[str, bytes]]:
    """Name and content of each."""
    found = truth()
    yield "01-title-rows-and-totals.csv", german(found)
    yield "02-ages-across.xlsx", workbook_by_age(found)
    yield "03-two-rows-of-headings-deaths.csv", two_rows_of_headings(found, "deaths")
    yield "03-two-rows-of-headings-people.csv", two_rows_of_headings(found, "person_years")
    yield "04-not-stated.csv", not_stated(found)
    counts, became = old_codes(found)
    yield "05-old-codes.csv", counts
    yield "05-what-became-of-them.csv", became
    people, deaths = january(found)
    yield "06-january-people.txt", people
    yield "06-january-deaths.txt", deaths
    yield "07-rates.csv", rates(found)
    yield "08-pasted.tsv", pasted(found)
    yield "09-dates-for-ages.xlsx", dates_for_ages(found)
    yield "10-packed.csv.gz", packed(found)
    yield "11-by-cause.csv", causes(found)
    yield "11-people.csv", people_alone(found)


if __name__ == "__main__":
    for name, content in files():
        (FOLDER / name).write_bytes(content)
