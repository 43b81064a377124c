"""What is said of the causes of death that a difference is made of: those few that carry it."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.sentences import names
from server.sentences.comparison import Answer
from server.sentences.numbers import number
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _

MOST = 3  # causes named


@dataclass(frozen=True, slots=True)
class Carrier:
    """A cause, in the printed unit."""

    label: str
    value: float
    clear: bool  # its interval leaves out 0, or there is none to heed
    ages: str = ""  # the fewest ages that hold at least half of it
    held: float = 0.0  # what they hold


def carried(of: Answer, causes: Sequence[Carrier], rest: float, decimals: int) -> Sentence:
    """“Of the 2.01 years 1.42 are external causes, 0.98 of it at 25 to 44”: the causes of a clear
    difference that work its way and are clear themselves, and what all others make. Amounts are
    told in the direction of the difference, and to the decimals of the table."""
    if not of.clear or not causes:
        return ()
    unit = of.indicator.unit
    whole = unit.scale * float(of.difference.value)
    way = -1.0 if whole < 0 else 1.0

    def amount(value: float) -> str:
        return number(way * value, decimals)

    parts = [
        _(
            "{part} {cause} ({held} of it at {ages})",
            part=amount(one.value),
            cause=names.inside(one.label),
            held=amount(one.held),
            ages=one.ages,
        )
        if one.ages
        else _("{part} {cause}", part=amount(one.value), cause=names.inside(one.label))
        for one in causes
    ]
    return phrase(
        _("By cause, of the {whole}: {parts}; all other causes together {rest}."),
        whole=amount(whole)
        if unit.label == "ratio"
        else f"{amount(whole)}\N{NO-BREAK SPACE}{_(unit.label)}",
        parts=names.listed(parts),
        rest=amount(rest),
    )


def ranked(of: Answer, largest: Carrier | None) -> str:
    """Finding of the bars: the cause that adds most, where it is clear."""
    label = names.inside(_(names.brief(of.indicator.label)))
    if largest is None:
        return _("What each cause of death adds to the difference in {label}", label=label)
    return _(
        "The largest part of the difference in {label}: {cause}",
        cause=names.inside(largest.label),
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


def recoded(year: str, causes: Sequence[str], *, applied: bool) -> tuple[str, str]:
    """That the coding of some causes changed between the two years."""
    parts = {"year": year, "causes": names.listed([names.inside(one) for one in causes], most=6)}
    if applied:
        return _("Coding"), _(
            "The coding of causes changed in {year} ({causes}). Deaths of earlier years are brought"
            " to the newer coding by comparability ratios.",
            **parts,
        )
    return _("Coding"), _(
        "The coding of causes changed in {year} ({causes}): what these causes add holds the change"
        " of coding too. Applying the comparability ratios takes it out where there are such.",
        **parts,
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
