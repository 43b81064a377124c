"""How every figure is made, written from the registries of indicators, settings and checks."""

from dataclasses import dataclass
from typing import ClassVar

from engine.indicator import Indicator
from engine.indicators import INDICATORS
from engine.settings import SETTINGS
from server.exports.table import Column, Row, Table
from server.intake.checks import KINDS
from server.pages.entry import Entry
from server.pages.page import Frame, Page
from server.sentences import methods as say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


@dataclass(frozen=True, slots=True, kw_only=True)
class MethodsPage(Page):
    """How is this figure made, and who says so?"""

    template: ClassVar[str] = "methods/page.html"
    links: tuple[Sentence, ...]  # to every entry, since the page is long
    indicators: tuple[Entry, ...]
    chains: tuple[Entry, ...]


def build() -> MethodsPage:
    indicators = tuple(INDICATORS.values())
    entries = tuple(
        Entry(one.key, _(one.label), _(one.symbol), say.indicator(one)) for one in indicators
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
        links=tuple((Piece(one.label, f"#{one.key}"),) for one in (*entries, *chains)),
        indicators=entries,
        chains=chains,
        tables=(_indicators(indicators), _settings(), _checks()),
        twins={twin: f"/methods.{twin}" for twin in ("csv", "xlsx", "json")},
    )


def _indicators(indicators: tuple[Indicator, ...]) -> Table:
    return Table(
        "indicators",
        _("Indicators"),
        (
            Column("key", _("key in addresses")),
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
            for one in indicators
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
