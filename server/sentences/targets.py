"""Which change of death rates brings a figure to a target, in words."""

import math

from engine.indicators import Indicator
from engine.whatif_reach import Reach
from server.sentences import names
from server.sentences.movements import bracketed, value
from server.sentences.numbers import NO_BREAK, interval, number
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


def reach(one: Indicator, target: str, where: str, of: Reach) -> Sentence:
    """Which change, the same at all of them, brings the figure to the target."""
    label = names.inside(_(names.brief(one.label)))
    aimed = value(float(target) / one.unit.scale, one.unit)
    parts = {"label": label, "target": aimed, "where": where}
    factor = float(of.factor)
    if not math.isfinite(factor):
        return _out_of_reach(one, of, parts)
    percent = 100 * (1 - factor)
    if round(percent, 1) == 0:
        return phrase(
            _("{label} is at {target} already: nothing {where} need change."),
            **(parts | {"label": names.first_capital(label)}),
        )
    size = f"{number(abs(percent), 1)}{NO_BREAK}%"
    ends = sorted(100 * (1 - float(end)) * (1 if percent > 0 else -1) for end in (of.low, of.high))
    known = all(math.isfinite(end) for end in ends)
    text = (
        _("To bring {label} to {target}, {where} would have to be {size} lower {interval}.")
        if percent > 0
        else _("To bring {label} to {target}, {where} would have to be {size} higher {interval}.")
    )
    limit = interval(ends[0], ends[1], 1) if known else _("chance not known")
    said = phrase(text, **parts, size=size, interval=bracketed(limit))
    if known and ends[0] <= 0 <= ends[1]:
        said += phrase(
            " {sentence}",
            sentence=_(
                "The interval holds 0: chance alone leaves the figure as far from its target as it"
                " is."
            ),
        )
    return said


def _out_of_reach(one: Indicator, of: Reach, parts: dict[str, str]) -> Sentence:
    none = phrase(
        _(
            "{label} of {target} is out of reach: {where}, all changed alike between nil and twice"
            " what they were, do not bring it there."
        ),
        **(parts | {"label": names.first_capital(parts["label"])}),
    )
    without = float(of.without)
    if not math.isfinite(without):
        return none
    return none + phrase(
        " {sentence}",
        sentence=_(
            "With next to none of those deaths it would be {without}.",
            without=value(without, one.unit),
        ),
    )


def no_reach(why: str) -> Sentence:
    return phrase(_("No change can be named that meets the target. {why}"), why=why)


def computed_target() -> Sentence:
    return phrase(
        "{name} {sentence}",
        name=Piece(_("Target."), emphasis="strong"),
        sentence=_(
            "The table is made anew with the chosen rates multiplied by one factor, from nil to"
            " twice what they were, until the figure is the target; of several such factors the"
            " one nearest to no change is taken. Its interval is what chance in the deaths leaves"
            " of it."
        ),
    )
