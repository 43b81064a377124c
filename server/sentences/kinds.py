"""What kinds of change a difference is made of, and how small a one could have been seen."""

import math

from engine.detectable import pooled_years, smallest_change
from engine.estimates import Estimate
from engine.indicators import INDICATORS, Indicator, Unit
from engine.settings import Settings
from engine.shift import ShiftSqueeze
from server.sentences.movements import Movement, movement, with_unit, years
from server.sentences.numbers import number, whole
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _

YEARS = INDICATORS["e0"].unit
NO_POOL = 30  # years beyond which adding up is no advice


def parts(kinds: ShiftSqueeze) -> tuple[tuple[str, str, Estimate], ...]:
    """Each part of the difference: its key, what it is in words, its size in years."""
    return (
        ("shift", _("deaths of old age coming later or earlier (shift)"), kinds.shift),
        (
            "squeeze",
            _("deaths of old age closer together or farther apart (squeeze)"),
            kinds.squeeze,
        ),
        ("background", _("deaths that come at all ages alike"), kinds.background),
        ("infant", _("deaths in the first year"), kinds.infant),
        ("unexplained", _("what the fitted laws miss"), kinds.unexplained),
    )


def told(kinds: ShiftSqueeze) -> Sentence:
    """Which part is largest, where chance leaves it clear; nothing where no law fits."""
    if not math.isfinite(float(kinds.shift.value)):
        return ()
    known = [one for one in parts(kinds) if math.isfinite(float(one[2].value))]
    key, words, part = max(known, key=lambda one: abs(float(one[2].value)))
    clear = key != "unexplained" and movement(part, YEARS) in (Movement.MORE, Movement.LESS)
    text = (
        _(
            "By laws fitted to both sides the largest part of the difference in life expectancy"
            " comes from {most}."
        )
        if clear
        else _(
            "By laws fitted to both sides no kind of change stands out in the difference in life"
            " expectancy."
        )
    )
    amount = _("{words}: {amount}", words=words, amount=_signed(float(part.value)))
    return phrase(text, most=amount)


def _signed(value: float) -> str:
    text = number(value, YEARS.decimals, signed=True)
    return f"{text}\N{NO-BREAK SPACE}{_('years')}"


def unevenness(lost: float, lived: float) -> Sentence:
    """How a difference in H comes about: through years lost per death, through length of life."""
    return phrase(
        _(
            "Of the difference in relative unevenness {lost} thousandths come about because deaths"
            " cost more or fewer years, {lived} because life is longer or shorter: H is the one"
            " divided by the other."
        ),
        lost=number(1_000 * lost, 1, signed=True),
        lived=number(1_000 * lived, 1, signed=True),
    )


def crude(ages: float, rates: float) -> Sentence:
    """What a difference of crude rates owes to the ages of the people and to their rates."""
    unit = INDICATORS["cdr"].unit
    return phrase(
        _(
            "Crude death rate: of the difference {ages} {unit} are owed to older or younger people,"
            " {rates} to their death rates (Kitagawa, 1955)."
        ),
        ages=number(unit.scale * ages, unit.decimals, signed=True),
        rates=number(unit.scale * rates, unit.decimals, signed=True),
        unit=_(unit.label),
    )


def could_be_seen(indicator: Indicator, change: Estimate, settings: Settings) -> Sentence:
    """Beside “no clear change”: how large one had to be, and how many years would show this one."""
    se, unit = float(change.se), indicator.unit
    if not math.isfinite(se) or movement(change, unit) is not Movement.NOT_CLEAR:
        return ()
    size = _size(unit.scale * float(smallest_change(change.se, settings.level)), unit)
    first = _("A difference of {size} would have been seen four times out of five.", size=size)
    needed = float(pooled_years(change.value, change.se, settings.level)) * settings.years
    if not needed <= NO_POOL:
        return phrase(
            _(
                "{first} One as small as the one found would not be seen even with {most}"
                " years added up on each side."
            ),
            first=first,
            most=whole(NO_POOL),
        )
    return phrase(
        _(
            "{first} One as large as the one found would be seen as often with {needed} years added"
            " up on each side."
        ),
        first=first,
        needed=whole(needed),
    )


def _size(least: float, unit: Unit) -> str:
    """The smallest change that could have been seen; one that would print as 0 by a bound."""
    bound = 10.0**-unit.decimals
    text = number(max(least, bound), unit.decimals)
    size = years(max(least, bound), unit.decimals) if unit.key == "years" else with_unit(text, unit)
    return (
        size
        if number(least, unit.decimals) != number(0, unit.decimals)
        else _("less than {bound}", bound=size)
    )
