"""What is said of the causes of death that a difference is made of: those few that carry it."""

from collections.abc import Sequence
from dataclasses import dataclass

from engine.indicators import Indicator
from server.sentences import names
from server.sentences.comparison import Answer
from server.sentences.numbers import number
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _

MOST = 3  # causes named


@dataclass(frozen=True, slots=True)
class Carrier:
    """A cause, or the causes not named, as printed."""

    label: str
    value: float
    clear: bool  # its interval leaves out 0, or there is none to heed
    ages: str = ""  # the fewest ages that hold at least half of it


def carried(of: Answer, causes: Sequence[Carrier], rest: float, decimals: int) -> Sentence:
    """“Of the 1.83 years 0.91 are ... (most of it at 30 to 59)”: the causes of a clear difference
    that work its way and are clear themselves, and what all others make."""
    if not of.clear or not causes:
        return ()
    unit = of.indicator.unit
    parts = [
        _("{part} {cause} (most of it at {ages})", part=_amount(one.value, decimals), **_said(one))
        if one.ages
        else _("{part} {cause}", part=_amount(one.value, decimals), **_said(one))
        for one in causes
    ]
    whole = unit.scale * float(of.difference.value)
    return phrase(
        _("Of the {whole} {parts}; all other causes together make {rest}."),
        whole=_whole(of.indicator, whole, decimals),
        parts=names.listed(parts),
        rest=number(rest, decimals, signed=True),
    )


def _said(one: Carrier) -> dict[str, str]:
    return {"cause": names.inside(one.label), "ages": one.ages}


def _amount(value: float, decimals: int) -> str:
    return number(value, decimals, signed=True)


def _whole(one: Indicator, value: float, decimals: int) -> str:
    text = number(value, decimals, signed=True)
    return text if one.unit.label == "ratio" else f"{text}\N{NO-BREAK SPACE}{_(one.unit.label)}"


def ranked(of: Answer, largest: Carrier | None) -> str:
    """Finding of the bars: the cause that adds most, where it is clear."""
    label = names.inside(_(names.brief(of.indicator.label)))
    if largest is None:
        return _("What each cause of death adds to the difference in {label}", label=label)
    return _(
        "{cause} adds most to the difference in {label}",
        cause=names.first_capital(largest.label),
        label=label,
    )


def cells(of: Answer, cause: str, ages: str, value: str) -> str:
    """Finding of the picture of ages and causes: its largest cell, where it is clear."""
    label = names.inside(_(names.brief(of.indicator.label)))
    if not cause:
        return _("What each cause adds at each age to the difference in {label}", label=label)
    return _(
        "The largest single part is {cause} at {ages}: {value}",
        cause=names.inside(cause),
        ages=ages,
        value=value,
    )


def kept() -> tuple[str, str]:
    """What a contribution of a cause is, and is not."""
    return _("Causes"), _(
        "A contribution of a cause is what its death rates differ by, counted in the figure, while"
        " all others change as they did. It does not say why they differ, nor what would happen"
        " without the cause."
    )


def differ() -> tuple[str, str]:
    return _("Causes"), _(
        "The two sides are not compared by cause: one of them has no deaths by cause, or a cause"
        " stands for other codes of the classification there."
    )


def treated(*, spread: bool, undetermined: bool, applied: int) -> Sentence:
    """What was done to the deaths by cause before they were compared."""
    said: list[str] = []
    if spread:
        said.append(
            _(
                "Ill-defined deaths are spread over natural causes within age and sex, in"
                " proportion; those of provisional years wait for a cause and are kept apart."
            )
        )
    if undetermined:
        said.append(
            _("Deaths of undetermined intent are spread over external causes within age and sex.")
        )
    if applied:
        said.append(
            _(
                "Earlier years are brought to the coding of later ones by comparability ratios,"
                " whose standard error is part of the intervals."
            )
        )
    return phrase(
        "{name} {text}",
        name=Piece(_("Causes of death."), emphasis="strong"),
        text=" ".join(said)
        or _("Deaths are compared under the causes they were delivered with, nothing moved."),
    )
