"""How deaths by cause are counted and what they cannot tell, on pages of causes."""

from collections.abc import Mapping, Sequence

from server.sentences import names
from server.sentences.basis import Told
from server.sentences.numbers import NO_BREAK, number
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


def computed(
    choice: Sequence[tuple[str, str]], ratios: Sequence[tuple[str, str, float]]
) -> tuple[Sentence, ...]:
    """How deaths were counted under their causes, and how figures come of them."""
    said = {
        ("ill_defined", "kept"): _(
            "Deaths of ill-defined cause (R00-R94, R96-R99) are a cause of their own."
        ),
        ("ill_defined", "spread"): _(
            "Deaths of ill-defined cause (R00-R94, R96-R99) are spread over natural causes, within"
            " age and sex, as those are; in provisional years R99 stays, since a cause may still"
            " come. Chance is in the deaths as they were counted."
        ),
        ("undetermined", "kept"): _(
            "Deaths of undetermined intent (Y10-Y34) are a cause of their own."
        ),
        ("undetermined", "spread"): _(
            "Deaths of undetermined intent (Y10-Y34) are spread over the other external causes,"
            " within age and sex, as those are."
        ),
        ("ratios", "kept"): _("Earlier codings are left as they were counted."),
        ("ratios", "applied"): _(
            "Earlier codings are brought to the later ones by their comparability ratios, whose"
            " standard errors widen the intervals; all deaths at an age stay the same."
        ),
    }
    chosen = [said[pair] for pair in choice if pair in said]
    return (
        _named(_("Causes"), " ".join(chosen)),
        _named(_("Parted deaths"), parted()),
        *(
            _named(
                _("Ratio"),
                _(
                    "{cause}, before {year}: {ratio}.",
                    cause=cause,
                    year=year,
                    ratio=number(ratio, 3),
                ),
            )
            for cause, year, ratio in ratios
        ),
    )


def parted() -> str:
    """How the deaths of a life table are shared among causes."""
    return _(
        "At each age the deaths of the life table have the causes of the deaths counted there."
        " Where its rates are others than those counted (smoothed ones, a law of old ages, a"
        " borrowed rate), their causes still are; above the open age, those of the open group;"
        " where nobody died, those of all deaths together."
    )


def method(name: str, definition: str, source: str) -> Sentence:
    """A number by cause, as its entry states it."""
    return phrase(
        "{name}. {definition} {source}",
        name=Piece(_(name), emphasis="strong"),
        definition=_(definition),
        source=_(source),
    )


def _named(word: str, text: str) -> Sentence:
    return phrase("{word}. {text}", word=Piece(word, emphasis="strong"), text=text)


def unclear(of_kind: Mapping[str, float], deaths: float, *, provisional: bool) -> Told:
    """How many deaths say little of what people died of; in a `provisional` year some of them will
    still be given a cause."""
    said = {
        "ill_defined": _("are of ill-defined cause"),
        "pending": _("still wait for a cause") if provisional else _("are of unknown cause"),
        "undetermined": _("are of undetermined intent"),
        "not_underlying": _("have codes that are no underlying cause"),
        "not-stated": _("have no stated cause"),
    }
    found = [
        _("{share} {what}", share=_share(of_kind[kind], deaths), what=text)
        for kind, text in said.items()
        if of_kind.get(kind, 0.0) > 0
    ]
    if not found or not deaths:
        return None
    return _("Unclear causes"), _(
        "Of the deaths as delivered {parts}. Where that share changes, other causes seem to rise or"
        " fall.",
        parts=names.listed(found),
    )


def _share(part: float, whole_of: float) -> str:
    percent = 100 * part / whole_of
    return f"{number(percent, 1) if percent >= 0.05 else _('less than 0.1')}{NO_BREAK}%"


def certified() -> Told:
    """What a cause of death is."""
    return _("One cause a death"), _(
        "A death counts under the one cause that its certificate was coded to as underlying, though"
        " often several were at work; how causes are certified and coded differs between places"
        " and years."
    )


def no_forecast() -> Told:
    """What a gain without a cause is not."""
    return _("Without a cause"), _(
        "What life expectancy would be without a cause takes causes as having nothing to do with"
        " one another, which they have. It is arithmetic, no forecast, and says nothing of what can"
        " be done."
    )
