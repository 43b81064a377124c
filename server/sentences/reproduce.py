"""What is said of figures that were printed before."""

from collections.abc import Mapping, Sequence

from server.sentences import names
from server.sentences.numbers import whole
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _, n_

EXPLAINED = ("revised", "elsewhere", "cut", "withheld")


def kind(key: str) -> str:
    """What a printed figure turned out to be."""
    return {
        "matched": _("matched"),
        "revised": _("revised since"),
        "elsewhere": _("matched elsewhere"),
        "cut": _("cut off, not rounded"),
        "withheld": _("no number"),
        "astray": _("not found"),
        "unknown": _("not known"),
    }[key]


def answer(name: str, counts: Mapping[str, int]) -> Sentence:
    """How many of the printed figures are matched, explained, or neither."""
    all_ = sum(counts.values())
    matched = counts.get("matched", 0)
    explained = sum(counts.get(key, 0) for key in EXPLAINED)
    astray, unknown = counts.get("astray", 0), counts.get("unknown", 0)
    if not all_:
        return phrase(_("{name} holds no figure that could be looked up."), name=name)
    if matched == all_:
        return phrase(
            n_(
                "The one figure of {name} is matched.",
                "All {count} figures of {name} are matched.",
                all_,
                count=whole(all_),
                name="{name}",
            ),
            name=name,
        )
    parts = [
        n_("one is matched", "{count} are matched", matched, count=whole(matched))
        if matched
        else _("none is matched")
    ]
    if explained:
        parts.append(n_("one is explained", "{count} are explained", explained))
    if astray:
        parts.append(n_("one is not found", "{count} are not found", astray))
    if unknown:
        parts.append(n_("one row is not known", "{count} rows are not known", unknown))
    return phrase(
        _("Of {count} figures of {name} {parts}."),
        count=whole(all_),
        name=name,
        parts=names.listed(parts),
    )


def others(alike: int, all_: int) -> Sentence:
    """Cells beside the main figures: limits, counts, columns of the life table."""
    if not all_:
        return ()
    if alike == all_:
        return phrase(
            n_(
                "The one other number of the file is what its address gives today.",
                "All {count} other numbers of the file are what its address gives today.",
                all_,
                count=whole(all_),
            )
        )
    return phrase(
        _(
            "Of the {count} other numbers of the file {alike} are what its address gives today; "
            "the rest stand below."
        ),
        count=whole(all_),
        alike=whole(alike),
    )


def why(
    key: str, *, edition: int, newest: int, settings: str, parts: Sequence[str], row: str = ""
) -> str:
    """Why a figure is what it is, for a table."""
    if key == "matched":
        return _("edition {edition} under {settings}", edition=edition, settings=settings)
    if key == "revised":
        text = _(
            "as edition {edition} has it; edition {newest} differs", edition=edition, newest=newest
        )
        return f"{text}: {'; '.join(parts)}" if parts else text
    if key == "elsewhere":
        return _(
            "it equals that of edition {edition} under {settings}",
            edition=edition,
            settings=settings,
        )
    if key == "cut":
        return _("edition {edition} with its last digits cut off", edition=edition)
    if key == "withheld":
        return _("not printed, or it cannot be given today: withheld, undefined or not held")
    if key == "unknown":
        return row
    text = _("no edition and no settings give it")
    return f"{text}: {'; '.join(parts)}" if parts else text


def unreadable(what: str, text: str) -> str:
    """Which part of a row is not known here."""
    named = {
        "area": _("area"),
        "sex": _("sex"),
        "year": _("year"),
        "indicator": _("indicator"),
        "value": _("number"),
        "edition": _("edition"),
        "settings": _("settings"),
    }[what]
    return _("its {part} “{text}” is not known", part=named, text=text)
