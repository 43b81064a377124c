"""What did this edition change? Two editions of a collection set side by side."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from engine import indicators
from engine import settings as named
from server.charts.chart import Chart, Series
from server.charts.scales import ticks
from server.pages import changes_tables as tables
from server.pages import frames
from server.pages.page import Page
from server.results.changes import Changes, ChangesQuestion, found_changes
from server.results.headlines import Headline
from server.results.questions import address
from server.sentences import basis, names
from server.sentences import changes as say
from server.sentences.numbers import whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading

OF = "e0"  # what the answer and the picture are about
DRAWN = 20


@dataclass(frozen=True, slots=True)
class Choice:
    """The form that asks for another edition to set beside this one."""

    action: str
    since: tuple[tuple[str, str], ...]
    chosen: str
    figures: str
    settings: str


@dataclass(frozen=True, slots=True, kw_only=True)
class ChangesPage(Page):
    """Counts, statuses and every headline that moved, largest first."""

    template: ClassVar[str] = "changes/page.html"
    drawn: bool
    headline: bool  # whether any of the first headline moved
    all_moved: str  # of the fold of where it moved; empty where the picture names every one
    others: str  # summary of the fold of other indicators; empty where none moved
    counts: str  # of the fold of counts
    parts: tuple[str, ...]  # keys of the further tables
    computed: tuple[Sentence, ...]
    further: tuple[Sentence, ...]
    choice: Choice


def build(session: Session, heading: Heading, question: ChangesQuestion) -> ChangesPage:
    found = found_changes(session, heading, question)
    chart = _chart(found, frames.source(heading))
    made = tables.all_(found, OF)
    keys = {table.key for table in made}
    title = _(
        "Edition {number} against edition {since}",
        number=heading.edition.number,
        since=found.then.number,
    )
    return ChangesPage(
        frame=frames.pinned(
            heading,
            question,
            title=title,
            place=phrase(_("what changed since edition {since}"), since=str(found.then.number)),
            figures=question.figures,
            settings=question.settings,
            notices=frames.notices(heading, question, None, None),
        ),
        answer=say.answer(heading.edition.number, found.then.number, _changed(found), _most(found)),
        lead=_lead(found),
        tables=made,
        charts=(chart,) if chart else (),
        twins=frames.twins(heading, question),
        drawn=chart is not None,
        headline="headlines" in keys,
        all_moved=_all_moved(found),
        others=_("Every other figure that moved") if "figures" in keys else "",
        counts=_("Counts that are others, by area, sex and year") if "counts" in keys else "",
        parts=tuple(key for key in tables.FURTHER if key in keys),
        computed=(say.no_interval(), *basis.stages(named.find(question.settings))),
        further=_further(found),
        choice=_choice(found),
    )


def _all_moved(found: Changes) -> str:
    count = len(found.moves(OF))
    if count <= DRAWN:
        return ""
    return _("All {count} areas, sexes and years where it moved", count=whole(count))


def _changed(found: Changes) -> list[str]:
    """The deaths of 2021 in 2 areas, and so on for each measure."""
    parts = []
    for measure in dict.fromkeys(one.key.measure for one in found.numbers):
        keys = [one.key for one in found.numbers if one.key.measure == measure]
        years, areas = sorted({key.period for key in keys}), {key.area for key in keys}
        parts.append(say.counts(measure, years, len(areas)))
    return parts


def _most(found: Changes) -> str:
    """How far life expectancy at birth went where it went farthest."""
    indicator = indicators.find(OF)
    known = _finite(found)
    if not known:
        return say.unmoved(_(indicator.label))
    one, unit = known[0], indicator.unit
    who = names.population(one.of.sex, found.name(one.of.area))
    return say.most(
        _(indicator.label),
        unit.scale * one.move,
        unit.decimals + 1,
        _(unit.label),
        who,
        one.of.period,
    )


def _finite(found: Changes) -> list[Headline]:
    return [one for one in found.moves(OF) if np.isfinite(one.move)]


def _lead(found: Changes) -> tuple[Sentence, ...]:
    lost = len(found.moves(OF)) - len(_finite(found))
    numbers = {one.key.period for one in found.numbers}
    turned = {
        status: {one.key.period for one in found.statuses if one.now and one.now.status == status}
        for status in ("final", "provisional")
    }
    said = [say.rebase(found.rebased, found.heading.edition.basis.vintage)]
    said += [say.lost(_(indicators.find(OF).label), lost)]
    said += [
        say.statuses(sorted(years), status, moved=moved)
        for status, all_ in turned.items()
        for moved, years in ((False, all_ - numbers), (True, all_ & numbers))
    ]
    added, gone = ({one.key.period for one in found.altered if one.kind == kind} for kind in _NEW)
    held_then, held_now = found.periods
    said.append(say.years(sorted(added - held_then), sorted(gone - held_now)))
    said.append(_areas(found))
    said.append(say.basis([part for part, _then, _now in found.basis]))
    said.append(say.breaks(len(found.breaks)))
    said.append(say.by_cause(len({one.key[:3] for one in found.by_cause})))
    return tuple(sentence for sentence in said if sentence)


_NEW = ("added", "dropped")


def _areas(found: Changes) -> Sentence:
    added = [found.name(now.code) for then, now in found.areas if now and not then]
    gone = [found.name(then.code) for then, now in found.areas if then and not now]
    moved = [found.name(now.code) for then, now in found.areas if then and now]
    return say.areas(added, gone, moved)


def _chart(found: Changes, source: str) -> Chart | None:
    """Life expectancy where it moved, largest first."""
    indicator, all_ = indicators.find(OF), _finite(found)
    shown = all_[:DRAWN]
    if not shown:
        return None
    moves = [indicator.unit.scale * float(one.move) for one in shown]
    low, high = min(0.0, *moves), max(0.0, *moves)
    room = 0.06 * (high - low)
    rows = tuple(float(len(shown) - at) for at in range(len(shown)))
    label = _(indicator.label)
    who = tuple(tables.who(found, one.of) for one in shown)
    return Chart(
        key="moved",
        finding=say.finding(label, len(shown), len(all_)),
        unit=_(
            "Edition {number} less edition {since}: {label}, {unit}; no interval, the same people"
            " counted again",
            number=found.heading.edition.number,
            since=found.then.number,
            label=names.inside(label),
            unit=_(indicator.unit.label),
        ),
        source=source,
        described=_(
            "Rows of {count} areas, sexes and years with the change of {label} in each; the"
            " numbers are in the table below.",
            count=len(shown),
            label=names.inside(label),
        ),
        size="low" if len(shown) <= 8 else "std" if len(shown) <= 14 else "tall",
        x_kind="amount",
        x_range=(low - room, high + room),
        x_ticks=ticks(low - room, high + room),
        y_title=_("change, {unit}", unit=_(indicator.unit.label)),
        y_range=(0.4, len(shown) + 0.6),
        y_ticks=rows,
        y_text=who,
        hover=f"%{{x:+,.{indicator.unit.decimals + 2}f}}",
        table="headlines",
        series=(
            Series(label, tuple(moves), rows, draw="reaches", role="s1", name=label, names=who),
        ),
    )


def _further(found: Changes) -> tuple[Sentence, ...]:
    """The same the other way round, and why the largest moved."""
    heading, asked = found.heading, found.question
    place = (heading.collection.code, heading.edition.number)
    links = []
    known = _finite(found)
    if known:
        one = known[0]
        links.append(
            phrase(
                _("{why} For example {who}."),
                why=Piece(_("Why does this figure read differently?"), tables.account(found, one)),
                who=tables.who(found, one.of),
            )
        )
    if found.then.base:
        before = ChangesQuestion(found.then.base, asked.figures, asked.settings)
        links.append(
            phrase(
                _("The change before it: {link}."),
                link=Piece(
                    _(
                        "edition {number} since edition {since}",
                        number=found.then.number,
                        since=found.then.base,
                    ),
                    address(place[0], found.then.number, before),
                ),
            )
        )
    return tuple(links)


def _choice(found: Changes) -> Choice:
    heading, asked = found.heading, found.question
    others = [one for one in found.others if one != heading.edition.number]
    return Choice(
        action=f"/c/{heading.collection.code}/{heading.edition.number}/{asked.view}",
        since=tuple((str(one), _("edition {number}", number=one)) for one in others),
        chosen=str(found.then.number),
        figures=asked.figures,
        settings=asked.settings,
    )
