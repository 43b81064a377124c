"""What is said of files handed in, before they are an edition."""

import datetime as dt
from collections.abc import Sequence

from server.sentences import names
from server.sentences.dates import day
from server.sentences.numbers import whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_


def things(count: int) -> str:
    """A small number of things, in words."""
    words = (
        _("nothing"),
        _("one thing"),
        _("two things"),
        _("three things"),
        _("four things"),
        _("five things"),
        _("six things"),
        _("seven things"),
        _("eight things"),
        _("nine things"),
    )
    return words[count] if count < len(words) else _("{count} things", count=whole(count))


def answer(files: Sequence[str], errors: int, warnings: int) -> Sentence:
    """Whether an edition can be made, and what stands in the way."""
    values = {
        "files": names.listed(list(dict.fromkeys(files))),
        "errors": things(errors),
        "warnings": things(warnings),
    }
    if errors and warnings:
        return phrase(
            _(
                "{files} cannot become an edition yet: {errors} must be put right, and {warnings} "
                "should be looked at again."
            ),
            **values,
        )
    if errors:
        return phrase(
            _("{files} cannot become an edition yet: {errors} must be put right."), **values
        )
    if warnings:
        return phrase(
            _("{files} can become an edition, but {warnings} should be looked at again."), **values
        )
    return phrase(_("{files} can become an edition: every check was passed."), **values)


def became(files: Sequence[str], edition: Piece) -> Sentence:
    return phrase(
        _("{files} became {edition}."),
        files=names.listed(list(dict.fromkeys(files))),
        edition=edition,
    )


def outcome(errors: int, warnings: int, rows: int, sound: int) -> str:
    """The same for a terminal."""
    return _(
        "{read} To be put right: {errors}; to be looked at again: {warnings}.",
        read=_read(rows, sound),
        errors=whole(errors),
        warnings=whole(warnings),
    )


def read_rows(rows: int, sound: int, standing: int) -> Sentence:
    """What was read, and that nothing has happened to what stands (0: nothing does)."""
    text = (
        _("{read} Nothing has changed: {edition} stands.")
        if standing
        else _("{read} Nothing has been made of it yet.")
    )
    edition = _("edition {number}", number=standing)
    return phrase(text, read=_read(rows, sound), edition=edition)


def _read(rows: int, sound: int) -> str:
    return n_(
        "One row was read; {sound} is sound.",
        "{rows} rows were read; {sound} are sound.",
        rows,
        rows=whole(rows),
        sound=whole(sound),
    )


def holds(
    *,
    areas: Sequence[str],
    sexes: Sequence[str],
    periods: Sequence[str],
    measures: Sequence[str],
    grids: Sequence[Sequence[str]],
    provisional: Sequence[str],
    persons: bool,
    whole_area: str,
    delivered: Sequence[str],
) -> tuple[tuple[str, str], ...]:
    """What was understood, word and text, so that a slip in the reading is seen."""
    kinds = {
        "deaths": _("deaths"),
        "person_years": _("person-years"),
        "births": _("live births"),
        "stillbirths": _("stillbirths"),
        "neonatal_deaths": _("deaths before 28 days"),
    }
    facts = [
        (_("Counts"), names.listed([kinds[one] for one in measures])),
        (_("Areas"), names.listed(list(areas), most=12)),
        (_("Sexes"), names.listed([names.sex(one) for one in sexes])),
        (_("Years"), years(periods)),
        (_("Ages"), "; ".join(ages(grid) for grid in grids) or _("none")),
        (_("Provisional"), names.listed(list(provisional), most=12)),
    ]
    summed = [_("persons, of women and men")] if persons else []
    summed += [_("{area}, of its parts", area=whole_area)] if whole_area else []
    facts.append((_("Summed"), names.listed(summed)))
    if delivered:
        facts.append((_("As delivered"), names.listed(list(delivered), most=12)))
    return tuple(facts)


