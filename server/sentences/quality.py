"""What is said of how good the counts of an edition are."""

from collections.abc import Sequence

from server.sentences.numbers import number, whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_

Pairs = tuple[tuple[str, str], ...]


def answer(name: str, edition: int, complete: int, places: int, findings: int) -> Sentence:
    """The whole page in one line."""
    if not places:
        return phrase(
            _("{collection}, edition {number}, holds nothing to judge."),
            collection=name,
            number=str(edition),
        )
    return phrase(
        _("{collection}, edition {number}: {cells}; {found}."),
        collection=name,
        number=str(edition),
        cells=_complete(complete, places),
        found=_found(findings),
    )


def _complete(complete: int, places: int) -> str:
    if complete == places:
        return n_(
            "the one area and year is complete",
            "all {count} areas and years are complete",
            places,
            count=whole(places),
        )
    return _(
        "{complete} of {places} areas and years are complete",
        complete=whole(complete),
        places=whole(places),
    )


def _found(findings: int) -> str:
    if not findings:
        return _("the checks find nothing in them that wants a second look")
    return n_(
        "the checks find one thing that wants a second look",
        "the checks find {count} things that want a second look",
        findings,
        count=whole(findings),
    )


def provisional(years: Sequence[str]) -> Sentence:
    """Which years may still change; empty where none is."""
    if not years:
        return ()
    if len(years) == 1:
        return phrase(_("{year} is provisional and may change."), year=years[0])
    text = _("{count} years are provisional and may change, the first of them {first}.")
    return phrase(text, count=str(len(years)), first=years[0])


def registered(share: float, area: str) -> Sentence:
    """How complete registration is by the general growth balance; empty where it is not known."""
    if share != share:
        return ()
    return phrase(
        _(
            "Set against the ageing of the population, about {share} of 100 deaths from age 30 on "
            "were registered in {area} over the last years; with people moving in or out this is "
            "rough."
        ),
        share=number(share, 0),
        area=area,
    )


def questions() -> dict[str, str]:
    """What a statement of quality answers, by key."""
    return {
        "source": _("Where do the deaths come from, and who counts them?"),
        "completeness": _("Are all deaths registered? Whose may be missing?"),
        "population": _("How was the population made, and for which day?"),
        "faults": _("Which faults are known?"),
        "late": _("How many deaths are registered late, and when are figures final?"),
        "contact": _("Whom may a reader ask?"),
    }


def stated(by: str, day: str, times: int) -> str:
    """Who said it and when."""
    if times == 1:
        return _("Stated by {by} on {day}.", by=by, day=day)
    return _(
        "Stated by {by} on {day}, in place of {count} before, which are kept.",
        by=by,
        day=day,
        count=str(times - 1),
    )


def not_stated() -> str:
    return _("Nobody has stated anything yet.")


def not_answered() -> str:
    return _("not answered")


HELD = {  # the mark of an area and year in the picture, and what it says
    "complete": "·",
    "part": "½",
    "deaths": "D",
    "people": "P",
    "none": "",
}
PROVISIONAL, ESTIMATED = "p", "e"
DOUBTS = {"years": "Y", "ages": "A", "completeness": "C"}


def mark(held: str, provisional: bool, estimated: bool, doubts: Sequence[str]) -> str:
    """The signs of an area and year, one beside the other."""
    signs = "".join(DOUBTS[one] for one in DOUBTS if one in doubts)
    signs += PROVISIONAL * provisional + ESTIMATED * estimated
    return (HELD[held] if held != "complete" or not signs else "") + signs


def key_of_marks(signs: str) -> Pairs:
    """What each sign says, of those that stand in a picture."""
    known = (
        (HELD["complete"], _("deaths and population are there, and no check finds anything")),
        (
            DOUBTS["years"],
            _("a check of years finds something, in this year or in several together"),
        ),
        (
            DOUBTS["ages"],
            _("a check of sexes or ages finds something, in this year or in several together"),
        ),
        (
            DOUBTS["completeness"],
            _("a check of completeness finds something, in this year or in several together"),
        ),
        (PROVISIONAL, _("provisional")),
        (ESTIMATED, _("split by shares, or worked out from rates")),
        (HELD["part"], _("a sex or one of the two counts is missing in part")),
        (HELD["deaths"], _("deaths without a population")),
        (HELD["people"], _("a population without deaths")),
    )
    return tuple(pair for pair in known if pair[0] in signs)


def areas(codes: Sequence[str], all_: int) -> str:
    """Which areas, or how many where they are many."""
    if not codes:
        return _("all together")
    if len(codes) == all_ > 1:
        return _("all areas")
    if len(codes) > 4:
        return n_("one area", "{count} areas", len(codes))
    return ", ".join(codes)


def years(told: Sequence[str]) -> str:
    """Which years, or how many."""
    known = [one for one in told if one]
    if len(known) > 6:
        first, last = min(known), max(known)
        return _("{count} of {first} to {last}", count=str(len(known)), first=first, last=last)
    return ", ".join(known)


def kept(note: str, warnings: int) -> Sentence:
    """How the upload this edition was made of came through its checks."""
    if not warnings:
        return phrase(_("The upload of this edition was committed without a warning."))
    said = n_(
        "The upload of this edition was committed with one warning and this note: “{note}”",
        "The upload of this edition was committed with {count} warnings and this note: “{note}”",
        warnings,
        note="{note}",
        count="{count}",
    )
    return phrase(said, note=note, count=str(warnings))


def unstated(shared: float, left_out: float) -> Sentence:
    """Shares of the deaths of the upload that did not state all; empty where all do."""
    if not shared and not left_out:
        return ()
    return phrase(
        _(
            "Of the deaths of the upload {shared} % did not state their sex, age or area and were "
            "shared out; {left_out} % were left out."
        ),
        shared=number(100 * shared, 2),
        left_out=number(100 * left_out, 2),
    )


def explained(key: str, name: str) -> Piece:
    """A check by its name, linked to what it looks for."""
    return Piece(name, f"/checks#{key}")
