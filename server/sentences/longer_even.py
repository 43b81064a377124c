"""What is said of lives that became longer or shorter, and more or less even in length."""

from dataclasses import dataclass

from server.sentences.numbers import number
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _


@dataclass(frozen=True, slots=True)
class Part:
    """What deaths before or after an age add to a difference, as printed."""

    value: float
    low: float
    high: float
    decimals: int
    exact: bool = False

    @property
    def sign(self) -> int:
        """Which way it goes, 0 where chance leaves that open or it prints as nothing."""
        if number(abs(self.value), self.decimals) == number(0, self.decimals):
            return 0
        if self.exact or self.low > 0 or self.high < 0:
            return 1 if self.value > 0 else -1
        return 0

    @property
    def shown(self) -> str:
        return number(self.value, self.decimals, signed=True)


@dataclass(frozen=True, slots=True)
class Half:
    """Early or late deaths: what they add to life expectancy (years) and H (thousandths)."""

    longer: Part
    even: Part


def told(early: Half, late: Half, age: int) -> Sentence:
    """One clause each, the direction only where its interval bears it out."""
    return phrase(
        "{early} {late}",
        early=_("Deaths before {age} {what}.", age=age, what=_clause(early)),
        late=_("Deaths from {age} on {what}.", age=age, what=_clause(late)),
    )


def _clause(half: Half) -> str:
    parts = {"years": half.longer.shown, "even": half.even.shown}
    longer, even = half.longer.sign, half.even.sign
    texts = {
        (1, -1): _(
            "make lives longer ({years} years) and more even ({even} thousandths of H)", **parts
        ),
        (1, 1): _(
            "make lives longer ({years} years) and less even ({even} thousandths of H)", **parts
        ),
        (-1, 1): _(
            "make lives shorter ({years} years) and less even ({even} thousandths of H)", **parts
        ),
        (-1, -1): _(
            "make lives shorter ({years} years) and more even ({even} thousandths of H)", **parts
        ),
        (1, 0): _(
            "make lives longer ({years} years), not clearly more or less even ({even} thousandths"
            " of H)",
            **parts,
        ),
        (-1, 0): _(
            "make lives shorter ({years} years), not clearly more or less even ({even} thousandths"
            " of H)",
            **parts,
        ),
        (0, -1): _(
            "make lives more even ({even} thousandths of H), not clearly longer or shorter"
            " ({years} years)",
            **parts,
        ),
        (0, 1): _(
            "make lives less even ({even} thousandths of H), not clearly longer or shorter"
            " ({years} years)",
            **parts,
        ),
        (0, 0): _("make no clear difference ({years} years, {even} thousandths of H)", **parts),
    }
    return texts[longer, even]


def threshold(here: float, there: float, age: int) -> str:
    """Why it is this age that parts early deaths from late ones."""
    return _(
        "Fewer deaths below a threshold age make length of life more even, fewer above it less even"
        " (Zhang and Vaupel, 2009; Aburto and others, 2019). It lies at {here} and {there} on the"
        " two sides; {age} is the nearest beginning of an age group.",
        here=number(here, 1),
        there=number(there, 1),
        age=age,
    )
