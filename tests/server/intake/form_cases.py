"""One spoilt file for each way in which it can fail to be a table."""

from collections.abc import Callable
from dataclasses import dataclass
from gzip import compress

from server.intake.checks.files import MOST_COLUMNS
from server.intake.forms.unpacking import MOST_UNPACKED
from server.intake.mapping import Form
from server.intake.parsing import Handed
from server.intake.standing import Standing
from tests.server.intake.tables import counts, csv, rows


@dataclass(frozen=True)
class Case:
    key: str
    files: Callable[[], list[Handed]]
    also: str = ""  # another kind that the same fault must trip
    standing: Standing | None = None


def _bytes(content: bytes) -> Callable[[], list[Handed]]:
    return lambda: [counts(content)]


def _formed(content: bytes = b"", **form: object) -> Callable[[], list[Handed]]:
    return lambda: [counts(content or csv(SOUND), form=Form(**form))]  # type: ignore[arg-type]


def bomb() -> bytes:
    """Some hundred kilobytes that unpack to more than an upload may hold."""
    part = compress(b"0" * 2**24)
    return part * (MOST_UNPACKED // 2**24 + 1)


SOUND = rows()
WIDE = ",".join(f"c{number}" for number in range(MOST_COLUMNS + 1)).encode() + b"\n1\n"
ISLE = csv(SOUND).replace(b"north", "Nørre".encode("latin-1"))

FORM_CASES = (
    Case("not_text", _bytes(b"PK\x03\x04 and so on")),
    Case("broken_package", _bytes(compress(csv(SOUND))[:-9])),
    Case("package_too_large", lambda: [counts(bomb())]),
    Case("package_in_package", _bytes(compress(compress(csv(SOUND))))),
    Case("unknown_encoding", _formed(encoding="utf-7")),
    Case("wrong_encoding", _formed(ISLE, encoding="utf-8")),
    Case("encoding_guessed", lambda: [counts(ISLE, area="", area_name="area")]),
    Case("unknown_delimiter", _formed(delimiter="x")),
    Case("empty_file", _bytes(b"\n\n")),
    Case("no_rows", _bytes(csv(SOUND).split(b"\n")[0])),
    Case("stray_quote", _bytes(csv(SOUND).replace(b"north,2012", b'no"rth,2012', 1))),
    Case("blank_heading", lambda: [counts(csv(SOUND).replace(b"area,", b",", 1), area="")]),
    Case("doubled_heading", _bytes(csv(SOUND).replace(b"population", b"deaths", 1))),
    Case("too_many_columns", _bytes(WIDE)),
    Case("too_many_rows", _bytes(b"a\n" + b"1\n" * 3_000_001)),
    Case("uneven_rows", _bytes(csv(SOUND).replace(b"85+,642", b"85+,1,642", 1))),
)
