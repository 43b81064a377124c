"""Numbers as people write them: which sign stands before decimals, which between thousands."""

import math
import re
from collections.abc import Callable

from server.intake.forms.found import Found
from server.intake.mapping import Form
from server.intake.problems import Fault

DECIMALS = (".", ",")
# sign between thousands as a form states it, and all that is typed for it
THOUSANDS = {"": "", ",": ",", ".": ".", " ": " \u00a0\u2009\u202f", "'": "'\u2019"}


def reader(decimal: str = ".", thousands: str = "") -> Callable[[str], float]:
    """What a text is worth; nan where it is no number.

    >>> reader(",", ".")("1.204,5"), reader(",", ".")("12.04")
    (1204.5, nan)
    """
    sign, marks = re.escape(decimal), "".join(map(re.escape, THOUSANDS[thousands]))
    whole = rf"(?:\d+|\d{{1,3}}(?:[{marks}]\d{{3}})+)" if marks else r"\d+"
    number = re.compile(
        rf"[+-]?(?:{whole}(?:{sign}\d*)?|{sign}\d+)(?:e[+-]?\d+)?|[+-]?inf(?:inity)?",
        re.IGNORECASE | re.ASCII,
    )
    between = re.compile(f"[{marks}]") if marks else None

    def read(text: str) -> float:
        if not number.fullmatch(text):
            return math.nan
        digits = between.sub("", text) if between else text
        return float(digits.replace(decimal, "."))

    return read


def unknown_marks(form: Form) -> list[Found]:
    """Marks of numbers that are none, or one that would mean both."""
    known = form.decimal in DECIMALS and form.thousands in THOUSANDS
    if known and form.decimal != form.thousands:
        return []
    values = {"decimal": form.decimal, "thousands": form.thousands}
    return [Found("unknown_marks", Fault(values=values))]
