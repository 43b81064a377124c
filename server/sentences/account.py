"""Why a figure reads differently now than it did."""

from collections.abc import Sequence

from server.sentences import names
from server.sentences.numbers import number
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _, n_


def part(key: str) -> str:
    """What moved a figure."""
    return {
        "deaths": _("deaths"),
        "population": _("population"),
        "births": _("births"),
        "reading": _("reading of the same files"),
        "areas": _("make-up of the area"),
        "settings": _("settings"),
        "engine": _("engine or rounding"),
    }[key]


def meaning(key: str) -> str:
    """What is counted under a part."""
    return {
        "deaths": _("other numbers of deaths were handed in"),
        "population": _("other numbers of people or person-years were handed in"),
        "births": _("other numbers of births were handed in"),
        "reading": _("the same bytes were read in another way"),
        "areas": _("the area is made up of other codes, or part of another area"),
        "settings": _("other choices turn counts into the figure"),
        "engine": _("what was printed then and what the same counts give today"),
    }[key]


def answer(
    label: str, who: str, amount: float, decimals: int, unit: str, parts: Sequence[str]
) -> Sentence:
    """How far the figure moved and what moved it most, the largest first."""
    if not parts:
        return phrase(
            _("{label} of {who} reads the same: nothing it rests on is another."),
            label=label,
            who=who,
        )
    moved = f"{number(abs(amount), decimals)}\N{NO-BREAK SPACE}{unit}"
    text = (
        _("{label} of {who} is {amount} higher than it was: {parts}.")
        if amount > 0
        else _("{label} of {who} is {amount} lower than it was: {parts}.")
    )
    if number(abs(amount), decimals) == number(0, decimals):
        text = _("{label} of {who} reads the same to {amount}, though it was moved: {parts}.")
        moved = f"{number(10**-decimals, decimals)}\N{NO-BREAK SPACE}{unit}"
    return phrase(text, label=label, who=who, amount=moved, parts="; ".join(parts))


def share(key: str, amount: float, decimals: int) -> str:
    """One part and what it moved."""
    return _("{part} {amount}", part=part(key), amount=number(amount, decimals, signed=True))


def unknown(label: str, who: str, *, then: bool) -> Sentence:
    """One side has no such figure."""
    text = (
        _("{label} of {who} cannot be given by the earlier edition, so there is nothing to part.")
        if then
        else _("{label} of {who} cannot be given now, so there is nothing to part.")
    )
    return phrase(text, label=label, who=who)


def whole_only(label: str, who: str, amount: float, decimals: int, unit: str) -> Sentence:
    """No order of replacing part after part can be followed."""
    return phrase(
        _(
            "{label} of {who} moved by {amount}; it cannot be parted, since no figure can be given "
            "between the two."
        ),
        label=label,
        who=who,
        amount=f"{number(amount, decimals, signed=True)}\N{NO-BREAK SPACE}{unit}",
    )


def how(parts: int, orders: int, all_: int) -> Sentence:
    """How the parts were told apart."""
    if parts < 2:
        return phrase(_("One thing differs, so all of the difference is owed to it."))
    if orders < all_:
        return phrase(
            _(
                "Each part is replaced after the other, from then to now, in each of the {orders} "
                "orders (of {all}) in which a figure can be given at every step; a part is the "
                "mean of what it moved. The parts add up exactly."
            ),
            orders=str(orders),
            all=str(all_),
        )
    text = (
        _(
            "Each part is replaced after the other, from then to now, in both directions; a part "
            "is the mean of what it moved. The parts add up exactly."
        )
        if parts == 2
        else _(
            "Each part is replaced after the other, from then to now, in all {orders} orders; a "
            "part is the mean of what it moved (Shapley 1953). The parts add up exactly."
        )
    )
    return phrase(text, orders=str(orders))


def engine() -> Sentence:
    return phrase(
        _(
            "Older engines cannot be run. What the printed number differs from today’s figure of "
            "the same counts and settings is put down to the engine or to rounding."
        )
    )


def left_out(keys: Sequence[str]) -> Sentence:
    """What cannot have moved it."""
    if not keys:
        return ()
    return phrase(
        n_(
            "The same on both sides, and so left out: {parts}.",
            "The same on both sides, and so left out: {parts}.",
            len(keys),
            parts=names.listed([part(one) for one in keys]),
        )
    )
