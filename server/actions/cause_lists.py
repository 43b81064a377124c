"""The cause list of an edition to be: one list, that of the newest upload with causes."""

from collections.abc import Callable, Iterable
from dataclasses import dataclass

from server.store.causes import in_tree_order, leaves
from server.store.errors import Refused
from server.store.records import NOT_STATED, Cause, Key


@dataclass(frozen=True, slots=True)
class Laid:
    """See `Change`."""

    causes: tuple[Cause, ...] = ()
    ended: frozenset[str] = frozenset()

    def over(self, base: tuple[Cause, ...]) -> tuple[Cause, ...]:
        """The list of the edition on this base."""
        said = {one.code for one in self.causes}
        return (*(one for one in base if one.code not in said | self.ended), *self.causes)


def laid_over(
    handed: tuple[Cause, ...],
    base: tuple[Cause, ...],
    *,
    new: Iterable[Key],
    gone: frozenset[Key],
    held: Callable[[], Iterable[Key]],
) -> Laid:
    """The list handed in takes the place of the base's. A list of which nothing is counted any
    longer ends; `held` are the schedules of the base, `gone` those that it loses.

    Raises: Refused where the list forms no tree, has the code of no stated cause, or counts that
    stay are of causes that are not, or no longer without parts, in the list handed in.
    """
    listed = in_tree_order(handed)
    _require_free(listed)
    used = {key.cause for key in new if key.cause}
    if unknown := used - _codes((*leaves(listed), *leaves(base))):
        raise ValueError(f"schedules of causes that no list has, or has parts of: {unknown}")
    stood, codes = _codes(base), _codes(listed)
    if listed and _codes(leaves(base)) <= _codes(leaves(listed)):
        return Laid(listed, stood - codes)
    if not base or not (listed or any(key.cause for key in gone)):
        return Laid(listed)
    stay = used | {key.cause for key in held() if key.cause and key not in gone}
    if listed:
        _require_kept(stay, listed)
        return Laid(listed, stood - codes)
    return Laid((), frozenset() if stay else stood)


def _codes(causes: Iterable[Cause]) -> frozenset[str]:
    return frozenset(cause.code for cause in causes)


def _require_free(listed: tuple[Cause, ...]) -> None:
    if NOT_STATED in _codes(listed):
        raise Refused(
            "The list of causes has the code {code}, under which deaths of no stated cause are "
            "shown: all deaths less those of the causes. Give that cause another code, or take it "
            "out of the list and hand in such deaths without a cause.",
            code=NOT_STATED,
        )


def _require_kept(stay: set[str], listed: tuple[Cause, ...]) -> None:
    lacking = sorted(stay - _codes(leaves(listed)))
    if lacking:
        raise Refused(
            "The edition that stands has deaths of causes that the list handed in does not count: "
            "{causes}. An edition has one list. Hand in a list that has these too, or let all that "
            "stands give way.",
            causes=", ".join(lacking[:12]) + (", …" if len(lacking) > 12 else ""),
        )
