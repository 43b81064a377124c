"""Whatever is handed in, the answer is problems or schedules, never an exception."""

from dataclasses import replace
from random import Random

import numpy as np
from hypothesis import example, given, settings
from hypothesis import strategies as st

from server.intake.mapping import COLUMNS as FIELDS
from server.intake.mapping import ROLES, Mapping
from server.intake.parsing import Handed, parse
from server.intake.reading import read
from server.intake.recognising.columns import recognise
from server.intake.report import Report
from server.intake.schedules import MEASURES
from tests.server.intake.cases import SOUND
from tests.server.intake.tables import COLUMNS, csv, rows, where

GOOD = csv(SOUND[:42])
WORDS = rb", ; - + . 0 9 f x ' 85+ 1-4 nan inf 1e400 True 1,204 =1+1 2010 total all".split()
SIGNS = [b"\n", b"\r", b"\n\n", b"\t", b" ", b'"', b"\0", b"\xff", b"\xef\xbb\xbf", "é".encode()]
SCRAPS = st.sampled_from([*WORDS, *SIGNS])


@st.composite
def spoilt(draw: st.DrawFn) -> bytes:
    """The good file with some stretches of bytes replaced."""
    content = GOOD
    for _ in range(draw(st.integers(1, 6))):
        start = draw(st.integers(0, len(content)))
        length = draw(st.integers(0, 12))
        scrap = draw(st.one_of(SCRAPS, st.binary(max_size=4)))
        content = content[:start] + scrap + content[start + length :]
    return content


def answered(role: str, content: bytes, mapping: Mapping) -> None:
    parsed = parse([Handed(role, "a.csv", content, mapping)])
    assert 0 <= parsed.sound_count <= parsed.row_count
    assert all(str(problem) for problem in parsed.problems)
    assert Report.from_json(Report.of(parsed).to_json()) == Report.of(parsed)
    if not parsed.errors:
        assert parsed.sound_count == parsed.row_count > 0
        assert parsed.cells
    for key, cell in parsed.cells.items():
        assert len(cell.values) == len(cell.grid)
        assert np.all((cell.values >= 0) & np.isfinite(cell.values)), key
    if parsed.sound_count < parsed.row_count:
        assert parsed.errors, "rows were left out without a word"


@settings(max_examples=150, deadline=None)
@given(content=spoilt(), opened=st.booleans())
@example(content=GOOD, opened=False)
def test_a_spoilt_file_is_answered(content: bytes, opened: bool) -> None:
    answered("counts", content, replace(COLUMNS, last_age_open=opened))


@settings(max_examples=100, deadline=None)
@given(content=st.binary(max_size=300), role=st.sampled_from(list(ROLES)))
@example(content=b"year\n2014\n", role="births")
@example(content=b'a"', role="deaths")
def test_any_bytes_are_answered(content: bytes, role: str) -> None:
    mapping = recognise(read(content, "a.csv"), role).mapping
    answered(role, content, replace(mapping, only_area="a", only_sex="f"))


@settings(max_examples=60, deadline=None)
@given(
    names=st.dictionaries(
        st.sampled_from(FIELDS), st.sampled_from(["", "x", *SOUND[0]]), min_size=1
    ),
    role=st.sampled_from(list(ROLES)),
    area=st.text(max_size=5),
)
def test_any_mapping_is_answered(names: dict[str, str], role: str, area: str) -> None:
    answered(role, GOOD, replace(COLUMNS, **names, only_area=area, whole=area))  # type: ignore[arg-type]


LABELS = {  # ages as several offices write them
    "0": ("0", "00", "under 1", " 0 "),
    "1-4": ("1-4", "01–04", "1 to 4 years"),
    "5-14": ("5-14", "05-14", "5 to 14"),
    "15-44": ("15-44", "15 - 44"),
    "45-64": ("45-64", "45–64 years"),
    "65-84": ("65-84", '"65-84"'),
    "85+": ("85+", "85 and over", "≥85", "85 years and older"),
}
SEXES = {"f": ("f", "F", " female", "Women"), "m": ("m", "M", "males", "men ")}


@settings(max_examples=60, deadline=None)
@given(
    codes=st.lists(
        st.sampled_from(["1", "01", "001", "1.0", "1.10", "1.1", "1e3", "1000", "a", "A", "0"]),
        min_size=1,
        max_size=4,
        unique=True,
    ),
    mark=st.sampled_from(",;\t"),
    end=st.sampled_from(["\n", "\r\n", "\r", "\n\n"]),
    split=st.booleans(),
    chance=st.randoms(use_true_random=False),
)
def test_a_table_written_otherwise_says_the_same(
    codes: list[str], mark: str, end: str, split: bool, chance: Random
) -> None:
    """Rows in any order, in one file or two, under any words: each count is where it belongs."""
    table = [row | {"deaths": n, "population": 900 + n} for n, row in enumerate(rows(codes))]
    said = {  # by measure and place, in the order of the ages
        (measure, row["area"], row["sex"], str(row["year"])): [
            float(str(other[field]))
            for other in where(table, area=row["area"], sex=row["sex"], year=row["year"])
        ]
        for field, measure in MEASURES.items()
        if field in table[0]
        for row in where(table, age="0")
    }
    handed = []
    for role in ("deaths", "population") if split else ("counts",):
        names = ["area", "year", "sex", "age", *ROLES[role]]
        chance.shuffle(names)
        chance.shuffle(table)
        words = [
            row | {"age": chance.choice(LABELS[str(row["age"])]), "sex": chance.choice(SEXES[sex])}
            for row in table
            if (sex := str(row["sex"]))
        ]
        lines = [mark.join(names), *(mark.join(str(row[name]) for name in names) for row in words)]
        mapping = replace(
            COLUMNS,
            deaths="deaths" if "deaths" in names else "",
            population="population" if "population" in names else "",
        )
        handed.append(Handed(role, f"{role}.csv", end.join(lines).encode(), mapping))
    parsed = parse(handed)
    assert not parsed.errors
    assert said == {
        (key.measure, key.area, key.sex, key.period): cell.values.tolist()
        for key, cell in parsed.cells.items()
    }
