"""Figures that were printed before, each matched with an edition of today or explained."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from engine import indicators
from engine import settings as named
from engine.ages import Array
from engine.indicators import Indicator
from engine.settings import SETTINGS, Settings
from server.results.account import Account, AccountQuestion, account
from server.results.headlines import figures
from server.results.keys import PopulationYear
from server.results.loading import Beside, load
from server.results.printed_tables import number
from server.results.series import TooLarge
from server.sentences.numbers import whole
from server.sentences.text import _
from server.store import areas, editions
from server.store.connect import Session
from server.store.heading import Heading, heading
from server.store.records import Area

MOST = 25_000  # looks at a figure of one edition and settings, for one answer: some five seconds
LOST = ("astray", "cut")  # kinds that other editions and settings are asked for
PARTED = 40  # figures whose difference is parted; the others are linked to their account


@dataclass(frozen=True, slots=True)
class Wanted:
    """One printed figure."""

    row: int
    text: str  # as printed
    at: PopulationYear
    of: str  # key of the indicator
    edition: int
    settings: str


@dataclass(frozen=True, slots=True)
class Found:
    """What a printed figure is. `kind`:

    matched:   the stated edition and settings give it, and so does the edition that stands;
    revised:   the stated ones give it, the edition that stands another;
    elsewhere: another edition or other settings give it (`edition`, `settings`);
    cut:       the stated ones give it with its digits cut off instead of rounded;
    withheld:  no number was printed, or today's is withheld or cannot be given;
    astray:    nothing gives it; `account` puts the rest down to the engine.
    """

    wanted: Wanted
    kind: str
    stated: float  # today's figure of the stated edition and settings, as printed; nan: none
    newest: float  # of the edition that stands
    edition: int = 0
    settings: str = ""
    account: Account | None = None

    @property
    def explained(self) -> bool:
        return self.kind in ("revised", "elsewhere", "cut", "withheld")


def reproduced(
    session: Session,
    collection: str,
    wanted: Sequence[Wanted],
    shown: str,
    *,
    most: int | None = None,
) -> tuple[Found, ...]:
    """Each of them, in their order. One statement an edition and settings looked at; an account
    for the first PARTED that need one.

    Raises: TooLarge where it takes more than `most` looks (None: as many as it takes).
    """
    sides = _Sides(session, collection, shown)
    _require_few(2 * len(wanted), most, len(wanted))
    stated = sides.values(wanted)
    now = sides.values([replace(one, edition=sides.standing or one.edition) for one in wanted])
    judged = [_judged(*three) for three in zip(wanted, stated, now, strict=True)]
    lost = sum(one.kind in LOST for one in judged)
    looks = 2 * len(wanted) + lost * len(sides.numbers) * len(SETTINGS)
    _require_few(looks, most, len(wanted), lost)
    elsewhere = _elsewhere(sides, judged)
    found: list[Found] = []
    for at, one in enumerate(judged):
        if at in elsewhere:
            edition, settings = elsewhere[at]
            one = replace(one, kind="elsewhere", edition=edition, settings=settings)
        needs = one.kind in ("revised", "astray") and len(found) < PARTED
        found.append(replace(one, account=sides.account(one)) if needs else one)
    return tuple(found)


def _require_few(looks: int, most: int | None, figures: int, lost: int = 0) -> None:
    if most is None or looks <= most:
        return
    raise TooLarge(
        _(
            "This table has {figures} figures, of which {lost} are not as the stated edition and "
            "settings give them: to look for all of them takes up to {looks} looks, and one answer "
            "makes at most {most}. Hand in a part of the table, or have all of it looked up from a "
            "terminal, where that may take as long as it does: ebbline reproduce FILE",
            figures=whole(figures),
            lost=whole(lost),
            looks=whole(looks),
            most=whole(most),
        )
        if lost
        else _(
            "This table has {figures} figures, which takes {looks} looks, and one answer makes at "
            "most {most}. Hand in a part of the table, or have all of it looked up from a "
            "terminal, where that may take as long as it does: ebbline reproduce FILE",
            figures=whole(figures),
            looks=whole(looks),
            most=whole(most),
        )
    )


def _judged(one: Wanted, value: float, later: float) -> Found:
    """By the stated edition and settings alone."""
    printed = number(one.text)
    base = Found(one, "astray", value, later, one.edition, one.settings)
    if printed is None or not (np.isfinite(value) or np.isfinite(later)):
        return replace(base, kind="withheld")
    if printed.is_of(value):
        return replace(base, kind="matched" if printed.is_of(later) else "revised")
    return replace(base, kind="cut") if printed.is_cut_from(value) else base


def _elsewhere(sides: "_Sides", judged: Sequence[Found]) -> dict[int, tuple[int, str]]:
    """Which edition and settings give those that the stated ones do not, by their place: other
    editions before other settings."""
    found: dict[int, tuple[int, str]] = {}
    places = [at for at, one in enumerate(judged) if one.kind in LOST]
    for turn in range(len(SETTINGS)):
        for edition in sides.numbers:
            left = [at for at in places if at not in found]
            if not left:
                return found
            asked = [
                replace(one, edition=edition, settings=_turned(one.settings, turn))
                for one in (judged[at].wanted for at in left)
            ]
            for at, one, value in zip(left, asked, sides.values(asked), strict=True):
                printed = number(one.text)
                if one != judged[at].wanted and printed and printed.is_of(value):
                    found[at] = (edition, one.settings)
    return found


def _turned(settings: str, turn: int) -> str:
    """All settings, one after the other, those stated first."""
    return [settings, *(key for key in SETTINGS if key != settings)][turn]


class _Sides:
    """Editions and settings of a collection, each loaded once for all that is asked."""

    def __init__(self, session: Session, collection: str, shown: str) -> None:
        self.session, self.collection, self.shown = session, collection, shown
        all_ = editions.listing(session, collection)
        self.numbers = tuple(one.number for one in all_)
        self.standing = next((one.number for one in all_ if not one.withdrawn), 0)
        self._trees: dict[int, tuple[Area, ...]] = {}
        self._known: dict[tuple[int, str, str], dict[PopulationYear, float]] = {}

    def values(self, wanted: Sequence[Wanted]) -> list[float]:
        """Today's figures, as printed (in the unit of print); nan where there is none."""
        groups: dict[tuple[int, str, str], set[PopulationYear]] = {}
        for one in wanted:
            groups.setdefault((one.edition, one.settings, one.of), set()).add(one.at)
        for group, ones in groups.items():
            self._load(*group, ones)
        return [
            self._known[one.edition, one.settings, one.of].get(one.at, float("nan"))
            for one in wanted
        ]

    def _load(self, edition: int, settings: str, of: str, ones: set[PopulationYear]) -> None:
        known = self._known.setdefault((edition, settings, of), {})
        missing = sorted(ones - known.keys())
        if not missing or edition not in self.numbers:
            return
        chain, indicator = named.find(settings), indicators.find(of)
        column = self._figures(edition, chain, indicator, missing)
        known.update(zip(missing, (indicator.unit.scale * column).tolist(), strict=True))

    def _figures(
        self, edition: int, chain: Settings, of: Indicator, ones: Sequence[PopulationYear]
    ) -> Array:
        if edition not in self._trees:
            self._trees[edition] = areas.listing(self.session, self.collection, edition)
        beside = Beside.of(chain, self._trees[edition], of)
        loaded = load(self.session, self.collection, edition, ones, beside, figures=self.shown)
        return np.asarray(figures(loaded, ones, chain, [of.key])[of.key])

    def account(self, found: Found) -> Account | None:
        """What moved it from the stated edition to the one that stands; None where neither of the
        two can be parted."""
        one = found.wanted
        known: Heading = heading(self.session, self.collection, self.standing or one.edition)
        printed = one.text.replace(",", "").replace("\N{MINUS SIGN}", "-").rstrip("p ")
        question = AccountQuestion(
            one.at, one.edition, one.of, self.shown, one.settings, one.settings, printed
        )
        made = account(self.session, known, question)
        return made if made.shares is not None else None
