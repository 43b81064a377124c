"""Whatever is handed in, the answer is problems or schedules, never an exception."""

from dataclasses import replace

import numpy as np
from hypothesis import example, given, settings
from hypothesis import strategies as st

from server.intake.mapping import COLUMNS as FIELDS
from server.intake.mapping import ROLES, Mapping
from server.intake.parsing import Handed, parse
from server.intake.reading import read
from server.intake.recognising import recognise
from server.intake.report import Report
from tests.server.intake.cases import SOUND
from tests.server.intake.tables import COLUMNS, csv

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
