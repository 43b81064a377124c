"""What a plain form offers of deaths by cause: which causes, and how they are shown."""

from collections.abc import Iterable
from dataclasses import dataclass

from server.pages.choices import Options
from server.results.causes import CauseChoice
from server.sentences.text import _
from server.store.records import Cause


@dataclass(frozen=True, slots=True)
class CauseLine:
    """One choice of how deaths by cause are shown."""

    key: str
    label: str
    options: Options
    value: str


def name(cause: Cause) -> str:
    """What a cause is called: its label, which is that of the list handed in or one of our own."""
    return _(cause.label or cause.code)


def offered(causes: Iterable[Cause]) -> Options:
    """All causes, and each by itself; nothing where there are none."""
    listed = tuple((one.code, name(one)) for one in causes)
    return (("", _("all causes")), *listed) if listed else ()


def lines(chosen: CauseChoice | None) -> tuple[CauseLine, ...]:
    """A line of the form for each choice; none where the edition has no causes."""
    if chosen is None:
        return ()
    kept, spread = ("kept", _("kept as they are")), ("spread", _("spread"))
    told: dict[str, tuple[str, Options]] = {
        "causes": (
            _("Causes of death"),
            (("groups", _("in groups")), ("causes", _("each by itself"))),
        ),
        "ill_defined": (_("Ill-defined deaths"), (kept, spread)),
        "undetermined": (_("Undetermined intent"), (kept, spread)),
        "ratios": (
            _("Comparability ratios"),
            (("kept", _("not applied")), ("applied", _("applied"))),
        ),
    }
    return tuple(CauseLine(key, *told[key], value) for key, value in chosen.pairs)
