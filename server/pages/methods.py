"""How every figure is made, written from the registries of indicators, settings and checks."""

from dataclasses import dataclass
from typing import ClassVar

from engine.causes.registry import NUMBERS
from engine.indicators import GROUPS
from engine.settings import SETTINGS
from engine.standards import STANDARDS
from server.exports.table import Column, Row, Table
from server.intake.checks import KINDS
from server.pages.entry import Entry
from server.pages.page import Frame, Page
from server.sentences import methods as say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


@dataclass(frozen=True, slots=True)
class Chapter:
    """The indicators that answer one question."""

    key: str
    label: str
    question: str
    entries: tuple[Entry, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class MethodsPage(Page):
    """How is this figure made, and who says so?"""

    template: ClassVar[str] = "methods/page.html"
    links: tuple[Sentence, ...]  # to every chapter and chain, since the page is long
    chapters: tuple[Chapter, ...]
    by_cause: tuple[Entry, ...]  # numbers that every cause of death has
    chains: tuple[Entry, ...]


def build() -> MethodsPage:
    chapters = tuple(
        Chapter(
            group.key,
            _(group.label),
            _(group.question),
            tuple(
                Entry(one.key, _(one.label), _(one.symbol), say.indicator(one))
                for one in group.indicators
            ),
        )
        for group in GROUPS
    )
    chains = tuple(
        Entry(one.key, _(one.label), one.key, say.settings(one)) for one in SETTINGS.values()
    )
    return MethodsPage(
        frame=Frame(
            title=_("Methods"),
            address="/methods",
            locator=phrase(_("How the figures are made")),
            nav="methods",
        ),
        answer=phrase(
            _("Every figure is made by a published method, under settings named in its address.")
        ),
        links=(
            *((Piece(one.label, f"#{one.key}"),) for one in chapters),
            (Piece(_("Numbers by cause of death"), "#by-cause"),),
            *((Piece(one.label, f"#{one.key}"),) for one in chains),
        ),
        chapters=chapters,
        by_cause=tuple(
            Entry(f"cause-{one.key}", _(one.label), _(one.symbol), say.cause_number(one))
            for one in NUMBERS.values()
        ),
        chains=chains,
        tables=(_indicators(), _settings(), _standards(), _checks()),
        twins={twin: f"/methods.{twin}" for twin in ("csv", "xlsx", "json")},
    )


def _indicators() -> Table:
    return Table(
        "indicators",
        _("Indicators"),
        (
            Column("key", _("key in addresses")),
            Column("group", _("group")),
            Column("symbol", _("symbol")),
            Column("label", _("name")),
            Column("unit", _("unit")),
            Column("definition", _("definition")),
            Column("formula", _("formula")),
            Column("smooth", _("smooth")),
            Column("why_not_smooth", _("why not")),
            Column("source", _("source")),
        ),
        tuple(
            Row(
                (
                    one.key,
                    _(group.label),
                    one.symbol,
                    _(one.label),
                    _(one.unit.label),
                    _(one.definition),
                    _(one.formula),
                    _("yes") if one.smooth else _("no"),
                    _(one.why_not_smooth) if one.why_not_smooth else "",
                    _(one.source),
                )
            )
            for group in GROUPS
            for one in group.indicators
        ),
    )


def _settings() -> Table:
    return Table(
        "settings",
        _("Settings"),
        (
            Column("key", _("key in addresses")),
            Column("stage", _("step")),
            Column("sentence", _("what is done")),
        ),
        tuple(
            Row((one.key, word, sentence))
            for one in SETTINGS.values()
            for word, sentence in say.settings(one)
        ),
    )


def _standards() -> Table:
    return Table(
        "standards",
        _("Standard populations"),
        (
            Column("key", _("key in addresses")),
            Column("label", _("name")),
            Column("age", _("age")),
            Column("weight", _("weight, as published"), decimals=2),
            Column("source", _("source")),
        ),
        tuple(
            Row((f"asr_{one.key}", _(one.label), age, weight, _(one.source)))
            for one in STANDARDS.values()
            for age, weight in zip(one.grid.labels, one.weights, strict=True)
        ),
    )


def _checks() -> Table:
    return Table(
        "checks",
        _("Checks of an upload"),
        (
            Column("meaning", _("what is checked")),
            Column("severity", _("what it means")),
            Column("remedy", _("what to do")),
        ),
        tuple(
            Row((_(one.meaning), say.severity(one.severity), _(one.remedy)))
            for one in KINDS.values()
        ),
    )
