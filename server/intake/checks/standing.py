"""Checks of an upload against the edition that stands: what was there and does not come again."""

from collections.abc import Iterator

import numpy as np

from server.intake.cells import YEARS, Ints, parts_of
from server.intake.checks.check import Check
from server.intake.checks.series import years_worded
from server.intake.ledger import Ledger
from server.intake.problems import Fault

AGAIN = 0.5  # where more of what stands is handed in again, the rest is missed


def _deaths_held(ledger: Ledger) -> Ints:
    """Places of deaths that stand, of areas handed in, in order."""
    places = [block.place for block in ledger.past if block.measure == "deaths"]
    return np.sort(np.concatenate([np.zeros(0, np.int64), *places]))


def _areas_gone(ledger: Ledger) -> Iterator[Fault]:
    """Areas that stand with deaths and are not handed in, where most others are."""
    if ledger.standing is None or ledger.unplaced or not ledger.of("deaths"):
        return
    handed = {ledger.codes[area] for area in np.unique(parts_of(ledger.places("deaths"))[0])}
    sums = {area.parent for area in ledger.standing.areas}
    held = {key.area for key in ledger.standing.cells if key.measure == "deaths"} - sums
    gone = sorted(held - handed)
    if gone and len(held & handed) > AGAIN * len(held):
        yield Fault(values={"areas": ", ".join(gone)[:200], "count": len(gone)})


def _years_gone(ledger: Ledger) -> Iterator[Fault]:
    """Years that stand and are not handed in, between the first and the last handed in of the area
    and sex, or anywhere where most of its years come again."""
    if not ledger.past or ledger.unplaced:
        return
    handed = np.union1d(ledger.places("deaths"), ledger.spoiled)
    held = _deaths_held(ledger)
    missing = held[~np.isin(held, handed)]
    for series in np.unique(missing // YEARS).tolist():
        own = handed[handed // YEARS == series]
        stood = held[held // YEARS == series]
        lost = missing[missing // YEARS == series]
        if not len(own):
            continue
        if np.isin(stood, own).sum() <= AGAIN * len(stood):
            lost = lost[(lost > own.min()) & (lost < own.max())]
        if len(lost):
            years = years_worded((lost % YEARS).tolist())
            yield Fault(values=ledger.named(int(lost[0])) | {"years": years})


CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="areas_gone",
        severity="warning",
        meaning="Areas of the edition that stands are not handed in, though most of the others "
        "are.",
        why="An area left out by mistake keeps its old numbers in the next edition, and nobody "
        "sees it; and the whole may be made up of old and new parts.",
        found="no deaths for {areas}",
        expected="the areas of the edition that stands",
        remedy="Add the areas; or say in the note that they stay as they are, or have come to an "
        "end.",
        source="Ebbline's own.",
        find=_areas_gone,
    ),
    Check(
        key="years_gone",
        severity="warning",
        meaning="Years of the edition that stands are not handed in, though years around them or "
        "most of the others are.",
        why="A year left out by mistake keeps its old numbers beside revised ones.",
        found="no deaths for {years} in {area}, {sex}",
        expected="the years of the edition that stands",
        remedy="Add the years; or say in the note that they stay as they are.",
        source="Ebbline's own.",
        find=_years_gone,
    ),
)
