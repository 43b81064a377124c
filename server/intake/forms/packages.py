"""The parts of a zipped workbook, opened only after sizes, kinds and links were looked at."""

import io
import posixpath
import re
import zipfile
import zlib
from collections.abc import Callable
from dataclasses import dataclass
from xml.parsers import expat

from server.intake.forms.found import Found
from server.intake.problems import Fault, Text

ZIP = b"PK\x03\x04"
LISTED = b"PK\x01\x02"  # stands before each part in the list of all, which is read at once
MOST_PARTS = 5_000
MOST_XML = 600_000_000  # bytes of all parts; they are read piece by piece, and never kept
MOST_RATIO, SMALL = 250, 8_000_000  # a part is packed no tighter, unless it is small
STEP = 1 << 16
KINDS = (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED)
UNREADABLE = (expat.ExpatError, zipfile.BadZipFile, zlib.error, EOFError, OSError, ValueError)


class Broken(Exception):
    """A part is not what it should be."""


@dataclass(frozen=True, slots=True)
class Package:
    """A zipped workbook whose sizes are within bounds."""

    parts: zipfile.ZipFile

    def has(self, pattern: str) -> int:
        """How many parts have such a name."""
        return sum(1 for name in self.parts.namelist() if re.search(pattern, name))

    def size(self, part: str) -> int:
        """Bytes of a part. Raises: Broken where there is none."""
        if part not in self.parts.namelist():
            raise Broken(part)
        return self.parts.getinfo(part).file_size

    def start(self, part: str, size: int) -> bytes:
        """The first bytes of a part. Raises: Broken."""
        try:
            with self.parts.open(part) as stream:
                return stream.read(size)
        except UNREADABLE as error:
            raise Broken(part) from error

    def parse(
        self,
        part: str,
        begin: Callable[[str, dict[str, str]], None],
        end: Callable[[str], None] | None = None,
        text: Callable[[str], None] | None = None,
    ) -> None:
        """Read a part of XML piece by piece. Raises: Broken, also where it defines entities."""
        if part not in self.parts.namelist():
            raise Broken(part)
        reader = expat.ParserCreate()
        reader.buffer_text = True
        reader.StartElementHandler = begin
        reader.EndElementHandler = end
        reader.CharacterDataHandler = text
        reader.StartDoctypeDeclHandler = _refuse
        try:
            with self.parts.open(part) as stream:
                while piece := stream.read(STEP):
                    reader.Parse(piece, False)
            reader.Parse(b"", True)
        except UNREADABLE as error:
            raise Broken(part) from error

    def links(self, part: str) -> dict[str, tuple[str, str]]:
        """Kind and part that each link of a part leads to, by its key."""
        folder, name = posixpath.split(part)
        found: dict[str, tuple[str, str]] = {}

        def begin(tag: str, given: dict[str, str]) -> None:
            if local(tag) == "Relationship" and given.get("TargetMode") != "External":
                target = posixpath.normpath(posixpath.join("/", folder, given.get("Target", "")))
                kind = given.get("Type", "").rpartition("/")[2]
                found[given.get("Id", "")] = (kind, target.lstrip("/"))

        self.parse(f"{folder}/_rels/{name}.rels".lstrip("/"), begin)
        return found


def local(tag: str) -> str:
    """Name of an element without its prefix."""
    return tag.rpartition(":")[2]


def _refuse(*_: object) -> None:
    raise Broken(Text("a document type"))


def package(content: bytes) -> Package | Found:
    """A zipped file whose parts may be read, or why not. Nothing is unpacked here."""
    if content.count(LISTED) > MOST_PARTS:
        return Found("broken_workbook", Fault(values={"part": Text("the list of its parts")}))
    try:
        parts = zipfile.ZipFile(io.BytesIO(content))
    except (zipfile.BadZipFile, OSError, ValueError, RuntimeError):  # of versions it cannot read
        return Found("broken_workbook", Fault(values={"part": Text("the whole")}))
    listed = parts.infolist()
    size = sum(part.file_size for part in listed)
    if size > MOST_XML:
        values = {"packed": len(content), "most": MOST_XML}
        return Found("package_too_large", Fault(values=values))
    for part in listed:
        if part.file_size > SMALL and part.file_size > MOST_RATIO * max(part.compress_size, 1):
            values = {"packed": part.compress_size, "size": part.file_size}
            return Found("packed_too_tightly", Fault(values=values))
    closed = any(part.flag_bits & 1 or part.compress_type not in KINDS for part in listed)
    if closed:
        return Found("broken_workbook", Fault(values={"part": Text("the whole")}))
    return Package(parts)
