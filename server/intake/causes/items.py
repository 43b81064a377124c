"""The causes that the rows of one file speak of, as a tree: all causes, the entries of the list,
and the codes or ranges of codes under them."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from server.intake.causes.codes import Code, Range
from server.intake.causes.placing import CauseList, Meaning
from server.intake.cells import UNREADABLE, Flags, Ints

ALL = 0  # the item of all causes; entries of the list follow in its order


@dataclass(frozen=True, slots=True)
class Items:
    """All arrays are [item]; items are known by their numbers."""

    list: CauseList
    of_text: Ints  # [text], the last for a blank; UNREADABLE where a text is no cause
    parent: Ints  # the item each is part of; of ALL and of what is beside the tree: -1
    leaf: Ints  # number of the leaf it is at or under; -1: above the leaves, or not stated
    meanings: tuple[Meaning, ...]

    def __len__(self) -> int:
        return len(self.parent)

    @property
    def entries(self) -> int:
        return len(self.list.causes)

    @property
    def not_stated(self) -> int:
        return self.entries + 1

    @property
    def is_leaf(self) -> Flags:
        """Whether it is a leaf of the list itself, no code under one."""
        at = np.arange(len(self))
        return np.asarray((self.leaf >= 0) & (at == self.leaf + 1))

    @property
    def depth(self) -> Ints:
        """Steps up to all causes; -1 beside the tree."""
        depth = np.where(self.beside, -1, 0)
        at = self.parent.copy()
        while (at >= 0).any():
            depth += at >= 0
            at = np.where(at >= 0, self.parent[at], -1)
        return depth

    @property
    def beside(self) -> Flags:
        """Ranges of several causes of the list, which are sums and no part of its tree."""
        return np.array([one.kind == "several" for one in self.meanings], bool)

    @property
    def single(self) -> Flags:
        """Single codes."""
        return np.array([_is_single(one) for one in self.meanings], bool)

    def ancestors(self, at: Ints) -> Iterator[Ints]:
        """What some items are part of, step by step up."""
        above = self.parent[at]
        while (above >= 0).any():
            above = above[above >= 0]
            yield above
            above = self.parent[above]

    def members(self, at: int, among: Ints) -> Ints:
        """Of some items, those within a range beside the tree: each with no other above it."""
        ranges = self.meanings[at].ranges
        inside = [one for one in among.tolist() if self._within(one, ranges)]
        held = set(inside)
        return np.array([one for one in inside if not held & set(self._above(one))], np.int64)

    def ranges(self, at: int) -> tuple[Range, ...]:
        """The codes that an item holds, as far as it says."""
        if 0 < at <= self.entries:
            leaves = self.list.under[at - 1]
            return tuple(one for one, leaf in self.list.ranges if leaf in leaves)
        return self.meanings[at].ranges if self.meanings[at].kind == "codes" else ()

    def sex(self, at: int) -> str:
        """The sex that an item befalls alone, as the list says; empty: both."""
        entry = at - 1 if 0 < at <= self.entries else int(self.leaf[at])
        return self.list.causes[entry].sex if entry >= 0 else ""

    def kinds(self) -> NDArray[np.object_]:
        """Of the leaf that each item is at or under; empty above the leaves."""
        named = [cause.kind for cause in self.list.causes]
        return np.array([*named, ""], object)[self.leaf]

    def _within(self, at: int, ranges: tuple[Range, ...]) -> bool:
        own = self.ranges(at)
        return bool(own) and all(any(other.covers(one) for other in ranges) for one in own)

    def _above(self, at: int) -> Iterator[int]:
        while (at := int(self.parent[at])) >= 0:
            yield at

    def apart(self, of: Flags) -> "Items":
        """With some codes taken for causes of their own beside longer ones that begin with them."""
        parent = self.parent.copy()
        while (again := (parent >= 0) & of[parent]).any():
            parent = np.where(again, parent[parent], parent)
        return replace(self, parent=parent)


def items_of(texts: Sequence[str], causes: CauseList) -> Items:
    """Items of the distinct texts of a column."""
    count = len(causes.causes)
    meanings = [Meaning("all"), *(Meaning("entry", at) for at in range(count))]
    meanings.append(Meaning("not_stated"))
    parent = [UNREADABLE, *(at + 1 for at in causes.parents), ALL]
    leaves = set(causes.leaves)
    leaf = [-1, *(at if at in leaves else -1 for at in range(count)), -1]
    number: dict[tuple[Range, ...], int] = {}
    of_text = []
    for text in texts:
        meaning = causes.read(text)
        if meaning.kind in ("codes", "several") and meaning.ranges not in number:
            number[meaning.ranges] = len(meanings)
            meanings.append(meaning)
            parent.append(meaning.entry + 1 if meaning.kind == "codes" else -1)
            leaf.append(meaning.entry)
        of_text.append(_item(meaning, number, count))
    wide = [
        (ranges, at)
        for ranges, at in number.items()
        if meanings[at].kind == "codes" and not _is_single(meanings[at])
    ]
    for ranges, at in number.items():
        if meanings[at].kind == "codes":
            of_leaf = [one for one in wide if leaf[one[1]] == leaf[at]]
            parent[at] = _above(ranges, number, of_leaf, parent[at])
    return Items(
        list=causes,
        of_text=np.array([*of_text, UNREADABLE], np.int64),
        parent=np.array(parent, np.int64),
        leaf=np.array(leaf, np.int64),
        meanings=tuple(meanings),
    )


def _item(meaning: Meaning, number: dict[tuple[Range, ...], int], count: int) -> int:
    if meaning.kind in ("codes", "several"):
        return number[meaning.ranges]
    if meaning.kind == "entry":
        return meaning.entry + 1
    return {"all": ALL, "not_stated": count + 1}.get(meaning.kind, UNREADABLE)


def _is_single(meaning: Meaning) -> bool:
    ranges = meaning.ranges
    return meaning.kind == "codes" and len(ranges) == 1 and ranges[0].first == ranges[0].last


def _above(
    ranges: tuple[Range, ...],
    number: dict[tuple[Range, ...], int],
    wide: Sequence[tuple[tuple[Range, ...], int]],
    leaf: int,
) -> int:
    """The smallest code, or of `wide` the smallest range, that holds some ranges of the same leaf;
    else the leaf."""
    if len(ranges) == 1 and ranges[0].first == ranges[0].last:
        code = ranges[0].first
        for digits in range(len(code.tail) - 1, -1, -1):
            shorter = Code(code.letters, code.number, code.tail[:digits])
            if (at := number.get((Range(shorter, shorter),))) is not None:
                return at
    holding = [
        (other, at)
        for other, at in wide
        if other != ranges and all(any(one.covers(part) for one in other) for part in ranges)
    ]
    smallest = max(holding, key=lambda item: (item[0][0].first, item[1]), default=None)
    return smallest[1] if smallest else leaf
