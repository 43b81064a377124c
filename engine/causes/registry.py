"""Every number that a cause of death has in a life table, in the order of a reader's questions."""

from engine.causes import decrements, deletion, losses
from engine.causes.number import CauseNumber

NUMBERS: dict[str, CauseNumber] = {
    one.key: one for one in (*decrements.FAMILY, *losses.FAMILY, *deletion.FAMILY)
}
