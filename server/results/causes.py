"""Deaths by cause of a population-year, and how a reader chooses to see them."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import ClassVar, Self

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.causes.counts import CauseCounts
from server.store import breaks, records
from server.store import causes as lists
from server.store.connect import Session
from server.store.records import Break, Cause

NOT_STATED = Cause(
    records.NOT_STATED, "Cause not stated", kind="ill_defined"
)  # all less the causes
APPLIED, SPREAD, CAUSES = "applied", "spread", "causes"


@dataclass(frozen=True, slots=True)
class CauseChoice:
    """How deaths by cause are shown: the keys of an address, of each the default first."""

    VALUES: ClassVar[Mapping[str, tuple[str, ...]]] = {
        "causes": ("groups", "causes"),
        "ill_defined": ("kept", "spread"),
        "undetermined": ("kept", "spread"),
        "ratios": ("kept", "applied"),
    }

    level: str = "groups"  # the tops of the list, or its causes without parts
    ill_defined: str = "kept"  # or spread over natural causes, within age and sex
    undetermined: str = "kept"  # or spread over external causes
    ratios: str = "kept"  # or applied: earlier years as the coding of later ones would count them

    @classmethod
    def spelled(cls, chosen: "CauseChoice | None", *, held: bool) -> "CauseChoice | None":
        """What a canonical address says: the defaults where it said nothing; nothing of an edition
        that holds no causes."""
        return (chosen or cls()) if held else None

    @property
    def spread(self) -> tuple[str, ...]:
        """Kinds of causes whose deaths are given to others."""
        chosen = {"ill_defined": self.ill_defined, "undetermined": self.undetermined}
        return tuple(kind for kind, value in chosen.items() if value == "spread")

    @property
    def pairs(self) -> list[tuple[str, str]]:
        """The four keys of an address, in their order."""
        values = (self.level, self.ill_defined, self.undetermined, self.ratios)
        return list(zip(self.VALUES, values, strict=True))


@dataclass(frozen=True, slots=True)
class Causes:
    """Deaths of one population-year by cause, which add up to those of its panel at every age.

    `counts.counted` are the deaths under the cause they were delivered with, so that chance is of
    these. A ratio of comparability is uncertain itself: `shifts` is what each one moves where it is
    a standard error higher, an error that all ages and causes share.
    """

    list: tuple[Cause, ...]  # in the order of the cause axis; deaths of no stated cause last
    counts: CauseCounts  # [cause, age], on the panel's grid
    ratios: tuple[Break, ...] = ()  # those applied
    shifts: Array | None = None  # [ratio, cause, age]
    of_kind: Mapping[str, float] = field(default_factory=dict)  # deaths as delivered, by kind
    withheld: NDArray[np.bool_] | None = None  # [cause, age], where some only stand in; None: none


@dataclass(frozen=True, slots=True)
class Listed:
    """The cause list of an edition, and the ratios its breaks of coding state."""

    causes: tuple[Cause, ...]
    ratios: tuple[Break, ...] = ()

    @classmethod
    def read(cls, session: Session, collection: str, number: int, choice: CauseChoice) -> Self:
        """One statement, or two where ratios are applied."""
        found = lists.listing(session, collection, number)
        if choice.ratios != APPLIED or not found:
            return cls(found)
        return cls.chosen(found, breaks.listing(session, collection, number), choice)

    @classmethod
    def chosen(
        cls, causes: tuple[Cause, ...], stated: Iterable[Break], choice: CauseChoice
    ) -> Self:
        """From what is held: the ratios only where they are applied."""
        if choice.ratios != APPLIED:
            return cls(causes)
        return cls(causes, tuple(one for one in stated if one.cause and one.ratio is not None))

    @property
    def leaves(self) -> tuple[Cause, ...]:
        return lists.leaves(self.causes)

    def rows(self, level: str) -> tuple[Cause, ...]:
        """The causes shown, without that of no stated cause."""
        if level == CAUSES:
            return self.leaves
        return tuple(one for one in self.causes if not one.parent)
