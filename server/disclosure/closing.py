"""Which further counts must be withheld, so that no withheld one can be worked out.

A count below the threshold must be free to be any other such count, up and down, while everything
shown stays as it is. In a network that is so where the two ends of its edge are joined by a path of
withheld edges that are *thick*: each can give up as much as the threshold asks. The cheapest such
path is withheld, counts already withheld being free of charge.
"""

from dataclasses import dataclass, field

import numpy as np

from engine.ages import Array
from server.disclosure.blocks import MODES, TOTAL, Block, Bools, Ints, Network, network

_HOPS = 16  # edges of the longest path looked for
_FREE = (
    1e-6  # what it costs to use an edge that is withheld already: a tie goes to the shorter path
)


@dataclass(slots=True)
class Closed:
    """What is withheld, [slot, sex]; and what could not be protected."""

    hidden: Bools
    exposed: list[int] = field(default_factory=list)  # slots without any way to stay unknown
    narrow: list[int] = field(default_factory=list)  # slots whose range is less than was asked for


def close(of: Block, primary: Bools, sticky: Bools, fresh: Bools, threshold: float) -> Closed:
    """`primary` must not be guessed, `sticky` were withheld before, and only `fresh` numbers, which
    no earlier edition has, can protect: all [slot, sex].

    Persons first, since what protects them protects women and men too; then women and men, who
    protect each other where persons are shown.
    """
    done = Closed(primary | sticky)
    need = primary & (~sticky | fresh)  # an old number is protected as it was
    few, larger = need[:, 2].copy(), np.nan_to_num(of.values[:, 1]) > np.nan_to_num(of.values[:, 0])
    room = np.where(of.held, np.maximum(of.values - np.minimum(of.values, 1.0), 0.0), 0.0)
    for mode in MODES:
        net = network(of, mode)
        targets = need & net.members
        if 2 in mode:
            sex, other = mode[0], 1 - mode[0]
            # women or men by themselves only where the other sex cannot protect them
            targets[:, sex] &= few | ~(fresh & of.held)[:, other]
            targets[:, 2] &= (larger == (sex == 1)) | ~of.held[:, other]
        need &= ~targets
        wanted = np.flatnonzero(targets.any(axis=1))
        if len(wanted):
            capacity = np.where(net.members[:, :2], room[:, :2], np.inf).min(axis=1)
            capacity = np.where(np.isinf(capacity), room[:, 2], capacity)
            usable = np.asarray(~(net.members & ~fresh).any(axis=1) & net.members.any(axis=1))
            way = _Way(of, net, usable, capacity, done.hidden)
            way.protect(wanted, max(threshold - 2, 1.0), done)
    return done


class _Way:
    """Paths of one mode."""

    def __init__(
        self, of: Block, net: Network, usable: Bools, capacity: Array, hidden: Bools
    ) -> None:
        self.net, self.usable, self.capacity, self.hidden = net, usable, capacity, hidden
        self.price = _prices(of)
        self.joined = list(range(net.nodes))

    def protect(self, wanted: Ints, asked: float, done: Closed) -> None:
        targets = np.zeros(len(self.usable), bool)
        targets[wanted] = True
        thick = self.usable & (self.capacity >= asked) & ~targets
        withheld = (self.hidden | ~self.net.members).all(axis=1)
        for slot in np.flatnonzero(thick & withheld).tolist():
            self._join(slot)
        for slot in wanted.tolist():
            self._hide(slot)
        edges = self._edges(thick)
        for slot in wanted[np.argsort(-self.capacity[wanted], kind="stable")].tolist():
            tail, head = int(self.net.tail[slot]), int(self.net.head[slot])
            if not self.usable[slot]:
                done.exposed.append(slot)
                continue
            if self._root(tail) == self._root(head):
                continue
            path = self._path(tail, head, edges)
            for step in path:
                self._join(step)
            if not path:
                path = self._path(tail, head, self._edges(thick | self._wholes(slot)))
            if not path:
                path, wide = self._thin(tail, head, slot, asked)
                if not (path and wide):
                    (done.narrow if path else done.exposed).append(slot)
            for step in path:
                self._hide(step)
                edges.length[edges.of == step] = _FREE

    def _hide(self, slot: int) -> None:
        self.hidden[slot] |= self.net.members[slot]

    def _wholes(self, slot: int) -> Bools:
        """The same age in the areas this one is part of: a count there moves with the one here, of
        which it has at least as many to give up."""
        found = np.zeros(len(self.usable), bool)
        node = int(self.net.head[slot])
        while node > 0:
            above = np.flatnonzero(self.net.tail == node)
            found[above] = True
            node = int(self.net.head[above[0]]) if len(above) else 0
        return found & self.usable

    def _thin(self, tail: int, head: int, slot: int, asked: float) -> tuple[list[int], bool]:
        """The thickest path there is, empty where the equations leave none; and whether it is wide
        enough all the same, for those who cannot know that none of its counts is 0."""
        others = self.usable.copy()
        others[slot] = False
        for least in (*np.arange(asked - 1, 0, -1.0).tolist(), 0.0):
            edges = self._edges(others & (self.capacity >= least))
            if path := self._path(tail, head, edges):
                return path, least >= asked - 1
        return [], False

    def _root(self, node: int) -> int:
        while self.joined[node] != node:
            self.joined[node] = self.joined[self.joined[node]]
            node = self.joined[node]
        return node

    def _join(self, slot: int) -> None:
        one, other = self._root(int(self.net.tail[slot])), self._root(int(self.net.head[slot]))
        self.joined[max(one, other)] = min(one, other)

    def _edges(self, which: Bools) -> "_Edges":
        slots = np.flatnonzero(which)
        tail, head = self.net.tail[slots], self.net.head[slots]
        price = (~self.hidden[slots] & self.net.members[slots]) * self.price[slots]
        length = price.sum(axis=1) + _FREE
        return _Edges(
            np.tile(slots, 2),
            np.concatenate([tail, head]),
            np.concatenate([head, tail]),
            np.tile(length, 2),
        )

    def _path(self, tail: int, head: int, edges: "_Edges") -> list[int]:
        """Slots of the cheapest path from one node to another (Bellman and Ford's)."""
        way = np.full(self.net.nodes, np.inf)
        way[tail] = 0.0
        came = np.full(self.net.nodes, -1)
        for _hop in range(_HOPS):
            reached = way[edges.begin] + edges.length
            better = np.flatnonzero(reached < np.minimum(way, way[head])[edges.end])
            if not len(better):
                break
            order = better[np.lexsort((better, reached[better]))[::-1]]  # the best is written last
            way[edges.end[order]] = reached[order]
            came[edges.end[order]] = order
        found: list[int] = []
        node = head
        while node != tail:
            step = int(came[node])
            if step < 0:
                return []
            found.append(int(edges.of[step]))
            node = int(edges.begin[step])
        return found


@dataclass(frozen=True, slots=True)
class _Edges:
    """Slots as edges of both directions, [edge]; `length` is what is lost by withholding one."""

    of: Ints
    begin: Ints
    end: Ints
    length: Array


def _prices(of: Block) -> Array:
    """What is lost with a count, [slot, sex]: above all a count, more in sums and in areas with
    parts, on which more rests; among equals more for more deaths."""
    price = 1.0 + 0.1 * np.log1p(np.maximum(np.nan_to_num(of.values), 0.0))
    price += 6.0 * (of.start == TOTAL)[:, None] + 12.0 * of.inner[:, None]
    price[:, 2] *= 1.5
    return np.asarray(price)
