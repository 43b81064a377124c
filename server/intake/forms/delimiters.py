"""What stands between the fields: found by how evenly it cuts the lines."""

import re
from collections import Counter
from dataclasses import dataclass

DELIMITERS = {",": "comma", ";": "semicolon", "\t": "tab", "|": "pipe"}
BLANKS = " "  # a run of blanks; only where it is chosen
NAMES = DELIMITERS | {BLANKS: "blanks"}
LOOKED_AT = 64_000  # signs
LINES = 60
_RUN = re.compile(rb"[ \t]+")


@dataclass(frozen=True, slots=True)
class Delimited:
    delimiter: str
    sure: bool  # no other sign cuts as many lines as evenly
    others: tuple[str, ...] = ()  # those that would do nearly as well


def delimited(body: bytes, skip: int = 0) -> Delimited:
    """The sign that cuts most lines after the first `skip` into the same number of fields; of two,
    the one that makes more of them."""
    lines = _outside_quotes(body[:LOOKED_AT]).split("\n")[skip:]
    lines = [line for line in lines if line.strip()][:LINES]
    scores = {sign: _evenness(lines, sign) for sign in DELIMITERS}
    best = max(scores, key=lambda sign: scores[sign])
    rivals = [
        sign
        for sign, (lines_cut, _) in scores.items()
        if sign != best and lines_cut * 2 > len(lines)
    ]
    return Delimited(best, sure=not rivals, others=tuple(rivals))


def _evenness(lines: list[str], sign: str) -> tuple[int, int]:
    """How many lines have the commonest number of these signs, and that number."""
    counts = Counter(count for line in lines if (count := line.count(sign)))
    if not counts:
        return 0, 0
    count, agreeing = max(counts.items(), key=lambda item: (item[1], item[0]))
    return agreeing, count


def _outside_quotes(body: bytes) -> str:
    return "".join(body.decode(errors="replace").split('"')[::2])


def without_blanks(body: bytes) -> bytes:
    """Runs of blanks made tabs, but for those inside quotation marks and at the ends of lines."""
    pieces = body.split(b'"')
    pieces[::2] = [_RUN.sub(b"\t", piece) for piece in pieces[::2]]
    return b"\n".join(line.strip(b"\t") for line in b'"'.join(pieces).split(b"\n"))
