"""What becomes of spoilt files: a report by outcome.

    python -m tests.studies.fuzz --files 20000

Each file begins as one of the ugly tables or a plain one, of one area as a rule so that it is
quick, and is spoilt: cells, rows, columns, headings, bytes, the form of the file. It is looked at
and read as the product proposes, with the likely answers where it asks. No file may raise, and
whatever is left out of what it says must be told.
"""

import argparse
import gzip
import io
import random
import sys
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from itertools import cycle

import openpyxl

from server.intake.checks import columns as of_columns
from server.intake.checks import files as of_files
from server.intake.mapping import Mapping
from server.intake.parsing import Handed, Parsed, parse
from server.intake.recognising.look import Looked, look
from server.intake.report import Report

AGES = ("0", "1-4", "5-14", "15-44", "45-64", "65-84", "85+")
HEADING = ["area", "year", "sex", "age", "deaths", "population"]
EARLY = {check.key for family in (of_files, of_columns) for check in family.CHECKS}
WORDS = (
    "", " ", "-", "–", "..", "x", "n/a", "NaN", "inf", "-inf", "1e400", "-3", "0", "0.5", "1,5",
    "1.234", "1.234,5", "1 234", "1 234", "12a", "=1+1", "=cmd|x", "'5", "TRUE", "04.01.2023",
    "2023-01-04", "4-Jan", "total", "Total", "All ages", "not stated", "unknown", "999", "85",
    "85+", "90+", "80-84", "5-9", "1-4", "<1", "Under 1", "p", "f", "m", "1", "2", "x" * 300, "é",
    "\t", '"', "a,b", "2014", "2014.0", "1899", "9999", "north", "N 1", "؏", "１２",
)  # fmt: skip
Table = list[list[str]]
Spoil = Callable[[random.Random, Table], None]


def table(chance: random.Random) -> Table:
    """A sound table in long form."""
    rows = [list(HEADING)]
    for area in chance.sample(("north", "south", "isle"), chance.choice((1, 1, 1, 2))):
        for year in range(2014, 2014 + chance.choice((1, 2, 3))):
            for sex in "fm":
                for place, age in enumerate(AGES):
                    people = 9_000 - 900 * place + chance.randrange(90)
                    deaths = int(people * (0.004, 0.0002, 0.0001, 0.001, 0.006, 0.04, 0.14)[place])
                    rows.append([area, str(year), sex, age, str(deaths), str(people)])
    return rows


def _cells(chance: random.Random, rows: Table) -> None:
    for _ in range(chance.choice((1, 1, 2, 5))):
        row = rows[chance.randrange(len(rows))]
        if row:
            row[chance.randrange(len(row))] = chance.choice(WORDS)


def _columns(chance: random.Random, rows: Table) -> None:
    word, place = chance.choice(WORDS), chance.randrange(len(rows[0]) or 1)
    for row in rows[1:]:
        if chance.random() < 0.8 and place < len(row):
            row[place] = word


def _rows(chance: random.Random, rows: Table) -> None:
    kind, at = chance.randrange(5), chance.randrange(1, max(2, len(rows)))
    if kind == 0:
        del rows[at : at + chance.choice((1, 1, 7))]
    elif kind == 1:
        rows.insert(at, list(chance.choice(rows)))
    elif kind == 2:
        rows[1:] = chance.sample(rows[1:], len(rows) - 1)
    elif kind == 3:
        rows.insert(at, [chance.choice(WORDS) for _ in range(chance.randrange(9))])
    else:
        rows.append(["north", "2014", "p", chance.choice(("All ages", "0", "85+")), "9", "99"])


def _headings(chance: random.Random, rows: Table) -> None:
    kind = chance.randrange(4)
    if kind == 0 and rows[0]:
        rows[0][chance.randrange(len(rows[0]))] = chance.choice((*WORDS, *HEADING))
    elif kind == 1:
        rows[:0] = [["Deaths of the coast"], *([[]] * chance.randrange(3))]
    elif kind == 2:
        place = chance.randrange(len(rows[0]) or 1)
        for row in rows:
            del row[place : place + 1]
    else:
        rows.append(["Source: the office"])


SPOILS: tuple[Spoil, ...] = (_cells, _cells, _columns, _rows, _headings)


