"""What of small counts does this collection show? Its policy, its effect, and how to set it."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import ClassVar

from server.disclosure.rounding import BASES
from server.exports import status
from server.exports.table import Column, GapKind, Row, Table
from server.pages.form_fields import Field
from server.pages.page import Frame, Page
from server.sentences import policy as say
from server.sentences.dates import day
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store import collections, masks, policies
from server.store.connect import Session
from server.store.masks import Kept
from server.store.records import Policy, Terms


@dataclass(frozen=True, slots=True, kw_only=True)
class PolicyPage(Page):
    """The policy that holds."""

    template: ClassVar[str] = "policy/page.html"
    effects: Table
    past: Table
    how: tuple[Sentence, ...]
    about_setting: str
    action: str
    fields: tuple[Field, ...]


@dataclass(frozen=True, slots=True)
class Trial:
    """Terms that are not set, and what they would withhold, by edition."""

    terms: Terms
    kept: Mapping[int, Kept]
    note: str = ""  # as typed so far


def _lead(trial: Trial | None, newest: Policy | None, last: Kept) -> tuple[Sentence, ...]:
    said: list[Sentence] = []
    if trial:
        said += [say.stays(trial.terms, last), say.for_good(trial.terms)]
    elif newest:
        said.append(say.stays(newest.terms, last))
    said += say.lead(newest.note if newest and not trial else "", last.exposed)
    return tuple(sentence for sentence in said if sentence)


def build(session: Session, code: str, trial: Trial | None = None) -> PolicyPage:
    collection = collections.find(session, code)
    known = policies.listing(session, code)
    newest = known[0] if known else None
    kept = masks.of_editions(session, code, newest.number) if newest else {}
    terms = trial.terms if trial else newest.terms if newest else Terms()
    shown = trial.kept if trial else kept
    last = shown[max(shown)] if shown else Kept({})
    place = f"/c/{code}/policy"
    effects, past = _effects(shown), _past(known)
    return PolicyPage(
        frame=Frame(
            title=_("Policy of {collection}", collection=collection.name),
            address=place,
            locator=phrase(
                _("{collections}: policy of {collection}"),
                collections=Piece(_("Collections"), "/collections"),
                collection=Piece(collection.name, f"/c/{code}"),
            ),
            shown=_("Data owner: {owner}", owner=collection.owner),
            nav="collections",
        ),
        answer=say.trial(trial.terms, last)
        if trial
        else say.answer(collection.name, newest.terms if newest else None, last),
        lead=_lead(trial, newest, last),
        tables=tuple(table for table in (effects, _marks(), past) if table.rows),
        twins={twin: f"{place}.{twin}" for twin in ("csv", "xlsx", "json")} if not trial else {},
        effects=effects,
        past=past,
        how=say.how(),
        about_setting=say.about_setting(),
        action=place,
        fields=(*_fields(terms), _why(trial.note if trial else "")),
    )


def _effects(kept: Mapping[int, Kept]) -> Table:
    """What the terms do to each edition; of what they do to none there is no column."""
    withheld = any(one.cells for one in kept.values())
    rounded = any(one.rounded for one in kept.values())
    columns: dict[Column, Callable[[Kept], int]] = {}
    if withheld or not rounded:
        columns |= {
            Column("withheld", _("counts withheld"), decimals=0): lambda one: one.cells,
            Column("narrow", _("told apart from some small counts"), decimals=0): lambda one: (
                one.narrow
            ),
            Column("exposed", _("may be worked out"), decimals=0): lambda one: one.exposed,
        }
    if rounded:
        columns[Column("rounded", _("counts rounded"), decimals=0)] = lambda one: one.rounded
    return Table(
        "effect",
        _("What is withheld or rounded of each edition"),
        (Column("edition", _("edition")), *columns),
        tuple(
            Row((number, *(of(one) for of in columns.values())))
            for number, one in sorted(kept.items(), reverse=True)
        ),
        say.about_effects(narrow=withheld or not rounded),
    )


def _past(known: tuple[Policy, ...]) -> Table:
    return Table(
        "policies",
        _("Policies, the newest first"),
        (
            Column("policy", _("policy")),
            Column("made", _("set")),
            Column("by", _("by")),
            Column("terms", _("terms")),
            Column("note", _("why")),
        ),
        tuple(
            Row((one.number, day(one.made), one.by, say.terms(one.terms), one.note))
            for one in known
        ),
    )


def _marks() -> Table:
    """Every mark of a number or a gap, on pages and in files."""
    told = say.gaps()
    rows = [(told[kind.value][0], status.OF_GAPS[kind], told[kind.value][1]) for kind in GapKind]
    rows += say.states()
    return Table(
        "marks",
        _("Marks of numbers and of gaps"),
        (
            Column("mark", _("on pages")),
            Column("obs_status", _("in files (obs_status)")),
            Column("meaning", _("what it means")),
        ),
        tuple(Row(row) for row in rows),
        say.about_marks(),
    )


def _why(note: str) -> Field:
    return Field("text", "note", _("Why, in a sentence"), note, width="wide", required=True)


def _fields(terms: Terms) -> tuple[Field, ...]:
    return (
        Field(
            "text",
            "threshold",
            _("Fewest deaths that are shown"),
            str(terms.threshold),
            hint=_("2 to 100; counts from 1 to one less are withheld"),
        ),
        Field(
            "text",
            "persons",
            _("Fewest people"),
            str(terms.persons),
            hint=_("0: no such rule; deaths of fewer people are withheld, and the people"),
        ),
        Field(
            "text",
            "coarse_below",
            _("Five-year ages below"),
            str(terms.coarse_below),
            hint=_("people in the area; 0: no such rule"),
        ),
        Field(
            "select",
            "zeros",
            _("Nil"),
            terms.zeros,
            options=(("shown", _("is shown")), ("withheld", _("is withheld"))),
        ),
        Field(
            "select",
            "base",
            _("Rounding"),
            str(terms.base),
            options=(
                ("0", _("none")),
                *((str(base), _("to multiples of {base}", base=base)) for base in BASES),
            ),
            hint=_("of all counts, instead of withholding; a year stays as it was first shown"),
        ),
        Field(
            "select",
            "causes",
            _("Deaths by cause"),
            terms.causes,
            options=(("whole", _("of the whole")), ("none", _("none"))),
            hint=_("none where counts are rounded"),
        ),
    )
