"""What the plain forms of pinned pages offer: areas, sexes and years of the edition, indicators in
their groups, and settings."""

from dataclasses import dataclass

from engine import settings as named
from engine.indicators import GROUPS, find
from engine.settings import SETTINGS, span
from server.results.holdings import Holdings
from server.results.questions import PopulationYear, PopulationYearQuestion
from server.sentences import names
from server.sentences.text import _
from server.store.heading import Heading

Options = tuple[tuple[str, str], ...]  # value and label, for a form
Grouped = tuple[tuple[str, Options], ...]  # the options under the label of their group


@dataclass(frozen=True, slots=True)
class Offer:
    """Everything an edition holds, as options; the newest year first."""

    areas: Options
    sexes: Options
    periods: Options
    settings: Options


@dataclass(frozen=True, slots=True)
class Choice:
    """A plain form that leads to another area, sex and year, or to other settings."""

    action: str
    of: PopulationYear
    offer: Offer
    figures: str
    settings: str


def choice(heading: Heading, held: Holdings, asked: PopulationYearQuestion) -> Choice:
    """The form of a page about one population-year."""
    return Choice(
        action=f"/c/{heading.collection.code}/{heading.edition.number}/{asked.view}",
        of=asked.of,
        offer=offer(held, named.find(asked.settings).years),
        figures=asked.figures,
        settings=asked.settings,
    )


def offer(held: Holdings, years: int = 1) -> Offer:
    """What an edition holds; of years added up only those that have enough before them."""
    spans = [(period, span(period, years)) for period in reversed(held.periods)]
    return Offer(
        areas=tuple((area.code, area.name or area.code) for area in held.areas),
        sexes=tuple((sex, names.sex(sex)) for sex in ("f", "m", "p") if sex in held.sexes),
        periods=tuple(
            (period, names.years(added))
            for period, added in spans
            if set(added) <= set(held.periods)
        ),
        settings=tuple((one.key, _(one.label)) for one in SETTINGS.values()),
    )


def indicators(asked: str, *, compared: bool = False) -> Grouped:
    """Every indicator of the registry in its group; the one asked for too, where it names ages or a
    standard of its own. `compared`: without those of which no two compare."""
    groups = tuple(
        (
            _(group.label),
            tuple(
                (one.key, _(one.label))
                for one in group.indicators
                if not (compared and one.needs.whole)
            ),
        )
        for group in GROUPS
    )
    listed = {key for _label, options in groups for key, _text in options}
    own = find(asked)
    return groups if asked in listed else (*groups, (_("As asked"), ((asked, _(own.label)),)))