def years(periods: Sequence[str]) -> str:
    if not periods:
        return _("none")
    if len(periods) == 1:
        return periods[0]
    return _("{count}, {first} to {last}", count=len(periods), first=periods[0], last=periods[-1])


def ages(labels: Sequence[str]) -> str:
    """One grid of age groups: its first ones, its last one and how many there are."""
    return _(
        "{first} ... {last} ({count} groups)",
        first=", ".join(labels[:3]),
        last=labels[-1],
        count=len(labels),
    )


def state(*, edition: int | None, checked: bool, errors: int, warnings: int) -> str:
    """Where an upload stands, in a table."""
    if edition is not None:
        return _("edition {number}", number=edition)
    if not checked:
        return _("draft, not checked")
    if errors:
        return _("draft, {things} to be put right", things=things(errors))
    if warnings:
        return _("draft, {things} to look at again", things=things(warnings))
    return _("draft, sound")


def drafts(count: int) -> Sentence:
    """The answer of the list of uploads."""
    if not count:
        return phrase(_("No draft waits to become an edition."))
    return phrase(
        n_(
            "One draft waits to become an edition.",
            "{count} drafts wait to become editions.",
            count,
        )
    )


def why_not(errors: int, number: int) -> str:
    """Beside the button that makes an edition."""
    if errors:
        return _(
            "Edition {number} can be made once nothing stands under “Must be put right”.",
            number=number,
        )
    return _(
        "An edition never changes once it is made. It can be withdrawn, and a correction is a new "
        "edition."
    )


def checking(state: str, message: str) -> Sentence:
    """How far the reading and checking of an upload is, or how it ended."""
    said = {
        "queued": _("The files wait for their turn."),
        "running": _("The files are being read: {stage}.", stage=_(message))
        if message
        else _("The files are being read."),
        "cancelled": _("The reading was stopped."),
        "failed": _("The files could not be read to the end. {why}", why=_(message)),
        "done": _("The files have been read and checked."),
    }
    return phrase(said[state])


def committing(state: str, message: str) -> Sentence:
    """How far the making of an edition is, or how it ended."""
    said = {
        "queued": _("The upload waits for its turn."),
        "running": _("The edition is being made: {stage}.", stage=_(message))
        if message
        else _("The edition is being made."),
        "cancelled": _("The making of the edition was stopped."),
        "failed": _("The edition could not be made. {why}", why=_(message)),
        "done": _("The edition has been made."),
    }
    return phrase(said[state])


def committing_further(state: str) -> tuple[Sentence, ...]:
    """What may be done meanwhile; or, of an upload that was looked at and is no edition, that."""
    if state not in ("queued", "running"):
        return (
            phrase(
                _("No edition has been made of this upload so far. It can be committed once more.")
            ),
        )
    return (
        phrase(
            _(
                "This page may be left; the work goes on. Either the whole edition is made or "
                "nothing of it."
            )
        ),
    )


def checking_further(state: str, *, reported: bool) -> tuple[Sentence, ...]:
    """What may be done meanwhile; or what is known of the report afterwards."""
    if state not in ("queued", "running"):
        return (
            phrase(
                _("A report of what the checks found stands under the upload.")
                if reported
                else _("No report of these files has been written so far.")
            ),
        )
    return (
        phrase(
            _(
                "This page may be left; the work goes on. What was found will stand under the "
                "upload."
            )
        ),
    )


def stale(checked: int, standing: int) -> Sentence:
    """Another edition stands than when the checks ran (0: none did, or does)."""
    return phrase(
        _("The checks ran when {then} stood; now {now} stands. Check the files again below."),
        then=_("edition {number}", number=checked) if checked else _("no edition"),
        now=_("edition {number}", number=standing) if standing else _("no edition"),
    )


def erased(when: dt.datetime, who: str, why: str) -> str:
    """That the bytes of a file are no longer kept."""
    return _("on {day} by {who}: {why}", day=day(when), who=who, why=why)
