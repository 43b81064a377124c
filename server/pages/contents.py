"""One edition: what it holds, life expectancy in every area, where to go, and its standing."""

from dataclasses import dataclass, replace
from typing import ClassVar

from server.exports.table import Table
from server.pages import breaks, contents_tables, frames, provisional, what_would_change
from server.pages.page import Frame, Notice, Page
from server.results.cause_figures import held_by_cause
from server.results.causes import CauseChoice
from server.results.changes import ChangesQuestion
from server.results.contents import Contents, ContentsQuestion, contents
from server.results.holdings import Holdings
from server.results.quality import QualityQuestion
from server.results.questions import (
    DEFAULT_INDICATOR,
    CausesQuestion,
    ComparisonQuestion,
    CurvesQuestion,
    PopulationYear,
    PopulationYearQuestion,
    TrendQuestion,
    address,
)
from server.sentences import contents as say
from server.sentences import names
from server.sentences import uploads as uploads_say
from server.sentences.basis import Told
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store import editions, uploads
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import UploadFile

Options = tuple[tuple[str, str], ...]  # value and label, for a form
APART = 10  # years between the two that are proposed for a comparison


@dataclass(frozen=True, slots=True)
class Choice:
    """What a plain form offers to compare, and what it proposes."""

    action: str
    areas: Options
    sexes: Options
    periods: Options
    this: PopulationYear
    that: PopulationYear


@dataclass(frozen=True, slots=True)
class Standing:
    """What may be done with the edition's standing: where the form leads and what it says."""

    action: str
    button: str
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class ContentsPage(Page):
    """What is in this edition?"""

    template: ClassVar[str] = "contents/page.html"
    questions: tuple[Sentence, ...]
    choice: Choice | None  # None: the edition holds nothing
    basis: tuple[Sentence, ...]
    causes: str  # over the list of causes of death; empty: there is none
    broken: bool  # breaks or years of shock are stated
    revised: bool  # provisional years were handed in again
    editions: contents_tables.Listing  # of the whole collection: it changes, the figures do not
    standing: Standing


def build(session: Session, heading: Heading, question: ContentsQuestion) -> ContentsPage:
    found = contents(session, heading, question)
    held, collection, edition = found.holdings, heading.collection, heading.edition
    choice = _choice(heading, held) if held.periods else None
    erased = uploads.erasures(session, collection.code)
    moves = provisional.table(session, heading, held, question.settings, question.figures)
    return ContentsPage(
        frame=_frame(heading, question, erased.get(edition.number, ())),
        answer=say.answer(collection.name, edition.number, held.periods, len(held.areas)),
        lead=lead(found),
        tables=(*_tables(found), *([moves] if moves.rows else [])),
        cautions=frames.cautions(beside=[_moved_before(session, found)], below=[]),
        twins=frames.twins(heading, question) if found.newest else {},
        questions=_questions(heading, question, held, choice) if choice else (),
        choice=choice,
        basis=(*frames.basis(edition.basis), say.quality(_quality(heading, question))),
        causes=say.cause_list(len(held.causes)) if held.causes else "",
        broken=bool(held.breaks),
        revised=bool(moves.rows),
        editions=_editions(session, heading, erased),
        standing=_standing(heading),
    )


def _moved_before(session: Session, found: Contents) -> Told:
    asked, held = found.question, found.holdings
    any_ = "provisional" in held.status.values()
    return provisional.caution(
        session, found.heading, held, asked.settings, asked.figures, any_=any_
    )


def _tables(found: Contents) -> tuple[Table, ...]:
    newest = [contents_tables.areas(found, found.newest)] if found.newest else []
    held = found.holdings
    listed = [contents_tables.causes(held.causes)] if held.causes else []
    return (*newest, *listed, *([breaks.table(held.breaks, held)] if held.breaks else []))


def _quality(heading: Heading, question: ContentsQuestion) -> str:
    asked = QualityQuestion(question.figures, question.settings)
    return address(heading.collection.code, heading.edition.number, asked)


def _editions(
    session: Session, heading: Heading, erased: dict[int, tuple[UploadFile, ...]]
) -> contents_tables.Listing:
    collection = heading.collection
    all_ = editions.listing(session, collection.code)
    hidden = heading.policy is not None
    table = contents_tables.editions(collection, all_, heading.newest, erased, hidden=hidden)
    return contents_tables.Listing((table,), contents_tables.editions_twins(collection.code))


def _frame(heading: Heading, question: ContentsQuestion, erased: tuple[UploadFile, ...]) -> Frame:
    frame = frames.pinned(
        heading,
        question,
        title=heading.collection.name,
        place=phrase(_("contents")),
        figures=question.figures,
        settings=question.settings,
        notices=(*_notices(heading, question), *_erased(erased)),
    )
    return replace(frame, shown=_("Data owner: {owner}", owner=heading.collection.owner))


