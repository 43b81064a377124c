"""Whether texts are causes of death, and how they fall into a list of causes."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.intake.causes.codes import ICD_10
from server.intake.causes.lists import BUILT_IN
from server.intake.causes.placing import LISTS

MOSTLY = 0.9  # share of the texts of a column of causes that a list knows
SOME = 3  # letters of codes, or entries of a list, that make a column one of causes
LONGEST = 2  # digits behind the point; codes of areas have more


@dataclass(frozen=True, slots=True)
class Fallen:
    """How the texts of a file fall into a list: leaf by leaf those that do, and those that do
    not."""

    leaves: tuple[tuple[str, tuple[str, ...]], ...]  # label of a leaf, and its texts
    sums: tuple[str, ...]  # groups, ranges of several causes, all causes
    lost: tuple[str, ...]  # texts in no cause of the list

    @property
    def placed(self) -> int:
        return sum(len(texts) for _, texts in self.leaves)


def are_causes(texts: Sequence[str]) -> bool:
    """Whether some texts are codes of ICD-10, or entries of a list that comes with the program.

    >>> are_causes(["I21.9", "C34", "X64"]), are_causes(["E06000001", "W06000002", "S12000005"])
    (True, False)
    """
    known = [text for text in texts if is_cause(text)]
    codes = [ICD_10.ranges(text) or () for text in known]
    letters = {part.first.letters for ranges in codes for part in ranges} - {""}
    entries = {LISTS["short"].read(text).entry for text in known} - {-1}
    return len(known) >= MOSTLY * len(texts) and max(len(letters), len(entries)) >= SOME


def is_cause(text: str) -> bool:
    """Whether a single text may be a cause."""
    found = LISTS["short"].read(text)
    known = found.kind not in ("unknown", "unreadable")
    return known and all(len(part.first.tail) <= LONGEST for part in found.ranges)


def fallen(texts: Sequence[str], name: str) -> Fallen | None:
    """How texts fall into a list that comes with the program; None for another."""
    if name not in BUILT_IN:
        return None
    causes = LISTS[name]
    leaves: dict[int, list[str]] = {leaf: [] for leaf in causes.leaves}
    sums, lost = [], []
    for text in texts:
        meaning = causes.read(text)
        if meaning.entry in leaves:
            leaves[meaning.entry].append(text)
        elif meaning.kind in ("unknown", "unreadable"):
            lost.append(text)
        elif meaning.kind != "not_stated":
            sums.append(text)
    told = tuple((causes.causes[at].label, tuple(some)) for at, some in leaves.items() if some)
    return Fallen(told, tuple(sums), tuple(lost))
