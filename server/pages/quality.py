"""How good the counts of an edition are: by area and year, by check, by index, and as stated."""

from collections import Counter
from dataclasses import dataclass, replace
from typing import ClassVar

from server.intake.checks import KINDS
from server.intake.report import Report
from server.pages import frames, quality_tables
from server.pages.contents_tables import Listing
from server.pages.page import Frame, Page
from server.results.quality import Quality, QualityQuestion, quality
from server.sentences import quality as say
from server.sentences.dates import day
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _
from server.store import statements, uploads
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import Edition, Statement
from server.store.statements import LONGEST, QUESTIONS


@dataclass(frozen=True, slots=True)
class Stating:
    """The form in which an analyst states what is known."""

    action: str
    fields: tuple[tuple[str, str, str], ...]  # key, question, what was answered last
    longest: int


@dataclass(frozen=True, slots=True)
class Kept:
    """What was known of the upload when it became the edition."""

    said: tuple[Sentence, ...]
    warnings: Counter[str]  # how often, by key of the check


@dataclass(frozen=True, slots=True, kw_only=True)
class QualityPage(Page):
    """How good are the counts of this edition?"""

    template: ClassVar[str] = "quality/page.html"
    shown: tuple[str, ...]  # keys of the tables that have rows
    picture: Listing  # the table by area and year, cut into rows of decades
    marks: tuple[tuple[str, str], ...]  # each sign of the picture, and what it says
    kept: tuple[Sentence, ...]
    stated: str  # who stated it and when, or that nobody did
    stating: Stating


def build(session: Session, heading: Heading, question: QualityQuestion) -> QualityPage:
    found = quality(session, heading, question.figures)
    said = statements.listing(session, heading.collection.code, heading.edition.number)
    kept = _kept(session, heading.edition)
    tables = quality_tables.tables(found, said, kept.warnings)
    return QualityPage(
        frame=_frame(heading, question),
        answer=say.answer(
            heading.collection.name,
            heading.edition.number,
            found.complete,
            len(found.places),
            sum(one.times for one in found.findings),
        ),
        lead=_lead(found),
        tables=tables,
        twins=frames.twins(heading, question),
        shown=tuple(table.key for table in tables),
        picture=Listing(quality_tables.in_parts(quality_tables.by_year(found))),
        marks=say.key_of_marks(quality_tables.signs(found)),
        kept=kept.said,
        stated=_stated(said),
        stating=_stating(heading, said),
    )


def _frame(heading: Heading, question: QualityQuestion) -> Frame:
    frame = frames.pinned(
        heading,
        question,
        title=_("Quality: {collection}", collection=heading.collection.name),
        place=phrase(_("quality")),
        figures=question.figures,
        settings=question.settings,
        notices=frames.notices(heading, question, None, None),
    )
    # nothing on the page depends on settings
    return replace(frame, shown=_("What is known of the counts"), colophon=frame.colophon[:1])


def _lead(found: Quality) -> tuple[Sentence, ...]:
    names = {area.code: area.name or area.code for area in found.areas}
    top = next((one for one in found.indices if one.registered == one.registered), None)
    told = (
        say.provisional(found.provisional),
        say.registered(top.registered, names[top.area]) if top else (),
    )
    return tuple(sentence for sentence in told if sentence)


def _kept(session: Session, edition: Edition) -> Kept:
    if edition.upload is None:
        return Kept((), Counter())
    stored = uploads.find(session, edition.upload).report
    if not stored:
        return Kept((), Counter())
    report = Report.from_json(stored)
    warnings = Counter[str]()
    for problem in report.warnings:
        if problem.key in KINDS:
            warnings[problem.key] += 1 + problem.others
    deaths = [one for one in report.unstated if one.measure == "deaths"]
    after, out = sum(one.after for one in deaths), sum(one.left_out for one in deaths)
    shared = sum(one.sex + one.age + one.area for one in deaths)
    every = after + out
    lacking = say.unstated(shared / every, out / every) if every else ()
    told = (say.kept(edition.note, warnings.total()), lacking)
    return Kept(tuple(sentence for sentence in told if sentence), warnings)


def _stated(said: tuple[Statement, ...]) -> str:
    if not said:
        return say.not_stated()
    return say.stated(said[0].by, day(said[0].at), len(said))


def _stating(heading: Heading, said: tuple[Statement, ...]) -> Stating:
    questions = say.questions()
    answers = said[0].answers if said else {}
    return Stating(
        f"/c/{heading.collection.code}/{heading.edition.number}/quality",
        tuple((key, questions[key], answers.get(key, "")) for key in QUESTIONS),
        LONGEST,
    )
