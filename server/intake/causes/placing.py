"""A cause list as rows are placed in it: what each text of a column of causes means."""

import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import cached_property

from server.intake import vocabulary
from server.intake.causes.codes import ICD_10, Code, Notation, Range, notation
from server.intake.causes.lists import BUILT_IN, OWN
from server.intake.folding import folded
from server.intake.labels import is_total, not_stated
from server.intake.mapping import OF_CAUSES, Mapping
from server.store.records import Cause

_ALL_CAUSES = frozenset(vocabulary.ALL_CAUSES.split("|"))
_NOT_STATED = frozenset(vocabulary.CAUSE_NOT_STATED.split("|"))
_ENDS = r"[A-Za-z]?\d[\d.]*(?: ?[-–] ?[A-Za-z]?\d[\d.]*)?"
_LABELLED = re.compile(rf"{_ENDS}(?:, ?{_ENDS})*")


@dataclass(frozen=True, slots=True)
class Meaning:
    """What one text says, as far as the list knows it."""

    kind: str  # "all", "not_stated", "entry", "codes", "several", "unknown", "unreadable"
    entry: int = -1  # of "entry": number in the list; of "codes": the leaf that holds them
    ranges: tuple[Range, ...] = ()  # of "codes" and "several"


LONG = 10  # leaves of a list that parts all causes finely
LETTERS = 10  # of ranges with two digits, in a list by ICD-10
UNREADABLE = Meaning("unreadable")


@dataclass(frozen=True)
class CauseList:
    """`causes` in the order of the list; entries are known by their numbers in it."""

    causes: tuple[Cause, ...]
    notation: Notation = ICD_10

    @property
    def is_icd_10(self) -> bool:
        """Whether rules stated in codes of ICD-10 hold for it."""
        return self.notation is ICD_10

    @cached_property
    def number(self) -> dict[str, int]:
        return {cause.code: at for at, cause in enumerate(self.causes)}

    @cached_property
    def parents(self) -> tuple[int, ...]:
        """Number of the entry that each is part of; -1 at the top."""
        return tuple(self.number.get(cause.parent, -1) for cause in self.causes)

    @cached_property
    def leaves(self) -> tuple[int, ...]:
        inner = set(self.parents)
        return tuple(at for at in range(len(self.causes)) if at not in inner)

    @cached_property
    def under(self) -> tuple[frozenset[int], ...]:
        """Leaves at or under each entry."""
        found: list[set[int]] = [set() for _ in self.causes]
        for leaf in self.leaves:
            at = leaf
            while at >= 0 and leaf not in found[at]:
                found[at].add(leaf)
                at = self.parents[at]
        return tuple(map(frozenset, found))

    @cached_property
    def ranges(self) -> tuple[tuple[Range, int], ...]:
        """Each range with its leaf, those that name most digits first."""
        found = [
            (one, leaf)
            for leaf in self.leaves
            for text in self.causes[leaf].ranges
            for one in self.notation.ranges(text) or ()
        ]
        return tuple(sorted(found, key=lambda item: -item[0].fine))

    @cached_property
    def _named(self) -> dict[str, int]:
        labels = {folded(cause.label): at for at, cause in enumerate(self.causes)}
        return labels | {folded(cause.code): at for at, cause in enumerate(self.causes)}

    def leaf_of(self, code: Code) -> int:
        """The leaf that holds a code; -1: none."""
        return next((leaf for one, leaf in self.ranges if one.holds(code)), -1)

    def read(self, text: str) -> Meaning:
        """An entry by its code or label, a code or ranges of codes, all causes, or not stated."""
        said = folded(text)
        if said in self._named:
            return Meaning("entry", self._named[said])
        if said in _ALL_CAUSES or is_total(text):
            return Meaning("all")
        if said in _NOT_STATED or not_stated(text):
            return Meaning("not_stated")
        ranges = self.notation.ranges(text) or self._before_words(text)
        return self._placed(ranges) if ranges else UNREADABLE

    def _before_words(self, text: str) -> tuple[Range, ...] | None:
        """Codes with their words behind them, or in brackets: "I21 Acute infarction"."""
        match = _LABELLED.match(text.strip())
        if match and match[0][0].isalpha() and text.strip()[match.end() :][:1] in (" ", ":", ""):
            return self.notation.ranges(match[0])
        bracket = re.search(r"[(\[]([^()\[\]]+)[)\]]\s*$", text)
        return self.notation.ranges(bracket[1]) if bracket else None

    def _placed(self, ranges: tuple[Range, ...]) -> Meaning:
        if len(ranges) == 1 and ranges[0].first == ranges[0].last:
            leaf = self.leaf_of(ranges[0].first)
            return Meaning("codes", leaf, ranges) if leaf >= 0 else Meaning("unknown")
        touched = {leaf for one, leaf in self.ranges for other in ranges if one.meets(other)}
        if not touched:
            return Meaning("unknown")
        if self._is_all(touched):
            return Meaning("all")
        inside = {leaf for leaf in touched if self._inside(leaf, ranges)}
        for at in range(len(self.causes)):
            if self.under[at] == touched == inside:
                return Meaning("entry", at)
        if len(touched) == 1:
            return Meaning("codes", touched.pop(), ranges)
        return Meaning("several", -1, ranges)

    def _is_all(self, touched: set[int]) -> bool:
        """Whether ranges that touch these leaves mean all causes. In a long list one may be
        lacking: new diseases have codes beside the chapters, which A00-R99, V01-Y98 leaves out."""
        counted = {at for at in self.leaves if self.causes[at].kind != "not_underlying"}
        return len(counted) > 1 and len(counted - touched) <= (len(counted) >= LONG)

    def _inside(self, leaf: int, ranges: Iterable[Range]) -> bool:
        """Whether some ranges hold all of a leaf."""
        own = (one for one, at in self.ranges if at == leaf)
        return all(any(other.covers(one) for other in ranges) for one in own)

    def path(self, at: int) -> Iterator[int]:
        """An entry and those it is part of."""
        while at >= 0:
            yield at
            at = self.parents[at]


def own_list(causes: tuple[Cause, ...]) -> CauseList:
    """A list of the user's own, in the notation of its ranges."""
    found = notation(text for cause in causes for text in cause.ranges)
    two = [letters for letters, digits in found.digits.items() if letters and digits == 2]
    return CauseList(causes, ICD_10 if len(two) >= LETTERS else found)


LISTS: dict[str, CauseList] = {name: CauseList(causes) for name, causes in BUILT_IN.items()}


def causes_of(role: str, mapping: Mapping, own: CauseList | None) -> CauseList | None:
    """The list that a file goes by; None where its deaths are not by cause."""
    if not by_cause(role, mapping):
        return None
    return own if mapping.cause_list == OWN else LISTS.get(mapping.cause_list)


def by_cause(role: str, mapping: Mapping) -> bool:
    """Whether a file counts deaths by cause, in a column or across."""
    return role in OF_CAUSES and bool(mapping.cause or "cause" in mapping.form.across)
