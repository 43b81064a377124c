"""Codes of areas, and how they are made from names."""

import hashlib
import re

from server.intake.folding import without_accents

CODE = re.compile(r"[A-Za-z0-9_.-]{1,32}")


def is_code(text: str) -> bool:
    return CODE.fullmatch(text) is not None


def code_of(name: str) -> str:
    """The code made from a name: lower case, without accents, hyphens between words.

    A name without a single letter that can be written so gets a code from its digest.
    >>> code_of("Østre Mýrland (north)")
    'ostre-myrland-north'
    """
    code = "-".join(re.findall(r"[a-z0-9]+", without_accents(name)))[:32].strip("-")
    return code or "area-" + hashlib.sha256(name.encode()).hexdigest()[:8]
