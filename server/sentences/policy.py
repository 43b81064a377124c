"""A collection's policy in words."""

from typing import Protocol

from server.sentences.numbers import whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_


class Terms(Protocol):
    """What a policy withholds, or rounds."""

    @property
    def threshold(self) -> int: ...
    @property
    def persons(self) -> int: ...
    @property
    def zeros(self) -> str: ...
    @property
    def coarse_below(self) -> int: ...
    @property
    def base(self) -> int: ...
    @property
    def causes(self) -> str: ...


class Kept(Protocol):
    """How many counts of an edition are withheld, and how many rounded."""

    @property
    def cells(self) -> int: ...
    @property
    def rounded(self) -> int: ...


def answer(collection: str, of: Terms | None, newest: Kept) -> Sentence:
    """Of the newest edition."""
    if of is None:
        return phrase(
            _("{collection} has no policy: every count is shown, however small."),
            collection=collection,
        )
    if of.base:
        return phrase(
            _("{collection} rounds {terms}: {counts} in the newest edition."),
            collection=collection,
            terms=terms(of),
            counts=_changed(of, newest),
        )
    return phrase(
        _("{collection} withholds {terms}: {counts} in the newest edition."),
        collection=collection,
        terms=terms(of),
        counts=_changed(of, newest),
    )


def trial(of: Terms, newest: Kept) -> Sentence:
    if of.base:
        return phrase(
            _("Rounding {terms} would change {counts} of the newest edition. Nothing is set yet."),
            terms=terms(of),
            counts=_changed(of, newest),
        )
    return phrase(
        _("Withholding {terms} would take {counts} of the newest edition. Nothing is set yet."),
        terms=terms(of),
        counts=_changed(of, newest),
    )


def terms(of: Terms) -> str:
    """What is withheld or rounded, to stand inside a sentence."""
    told = [
        _("all deaths and births to multiples of {base}", base=of.base)
        if of.base
        else _("deaths from 0 to {most}", most=of.threshold - 1)
        if of.zeros == "withheld"
        else _("deaths from 1 to {most}", most=of.threshold - 1)
    ]
    if of.persons:
        told.append(_("deaths among fewer than {least} people", least=whole(of.persons)))
    if of.coarse_below:
        told.append(
            _(
                "single ages of areas below {people} people, and of all beside them",
                people=whole(of.coarse_below),
            )
        )
    if of.causes == "none" and not of.base:
        told.append(_("all deaths by cause"))
    return "; ".join(told)


def _changed(of: Terms, newest: Kept) -> str:
    """What these terms do, apart from what years are left as they were first shown."""
    return _counts(newest.rounded if of.base else newest.cells)


def stays(of: Terms, newest: Kept) -> Sentence:
    """What these terms leave as it was, if anything."""
    if of.base and newest.cells:
        return phrase(
            _("{counts} stay withheld: a year keeps the way it was first shown in."),
            counts=_counts(newest.cells),
        )
    if newest.rounded and not of.base:
        return phrase(
            _("{counts} stay rounded: a year keeps the way it was first shown in."),
            counts=_counts(newest.rounded),
        )
    return ()


def for_good(of: Terms) -> Sentence:
    """What rounding takes for good, said before it is set."""
    if not of.base:
        return ()
    return phrase(
        "{word} {text}",
        word=Piece(_("For good."), emphasis="rubric"),
        text=_(
            "A year shown with rounded counts stays so under every later policy. Where counts are"
            " rounded none are shown by cause of death."
        ),
    )


def _counts(count: int) -> str:
    return n_("one count", "{count} counts", count, count=whole(count))


def lead(note: str, exposed: int) -> tuple[Sentence, ...]:
    """Why the policy, and how many small counts it could not protect."""
    said = [phrase(_("Why: {note}"), note=note)] if note else []
    if exposed:
        said.append(
            phrase(
                "{word} {text}",
                word=Piece(_("Look at this."), emphasis="rubric"),
                text=n_(
                    "One small count of the newest edition may be worked out all the same, since"
                    " earlier editions show all that could have protected it.",
                    "{count} small counts of the newest edition may be worked out all the same,"
                    " since earlier editions show all that could have protected them.",
                    exposed,
                ),
            )
        )
    return tuple(said)


def how() -> tuple[Sentence, ...]:
    return tuple(
        phrase(text)
        for text in (
            _(
                "Where counts are withheld: those that add up to a sum that is shown"
                " protect one another. With a small count others of the same age and area are"
                " withheld, until no withheld one can be worked out, nor be told apart from other"
                " small ones, from all that this edition and those before it show."
            ),
            _(
                "Where counts are rounded: each count of women or of men, in an area without parts,"
                " at one age, is given as a multiple of the base below or above it, by a draw that"
                " adds and takes nothing on average and is kept secret. The same count is rounded"
                " in the same way in every edition. All sums are sums of rounded counts, so that"
                " none can be used to work another out; those of many counts may be off by more"
                " than the base. Person-years are not rounded."
            ),
            _(
                "A year keeps the way, withheld or rounded and to which base, that it was first"
                " shown in, since each would tell what the other hides."
            ),
            _(
                "Deaths by cause are shown, where they are, of areas that are part of none, and"
                " protected as counts of areas are. At an age where all deaths are withheld, so is"
                " every cause. Where counts are rounded there are none by cause."
            ),
            _(
                "What one edition withholds stays withheld in those after it; a number that changed"
                " is protected anew."
            ),
            _(
                "Figures that rest on a withheld count are worked out with an estimate in its"
                " place, made of what is shown and of nothing else, so they may be a little off;"
                " like those of rounded counts they are given to fixed decimals. No death rate,"
                " chance of dying or limit of a withheld count is given."
            ),
            _(
                "Addresses with figures=full show everything, for work inside the office. What was"
                " shown before a policy was set cannot be called back."
            ),
        )
    )


def about_setting() -> str:
    return _(
        "A policy is set for the whole collection, and every edition gets its mask anew. Pages may"
        " show less from then on; their addresses stay."
    )


def about_effects(*, narrow: bool) -> str:
    """`narrow`: counts that are told apart from others are among what is counted."""
    said = _("Counts by area, sex, year and age.")
    also = _(
        "Those told apart from some small counts are not known, but fewer numbers than the policy"
        " asks for are left that they might be."
    )
    return f"{said} {also}" if narrow else said


def about_marks() -> str:
    return _(
        "Codes of the SDMX list of observation status (CL_OBS_STATUS). Withheld counts also have"
        " conf_status C (CL_CONF_STATUS). The list has no code for a revised number: files have a"
        " column revised. Of several that are true the first of B, E, P is given."
    )


def gaps() -> dict[str, tuple[str, str]]:
    """Each kind of gap: how it looks, and what it means."""
    return {
        "withheld": (
            _("withheld (a blot)"),
            _("There is a number, and it is not shown, to protect people."),
        ),
        "nil": (_("nil (a dash)"), _("Nobody was counted.")),
        "not available": (_("not available (three dots)"), _("No number was delivered.")),
        "undefined": (
            _("undefined (a cross)"),
            _("No number can be made of what is there; the reason stands beside."),
        ),
    }


def states() -> tuple[tuple[str, str, str], ...]:
    return (
        (_("a number"), "A", _("As counted, or worked out from final counts.")),
        (_("a number with p"), "P", _("Provisional: late reports may still move it.")),
        (
            _("a number"),
            "E",
            _(
                "It rests on estimates: of withheld counts, rounded ones, split areas, or counts"
                " made from rates."
            ),
        ),
        (_("a number"), "B", _("The first year after a break in the series.")),
    )
