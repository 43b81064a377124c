"""Why does this figure read differently? The parts of a revision, exactly."""

import math
from dataclasses import dataclass
from typing import ClassVar

from engine import settings as named
from server.exports.table import Cell, Column, Row, Table
from server.pages import cells, choices, frames
from server.pages.choices import Grouped, Offer
from server.pages.page import Page
from server.results.account import Account, AccountQuestion, account
from server.results.mixing import PARTS
from server.results.questions import PopulationYearQuestion, address
from server.sentences import account as say
from server.sentences import basis, names
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store import editions
from server.store.connect import Session
from server.store.heading import Heading

FINER = 2  # decimals beyond the printed ones: what a revision moves is small


@dataclass(frozen=True, slots=True)
class Choice:
    """The form that asks for another figure, edition or settings."""

    action: str
    offer: Offer
    indicators: Grouped
    since: tuple[tuple[str, str], ...]
    asked: AccountQuestion


@dataclass(frozen=True, slots=True, kw_only=True)
class AccountPage(Page):
    """A figure then and now, and what moved it."""

    template: ClassVar[str] = "account/page.html"
    computed: tuple[Sentence, ...]
    further: tuple[Sentence, ...]
    choice: Choice


def build(session: Session, heading: Heading, question: AccountQuestion) -> AccountPage:
    found = account(session, heading, question)
    who = f"{names.population(question.at.sex, found.holdings.name(question.at.area))}"
    year = question.at.period
    return AccountPage(
        frame=frames.pinned(
            heading,
            question,
            title=_("Why {label} moved", label=names.inside(_(found.indicator.label))),
            place=phrase(
                _("why {label} of {who} in {year} reads differently"),
                label=names.inside(_(found.indicator.label)),
                who=who,
                year=year,
            ),
            figures=question.figures,
            settings=question.settings,
            notices=frames.notices(heading, question, None, None),
        ),
        answer=_answer(found, _("{who} in {year}", who=who, year=year)),
        lead=_lead(found),
        tables=(_sides(found), _parts(found)) if _amounts(found) else (_sides(found),),
        twins=frames.twins(heading, question),
        computed=_computed(found),
        further=_further(found),
        choice=_choice(session, found),
    )


def _decimals(found: Account) -> int:
    return found.indicator.unit.decimals + FINER


def _amounts(found: Account) -> dict[str, float]:
    """What each part moved the figure by, as printed, the largest first; empty where it cannot be
    parted."""
    if found.shares is None:
        return {}
    parts = dict(found.shares.amounts)
    if found.question.printed:
        parts["engine"] = found.astray
    scale = found.indicator.unit.scale
    in_order = sorted(parts, key=lambda part: -abs(parts[part]))
    return {part: scale * parts[part] for part in in_order}


def _answer(found: Account, who: str) -> Sentence:
    unit, label = found.indicator.unit, _(found.indicator.label)
    for side, then in ((found.before, True), (found.after, False)):
        if math.isnan(side):
            return say.unknown(label, who, then=then)
    amount, decimals = unit.scale * found.difference, _decimals(found)
    if found.shares is None:
        return say.whole_only(label, who, amount, decimals, _(unit.label))
    told = [say.share(part, moved, decimals) for part, moved in _amounts(found).items()]
    return say.answer(label, who, amount, decimals, _(unit.label), told)


def _lead(found: Account) -> tuple[Sentence, ...]:
    now, then = found.heading.edition.number, found.then.number
    asked = found.question
    compared = phrase(
        _("Now: edition {now} under {settings}. Then: edition {then} under {before}."),
        now=str(now),
        settings=asked.settings,
        then=str(then),
        before=asked.settings_then,
    )
    kept = [part for part in PARTS if part not in (*found.parts, "births", "reading")]
    return tuple(one for one in (compared, say.left_out(kept)) if one)


def _sides(found: Account) -> Table:
    """The figure then and now."""
    unit, asked = found.indicator.unit, found.question
    rows = [
        (_("then"), found.then.number, asked.settings_then, found.before),
        (_("now"), found.heading.edition.number, asked.settings, found.after),
    ]
    if asked.printed:
        rows.insert(0, (_("as printed then"), found.then.number, "", found.printed))
    return Table(
        "sides",
        _("{label}, {unit}", label=_(found.indicator.label), unit=_(unit.label)),
        (
            Column("when", _("when")),
            Column("edition", _("edition")),
            Column("settings", _("settings")),
            Column("value", _("figure"), decimals=_decimals(found)),
        ),
        tuple(
            Row((when, str(number), settings, cells.number(unit.scale * value)))
            for when, number, settings, value in rows
        ),
    )


def _parts(found: Account) -> Table:
    """What moved it, the largest first; they add up to the difference."""
    amounts, decimals = _amounts(found), _decimals(found)
    rows: list[tuple[Cell, ...]] = [
        (part, say.meaning(part), moved) for part, moved in amounts.items()
    ]
    return Table(
        "parts",
        _("What moved it"),
        (
            Column("part", _("part")),
            Column("meaning", _("what it is")),
            Column("moved", _("moved by"), _(found.indicator.unit.label), decimals, signed=True),
        ),
        tuple(Row(cells_, shown=say.part(str(cells_[0]))) for cells_ in rows),
        total=Row(("all", "", found.indicator.unit.scale * found.difference), shown=_("together")),
    )


def _computed(found: Account) -> tuple[Sentence, ...]:
    said: list[Sentence] = []
    if found.shares is not None and found.parts:
        said.append(say.how(len(found.parts), found.shares.orders, found.shares.all_orders))
    if found.question.printed:
        said.append(say.engine())
    said.append(
        phrase(
            _("{name} {definition} Source: {source}."),
            name=Piece(f"{_(found.indicator.label)}.", emphasis="strong"),
            definition=_(found.indicator.definition),
            source=found.indicator.source,
        )
    )
    return (*said, *basis.stages(named.find(found.question.settings)))


def _further(found: Account) -> tuple[Sentence, ...]:
    heading, asked = found.heading, found.question
    code = heading.collection.code
    pages = []
    for number, settings in (
        (found.then.number, asked.settings_then),
        (heading.edition.number, asked.settings),
    ):
        question = PopulationYearQuestion(asked.at, asked.figures, settings)
        words = _("edition {number}, {settings}", number=number, settings=settings)
        pages.append(Piece(words, address(code, number, question)))
    return ((*phrase(_("All figures of these people: ")), *basis.in_a_row(pages), Piece(".")),)


def _choice(session: Session, found: Account) -> Choice:
    heading, asked = found.heading, found.question
    all_ = editions.listing(session, heading.collection.code)
    return Choice(
        action=f"/c/{heading.collection.code}/{heading.edition.number}/{asked.view}",
        offer=choices.offer(found.holdings),
        indicators=choices.indicators(asked.of),
        since=tuple((str(one.number), _("edition {number}", number=one.number)) for one in all_),
        asked=asked,
    )