def written(chance: random.Random, rows: Table) -> tuple[str, bytes]:
    """The table as a file of some form, with a scrap of bytes now and then."""
    if chance.random() < 0.04:
        return "table.xlsx", _workbook(rows)
    sign = chance.choice(",,,;\t|")
    end = chance.choice(("\n", "\r\n", "\r"))
    text = end.join(sign.join(_quoted(cell, sign) for cell in row) for row in rows) + end
    encoding = chance.choice(("utf-8", "utf-8", "utf-8-sig", "utf-16", "latin-1", "cp1252"))
    content = text.encode(encoding, "replace")
    for _ in range(chance.choice((0, 0, 0, 1, 3))):
        at = chance.randrange(len(content) + 1)
        scrap = chance.choice((b"\0", b"\xff", b'"', b"\n", b"\xe2\x80", b",,,", b"", b"\x1a"))
        content = content[:at] + scrap + content[at + chance.randrange(4) :]
    if chance.random() < 0.05:
        packed = gzip.compress(content, 1)
        return "table.csv.gz", packed[: chance.choice((len(packed), len(packed), 40))]
    return "table.csv", content


def _quoted(cell: str, sign: str) -> str:
    return f'"{cell}"' if sign in cell and '"' not in cell else cell


def _workbook(rows: Table) -> bytes:
    book = openpyxl.Workbook(write_only=True)
    sheet = book.create_sheet("counts")
    for row in rows:
        texts = [_plain(cell) for cell in row]
        sheet.append([float(one) if one.isascii() and one.isdigit() else one for one in texts])
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def _plain(cell: str) -> str:
    """A workbook holds no control characters."""
    return "".join(sign for sign in cell if sign.isprintable())


def answered(looked: Looked) -> Mapping:
    """The proposals, and the likely answer to what is still open."""
    units = dict(looked.units) | dict(looked.mapping.units)
    likely = {code.text: code.likely for code in looked.noticed.sexes if code.likely}
    sexes = likely | dict(looked.mapping.sex_codes)
    return replace(
        looked.mapping,
        units=tuple(units.items()),
        rate_is=looked.mapping.rate_is or ("rate" if "rate_is" in looked.open else ""),
        sex_codes=tuple(sexes.items()),
        signs=tuple(zip(looked.signs, cycle(("nil", "mistake", "not_available")), strict=False)),
        only_area="" if looked.mapping.area or looked.mapping.area_name else "north",
        unstated=(("sex", "spread"), ("age", "spread"), ("area", "left_out")),
    )


def outcome(parsed: Parsed) -> str:
    if any(one.key in EARLY for one in parsed.errors):
        return "no table, or its columns are not found"
    if parsed.errors:
        return "checked, with errors"
    return "checked, with warnings" if parsed.problems else "sound"


@dataclass(slots=True)
class Found:
    outcomes: Counter[str] = field(default_factory=Counter)
    messages: Counter[str] = field(default_factory=Counter)  # keys of checks

    def share_checked(self) -> float:
        early = self.outcomes["no table, or its columns are not found"]
        return 1 - early / max(1, self.outcomes.total())


def spoilt(chance: random.Random) -> tuple[str, bytes]:
    """One file."""
    rows = table(chance)
    for _ in range(chance.choice((0, 1, 1, 2, 3))):
        chance.choice(SPOILS)(chance, rows)
        rows = rows if rows and rows[0] else [list(HEADING), *rows]
    return written(chance, rows)


def study(files: int, seed: int) -> Found:
    """Read so many spoilt files. Raises: AssertionError, naming the file by its number, where one
    is not answered as it should be."""
    found = Found()
    for number in range(files):
        name, content = spoilt(random.Random(f"{seed}/{number}"))
        try:
            parsed = _read(name, content)
        except Exception as error:
            raise AssertionError(
                f"file {number} of seed {seed} ({name}) was not answered"
            ) from error
        found.outcomes[outcome(parsed)] += 1
        found.messages.update({problem.key for problem in parsed.problems})
    return found


def _read(name: str, content: bytes) -> Parsed:
    mapping = answered(look(content, name, "counts"))
    parsed = parse([Handed("counts", name, content, mapping)])
    assert all(str(problem) for problem in parsed.problems)
    assert 0 <= parsed.sound_count <= parsed.row_count
    left_out = any(problem.key == "count_not_available" for problem in parsed.problems)
    assert parsed.errors or parsed.cells or left_out
    assert parsed.errors or parsed.sound_count == parsed.row_count
    assert Report.from_json(Report.of(parsed).to_json()) == Report.of(parsed)
    return parsed


def main() -> None:
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--files", type=int, default=20_000)
    asked.add_argument("--seed", type=int, default=1)
    chosen = asked.parse_args()
    found = study(chosen.files, chosen.seed)
    for name, count in found.outcomes.most_common():
        print(f"{count / chosen.files:6.1%} {name}")
    print(f"{len(found.messages)} different checks spoke; the most frequent:")
    for name, count in found.messages.most_common(12):
        print(f"{count / chosen.files:6.1%} {name}")


if __name__ == "__main__":
    sys.exit(main())
