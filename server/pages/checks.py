"""What each check of an upload looks for, written from the registry of checks."""

from dataclasses import dataclass
from typing import ClassVar

from server.exports.table import Column, Row, Table
from server.intake.checks import CHAPTERS, DOUBTS
from server.intake.checks.alarms import FalseAlarms, kept
from server.intake.problems import Kind
from server.pages.entry import Entry
from server.pages.page import Frame, Page
from server.sentences import checks as say
from server.sentences import methods
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


@dataclass(frozen=True, slots=True)
class ChapterOfChecks:
    """The checks that answer one question."""

    key: str
    label: str
    question: str
    entries: tuple[Entry, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class ChecksPage(Page):
    """What is an upload checked for, and how often is a check wrong?"""

    template: ClassVar[str] = "checks/page.html"
    links: tuple[Sentence, ...]
    chapters: tuple[ChapterOfChecks, ...]
    measured: Sentence


def build() -> ChecksPage:
    alarms = kept()
    chapters = tuple(
        ChapterOfChecks(
            one.key,
            _(one.label),
            _(one.question),
            tuple(_entry(check, alarms) for check in one.checks),
        )
        for one in sorted(CHAPTERS, key=lambda one: one.key not in DOUBTS)
    )
    checks = [check for one in CHAPTERS for check in one.checks]
    errors = sum(check.severity == "error" for check in checks)
    return ChecksPage(
        frame=Frame(
            title=_("Checks of an upload"),
            address="/checks",
            locator=phrase(_("{methods}: checks"), methods=Piece(_("Methods"), "/methods")),
            nav="methods",
        ),
        answer=say.answer(errors, len(checks) - errors),
        lead=(say.lead(alarms.lines, alarms.found),),
        links=tuple((Piece(one.label, f"#{one.key}"),) for one in chapters),
        chapters=chapters,
        measured=say.measured(alarms.measured),
        tables=(_table(alarms), _data(alarms)),
        twins={twin: f"/checks.{twin}" for twin in ("csv", "xlsx", "json")},
    )


def _entry(check: Kind, alarms: FalseAlarms) -> Entry:
    told = _false_alarms(check, alarms)
    facts = say.facts(check.meaning, check.why, check.remedy, check.source, told)
    return Entry(check.key, say.name(check.key), methods.severity(check.severity), facts)


def _false_alarms(check: Kind, alarms: FalseAlarms) -> str:
    rate = alarms.of(check.key)
    if not rate.worst:
        return say.no_alarm(alarms.lines)
    return say.some_alarms(rate.mean, rate.worst, rate.where)


def _table(alarms: FalseAlarms) -> Table:
    return Table(
        "checks",
        _("Checks of an upload"),
        (
            Column("key", _("key")),
            Column("chapter", _("chapter")),
            Column("severity", _("what it means")),
            Column("meaning", _("what is checked")),
            Column("why", _("why")),
            Column("remedy", _("what to do")),
            Column("source", _("source")),
            Column("false_alarms", _("findings"), _("in 1,000 clean areas, sexes, years"), 2),
            Column("false_alarms_worst", _("at worst"), _("in 1,000"), 2),
        ),
        tuple(
            Row(
                (
                    check.key,
                    _(one.label),
                    methods.severity(check.severity),
                    _(check.meaning),
                    _(check.why) if check.why else "",
                    _(check.remedy),
                    _(check.source) if check.source else "",
                    alarms.of(check.key).mean,
                    alarms.of(check.key).worst,
                )
            )
            for one in CHAPTERS
            for check in one.checks
        ),
    )


def _data(alarms: FalseAlarms) -> Table:
    """The clean counts that the checks were tried on, and what they found there."""
    return Table(
        "clean_counts",
        _("Clean counts that the checks were tried on"),
        (
            Column("data", _("counts")),
            Column("lines", _("areas, sexes and years"), decimals=0),
            Column("findings", _("findings of all checks"), _("in 1,000"), 1),
        ),
        tuple(
            Row((say.data(one.name), one.lines, sum(alarms.rates[one.name].values())))
            for one in alarms.data
        ),
    )
