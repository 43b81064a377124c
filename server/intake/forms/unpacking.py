"""Files packed with gzip, unpacked within a bound that is known before anything is unpacked."""

import zlib
from dataclasses import dataclass

from server.intake.forms.found import Found
from server.intake.problems import Fault

GZIP = b"\x1f\x8b"
MOST_UNPACKED = 120_000_000  # bytes; three million rows of forty signs
STEP = 1 << 20
_GZIP_WINDOW = 31  # zlib's number for "with a gzip head"


@dataclass(frozen=True, slots=True)
class Unpacked:
    content: bytes
    packed: bool
    found: tuple[Found, ...] = ()


def unpacked(content: bytes, most: int = MOST_UNPACKED) -> Unpacked:
    """The bytes within, or what is wrong. One that would grow beyond `most` is not unpacked on."""
    if not content.startswith(GZIP):
        return Unpacked(content, packed=False)
    try:
        inner = _inflated(content, most)
    except (zlib.error, EOFError):
        return _refused("broken_package", packed=len(content))
    if inner is None:
        return _refused("package_too_large", packed=len(content), most=most)
    if inner.startswith(GZIP):
        return _refused("package_in_package")
    return Unpacked(inner, packed=True)


def _inflated(content: bytes, most: int) -> bytes | None:
    """All members, one after the other; None where they are more than `most` bytes.

    Raises: zlib.error, EOFError where the package is damaged or cut short.
    """
    parts, size = [], 0
    while content:
        member = zlib.decompressobj(_GZIP_WINDOW)
        while not member.eof:
            part = member.decompress(content, STEP)
            if not part and not member.unconsumed_tail and not member.eof:
                raise EOFError
            content = member.unconsumed_tail
            parts.append(part)
            size += len(part)
            if size > most:
                return None
        content = member.unused_data.lstrip(b"\0")  # tapes and some writers pad with zeros
    return b"".join(parts)


def _refused(key: str, **values: int) -> Unpacked:
    return Unpacked(b"", packed=True, found=(Found(key, Fault(values=values)),))
