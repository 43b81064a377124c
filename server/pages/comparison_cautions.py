"""What a comparison warns of, and what would overturn what it says."""

import math

from engine import indicators
from engine.standardisation import few_deaths
from server.pages import comparison_charts as charts
from server.pages import comparison_tables as tables
from server.pages import frames, provisional
from server.pages.page import Caution
from server.pages.withholding import caution
from server.results.breaks import between
from server.results.compared import Comparison, Side
from server.results.overturning import overturned
from server.results.provisional import track
from server.sentences import basis
from server.sentences import beside as beside_say
from server.sentences import breaks as of_breaks
from server.sentences import cause_contributions as causes_say
from server.sentences import contributions as ages_say
from server.sentences import overturning as over
from server.sentences.provisional import percent
from server.sentences.reasons import reason
from server.sentences.text import _
from server.store.connect import Session


def cautions(session: Session, found: Comparison) -> tuple[Caution, ...]:
    return frames.cautions(
        beside=[*_of_counts(session, found), *_of_method(found)], below=_below(found)
    )


def _of_counts(session: Session, found: Comparison) -> list[basis.Told]:
    """Of what the figures rest on, told with the answer."""
    counted = [side for side in (found.this, found.that) if not side.place.standard]
    late = [side for side in counted if side.loaded.status == "provisional"]
    estimated = [_named(found, side) for side in counted if side.loaded.estimated]
    lived = {float(side.panel.exposure.sum()): side for side in counted}
    fewest = min(lived)
    return [
        caution(found.this.loaded, found.that.loaded),
        basis.provisional(sorted({tables.named(found, side).period for side in late})),
        _moved_before(session, found, late),
        _overturned(session, found),
        basis.estimated(list(dict.fromkeys(estimated))),
        _break_between(found),
        *(of_breaks.mixed(found.mixed(side), _named(found, side)) for side in counted),
        basis.few_person_years(fewest, found.settings, _named(found, lived[fewest])),
        *(
            basis.few_deaths(float(side.panel.deaths.sum()), _named(found, side))
            for side in counted
            if few_deaths(indicators.INDICATORS["asr_esp2013"], side.panel.deaths)
        ),
    ]


def _of_method(found: Comparison) -> list[basis.Told]:
    modelled = found.settings.open_interval != "one_over_m"
    return [
        basis.law(found.settings, found.grid.open_age) if modelled else None,
        *(
            basis.borrowed(found.grid.open_age, _whole(side))
            for side in (found.this, found.that)
            if side.borrowed
        ),
        basis.early_end(found.grid.open_age) if found.this.early_end else None,
        basis.smoothed(found.settings),
        *_recoded(found),
        beside_say.two_collections() if found.kind == "elsewhere" else None,
        beside_say.no_rest() if found.no_rest else None,
    ]


def _below(found: Comparison) -> list[basis.Told]:
    counted = [side for side in (found.this, found.that) if not side.place.standard]
    fewest = min(float(side.panel.exposure.sum()) for side in counted)
    standard = found.that.place.standard
    by_cause = found.explained.causes is not None
    asked_by_cause = found.heading.causes and not standard
    return [
        basis.safe_side(indicators.find(found.question.of), fewest),
        beside_say.printed_table(standard) if standard else None,
        beside_say.regrouped(
            [_named(found, side) for side in found.regrouped],
            _("{count} groups", count=len(found.grid)),
            found.grid.open_age,
        )
        if found.regrouped
        else None,
        beside_say.counted_twice(tables.counted_twice(found, found.overlap))
        if found.overlap and not found.same and found.kind == "plain"
        else None,
        (_("Not compared"), why_not_parted(found)) if why_not_parted(found) else None,
        ages_say.arithmetic() if not found.same else None,
        causes_say.kept() if by_cause and not found.same else None,
        causes_say.differ() if asked_by_cause and not by_cause and not found.same else None,
        *basis.reading(found.settings),
    ]


def _named(found: Comparison, side: Side) -> str:
    return tables.named(found, side).whole


def _moved_before(session: Session, found: Comparison, late: list[Side]) -> basis.Told:
    asked = found.question
    return provisional.caution(
        session, found.heading, found.holdings, asked.settings, asked.figures, any_=bool(late)
    )


def _overturned(session: Session, found: Comparison) -> basis.Told:
    """What would take the claim away, beside how far late deaths moved provisional years before."""
    needed = overturned(found)
    if needed is None:
        return None
    side = needed.side
    told = over.Needed(_named(found, side), needed.deaths)
    kind = charts.asked(found, found.question.of).kind
    return over.told(kind, told, _late(session, found, side))


def _late(session: Session, found: Comparison, side: Side) -> str:
    if side.loaded.status != "provisional":
        return ""
    asked, place = found.question, side.place
    past = track(session, place.heading, asked.settings, asked.figures)
    if not past or not math.isfinite(past.median_deaths) or past.most_deaths is None:
        return over.late_unknown()
    return over.late_deaths(percent(past.median_deaths), percent(abs(past.most_deaths.deaths)))


def _break_between(found: Comparison) -> basis.Told:
    """A break between the years of two sides in one edition."""
    if found.kind not in ("plain", "rest"):
        return None
    both = tables.pair(found)
    first, last = sorted((found.this.of.period, found.that.of.period))
    return of_breaks.lies_between(
        found.holdings.parted(first, last, found.this.of.area, found.that.of.area),
        *sorted((both.that.period, both.this.period)),
    )


def _recoded(found: Comparison) -> list[basis.Told]:
    """Breaks of the coding of causes between the years of two sides in one edition."""
    of = found.explained.causes
    if of is None or found.same or found.kind not in ("plain", "rest"):
        return []
    labels = {one.code: _(one.label or one.code) for one in found.holdings.causes}
    areas = {"", found.this.of.area, found.that.of.area}
    own = [one for one in found.holdings.breaks if one.cause and one.area in areas]
    applied = {(one.period, one.cause) for one in of.ratios}
    years: dict[str, list[str]] = {}
    for one in between(own, found.this.of.period, found.that.of.period):
        years.setdefault(one.period, []).append(one.cause)
    return [
        causes_say.recoded(
            year,
            list(dict.fromkeys(labels.get(cause, cause) for cause in causes)),
            applied=all((year, cause) in applied for cause in causes),
        )
        for year, causes in sorted(years.items())
    ]


def _whole(side: Side) -> str:
    """Name of the area that a side is part of; of a rest that which it is the rest of."""
    held, area = side.place.holdings, side.of.area
    if side.place.rest:
        return held.name(area)
    parent = next((one.parent for one in held.areas if one.code == area), "")
    return held.name(parent) if parent else ""


def why_not_parted(found: Comparison) -> str:
    """Why H has no contributions; empty where it has them, or nothing could differ."""
    if "H" in found.explained.contributions or found.same:
        return ""
    return reason(int(found.difference["H"].reason), found.settings)