def _notices(heading: Heading, question: ContentsQuestion) -> tuple[Notice, ...]:
    """Withdrawn, or superseded."""
    told = frames.notices(heading, question, None, None)
    newest = heading.newest
    if newest is None or newest <= heading.edition.number:
        return told
    newer = Piece(
        _("Edition {number}", number=newest), address(heading.collection.code, newest, question)
    )
    text = say.superseded(heading.edition.number, newer)
    text = (*text, *frames.changed(heading, question))
    return (*told, Notice(_("A newer edition stands"), text))


def _erased(files: tuple[UploadFile, ...]) -> tuple[Notice, ...]:
    """That the bytes the edition was made of are no longer kept."""
    said = [
        uploads_say.erased(one.erased, one.erased_by, one.erased_why)
        for one in files
        if one.erased is not None
    ]
    return (Notice(_("Bytes erased"), say.erased(said[0])),) if said else ()


def lead(found: Contents) -> tuple[Sentence, ...]:
    """The newest figures of the first area, the whole."""
    newest = found.newest
    if newest is None:
        return ()
    area = newest.lines[0][0]
    by_sex = [
        (line[1], newest.estimate[at, 0]) for at, line in enumerate(newest.lines) if line[0] == area
    ]
    provisional = any(
        newest.status[at][0] == "provisional"
        for at, line in enumerate(newest.lines)
        if line[0] == area
    )
    said = say.newest(found.holdings.name(area), newest.periods[0], by_sex, provisional=provisional)
    return (said,) if said else ()


def _choice(heading: Heading, held: Holdings) -> Choice:
    """The first area, women first, newest year; against it ten years before, or the first year."""
    last = held.periods[-1]
    earlier = [period for period in held.periods if int(period) <= int(last) - APART]
    sexes = tuple(sex for sex in ("f", "m", "p") if sex in held.sexes)
    this = PopulationYear(held.areas[0].code, sexes[0], last)
    return Choice(
        action=f"/c/{heading.collection.code}/{heading.edition.number}/comparison",
        areas=tuple((area.code, area.name or area.code) for area in held.areas),
        sexes=tuple((sex, names.sex(sex)) for sex in sexes),
        periods=tuple((period, period) for period in reversed(held.periods)),
        this=this,
        that=replace(this, period=earlier[-1] if earlier else held.periods[0]),
    )


def _questions(
    heading: Heading, question: ContentsQuestion, held: Holdings, choice: Choice
) -> tuple[Sentence, ...]:
    """A first address of each view, with sensible choices."""
    asked = (question.figures, question.settings)
    trend = TrendQuestion(figures=question.figures, settings=question.settings).completed(
        areas=[area.code for area in held.areas], sexes=held.sexes, periods=held.periods
    )
    this, that = choice.this, choice.that
    population = PopulationYearQuestion(this, *asked)
    comparison = ComparisonQuestion(
        this, that, DEFAULT_INDICATOR, *asked, overlap="rest"
    ).simplified()
    collection, number = heading.collection.code, heading.edition.number
    who = names.population(this.sex, held.name(this.area))
    causes = CausesQuestion(
        this, causes=CauseChoice(), figures=question.figures, settings=question.settings
    )
    by_cause = say.causes(address(collection, number, causes), who, this.period)
    first = say.questions(
        population=address(collection, number, population),
        comparison=address(collection, number, comparison),
        trend=address(collection, number, trend),
        curves=address(collection, number, CurvesQuestion(this, *asked)),
        changes=_changes(heading, question),
        who=who,
        area=held.name(this.area),
        this=this.period,
        that=that.period,
    )
    shown = held_by_cause(heading, held, this, question.figures)
    further = what_would_change.ways(heading, this, *asked)
    return (*first, by_cause, further) if shown else (*first, further)


def _changes(heading: Heading, question: ContentsQuestion) -> tuple[int, str] | None:
    """The edition this one was built on, and where it is told what it changed."""
    edition = heading.edition
    if not edition.base:
        return None
    asked = ChangesQuestion(edition.base, question.figures, question.settings)
    return edition.base, address(heading.collection.code, edition.number, asked)


def _standing(heading: Heading) -> Standing:
    number = heading.edition.number
    place = f"/c/{heading.collection.code}/{number}"
    if heading.edition.withdrawn:
        return Standing(
            f"{place}/reinstate",
            _("Reinstate edition {number}", number=number),
            say.reinstating(),
        )
    return Standing(
        f"{place}/withdraw", _("Withdraw edition {number}", number=number), say.withdrawing()
    )
