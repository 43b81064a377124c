"""What is said of the ages that a difference is made of, and the findings of those pictures."""

import math

from engine.indicators import Indicator
from server.sentences import names
from server.sentences.comparison import Answer
from server.sentences.movements import shown, years
from server.sentences.numbers import number, whole
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _


def carried(ages: str, part: float, difference: float, *, named: bool) -> Sentence:
    """Which ages hold most of a difference in life expectancy; nothing where others work so much
    against it that their part is more than the whole. `named`: the answer was on something else."""
    if abs(part) > abs(difference):
        return ()
    text = (
        _("Ages {ages} carry {part} of the {whole} by which life expectancy differs.")
        if named
        else _("Ages {ages} carry {part} of the {whole}.")
    )
    return phrase(text, ages=ages, part=number(abs(part), 1), whole=years(difference, 1))


def survivors(of: Answer, share: float, from_age: int) -> str:
    """`of` is life expectancy; `share` of its difference lies at `from_age` and above."""
    if not of.clear:
        return _("Survivors to each age on the two sides")
    amount = years(float(of.difference.value))
    if not 0 < share < 1:
        return _("The hatched space is the difference: {amount}", amount=amount)
    return _(
        "The hatched space is the difference: {amount}, {share} of it lived past {age}",
        amount=amount,
        share=f"{whole(100 * share)}\N{NO-BREAK SPACE}%",
        age=from_age,
    )


def by_age(of: Answer, ages: str, part: float) -> str:
    """What the picture of contributions to life expectancy shows; `ages` hold `part` of it."""
    if not of.clear or abs(part) > abs(float(of.difference.value)):
        return _("What each age adds to the difference in life expectancy")
    return _(
        "Ages {ages} make most of the difference: {part} of {whole}",
        ages=ages,
        part=number(abs(part), 1),
        whole=years(float(of.difference.value)),
    )


def of_asked(of: Answer, ages: str, part: float) -> str:
    """The same for any other indicator."""
    label = names.inside(_(names.brief(of.indicator.label)))
    if not of.clear or abs(part) > abs(float(of.difference.value)):
        return _("What each age adds to the difference in {label}", label=label)
    unit = of.indicator.unit
    return _(
        "Ages {ages} make most of the difference in {label}: {part} of {whole}",
        ages=ages,
        label=label,
        part=number(unit.scale * part, unit.decimals, signed=True),
        whole=shown(of.difference, unit, signed=True),
    )


def unevenness(of: Answer, below: float, above: float, age: int) -> str:
    """Contributions to H, which `of` is, summed below and above an age, in thousandths. Only of a
    clear difference is it said which way the ages turn it, the stronger ones first."""
    parts = {
        "age": age,
        "below": number(below, 1, signed=True),
        "above": number(above, 1, signed=True),
    }
    if not (of.clear and below * above < 0):
        return _(
            "Ages below {age} move relative unevenness by {below} thousandths, those above by"
            " {above}",
            **parts,
        )
    texts = {
        (True, True): _(
            "Ages below {age} make length of life less even ({below} thousandths of H); those"
            " above work against it ({above})",
            **parts,
        ),
        (True, False): _(
            "Ages below {age} make length of life more even ({below} thousandths of H); those"
            " above work against it ({above})",
            **parts,
        ),
        (False, True): _(
            "Ages from {age} on make length of life less even ({above} thousandths of H); those"
            " below work against it ({below})",
            **parts,
        ),
        (False, False): _(
            "Ages from {age} on make length of life more even ({above} thousandths of H); those"
            " below work against it ({below})",
            **parts,
        ),
    }
    return texts[abs(below) >= abs(above), below + above > 0]


def not_parted(why: str) -> Sentence:
    """In place of the picture of contributions to H."""
    return phrase(
        _("For unevenness (H) the ages’ parts cannot be given. {why}"),
        why=why,
    )


def not_shared_out(one: Indicator, why: str) -> Sentence:
    """In place of the picture of contributions to an indicator that has none."""
    return phrase(
        _("The difference in {label} is not shared out over ages. {why}"),
        label=names.inside(_(one.label)),
        why=why,
    )


def remainder(one: Indicator, value: float, difference: float) -> str:
    """Why a row of its own stands beside the ages; empty where rounding is all there is."""
    if not math.isfinite(value) or abs(value) <= 1e-9 * max(abs(difference), 1e-9):
        return ""
    if one.unit.limits == "gamma":  # its weights are people, in the open group of a standard too
        return _("no death rate: older or younger people")
    return _("no death rate: rule of the first year, or a law’s weights")


def arithmetic() -> tuple[str, str]:
    return _("Contributions"), _(
        "A contribution is owed to an age in the arithmetic sense: it names no cause. Its interval"
        " covers chance in deaths only."
    )
