"""Counts that did not state their sex, age or area: what was done with them."""

import math
from collections.abc import Mapping

from engine.panel import Panel
from server.sentences.names import listed
from server.sentences.numbers import number, whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _

TINY = 1e-9  # of the deaths: what is left of a sum of millionths


def kind(measure: str) -> str:
    """What is counted, as a row names it."""
    return {
        "deaths": _("deaths"),
        "person_years": _("person-years"),
        "births": _("live births"),
        "stillbirths": _("stillbirths"),
        "neonatal_deaths": _("deaths before 28 days"),
    }[measure]


def report(shared: Mapping[str, float], left_out: Mapping[str, float]) -> str:
    """Above the table of what was done, counts by measure."""
    said = []
    if shared:
        said.append(
            _(
                "{counts} did not state their sex, age or area and were shared out in proportion to"
                " those of the same year that do. The sums are kept.",
                counts=_counts(shared),
            )
        )
    if left_out:
        said.append(
            _("{counts} that do not state all of these were left out.", counts=_counts(left_out))
        )
    return " ".join(said)


def _counts(by_measure: Mapping[str, float]) -> str:
    return listed(
        [
            _("{count} {kind}", count=number(count, decimals(count)), kind=kind(measure))
            for measure, count in by_measure.items()
        ]
    )


def decimals(count: float) -> int:
    """As many as it takes to see that a count is broken."""
    return 0 if count == round(count) or count >= 100 else 1


def how() -> str:
    """Under the table."""
    return _(
        "First those of unknown sex are shared out between women and men, then those of unknown age"
        " over the ages from 1 on (infants are known to be infants), then those of unknown area."
        " Counts of the other kinds are treated like deaths. Intervals allow for chance in the"
        " deaths that were stated."
    )


def computed(*panels: Panel, fits: bool = False) -> tuple[Sentence, ...]:
    """How the deaths of populations on a page came about; empty where all of them were stated. With
    `fits` the page has curves fitted to them."""
    deaths = sum(float(panel.deaths.sum()) for panel in panels)
    shared = deaths - sum(float(panel.counts.sum()) for panel in panels)
    if not shared > TINY * deaths:
        return ()
    said = _(
        "{count} of the {deaths} deaths did not state their sex, age or area. They were shared out"
        " in proportion to those that do; intervals allow for chance in the deaths stated.",
        count=number(shared, decimals(round(shared, 6))),
        deaths=whole(deaths),
    )
    if fits:
        narrow = _(
            "Curves are fitted as if all had been stated, which makes their bands narrower by"
            " {percent} %.",
            percent=number(100 * (1 - math.sqrt(1 - shared / deaths)), 1),
        )
        said = f"{said} {narrow}"
    name = Piece(_("Not stated."), emphasis="strong")
    return (phrase("{name} {sentence}", name=name, sentence=said),)
