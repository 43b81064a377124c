"""Checks of the shares of causes, against the year before and the edition that stands."""

from collections import defaultdict
from collections.abc import Iterator

import numpy as np

from server.intake.causes.profiles import LEAST, Line, Profiles, Step, listed, steps
from server.intake.checks.check import Check
from server.intake.problems import Fault, Problem

FAR = 6.0  # standard errors beyond which a step is told
CHANGE = 0.3  # and share of the larger share by which it must have moved
SOME = 20  # deaths by which it must have moved
EXPECTED = 15  # deaths expected of a cause that has none
ILL_DEFINED, JUMP = 0.20, 0.04  # share of deaths, and step of that share
PENDING = 0.05  # share of a final year


def _told(profiles: Profiles, step: Step, at: int) -> Fault:
    before, after = (round(100 * float(shares[at]), 1) for shares in step.shares)
    return Fault(
        values={
            "area": step.area,
            "cause": profiles.leaves[at].label,
            "year": str(step.last),
            "first": str(step.first),
            "before": before,
            "after": after,
        }
    )


def _moved(profiles: Profiles) -> Iterator[tuple[Step, int]]:
    """Steps of a leaf that are far beyond chance, and where no break of coding is stated."""
    for step in steps(profiles):
        first, last = step.shares
        change = np.abs(last - first)
        far = (np.abs(step.z) > FAR) & (change > CHANGE * np.maximum(first, last))
        far &= change * step.after.total > SOME
        for at in np.flatnonzero(far[:-1]).tolist():
            code = profiles.leaves[at].code
            if not profiles.coding_changed(step.area, step.first, step.last, code):
                yield step, at


def _is_ill_defined(profiles: Profiles, at: int) -> bool:
    return profiles.leaves[at].kind in ("ill_defined", "pending", "not_underlying")


def _gone(step: Step, at: int) -> bool:
    return step.after.counts[at] == 0 and _expected(step.before, step.after, at) > EXPECTED


def _new(step: Step, at: int) -> bool:
    return step.before.counts[at] == 0 and _expected(step.after, step.before, at) > EXPECTED


def _expected(of: Line, among: Line, at: int) -> float:
    return float(of.counts[at] / of.total * among.total)


def _jumps(profiles: Profiles) -> Iterator[Fault]:
    for step, at in _moved(profiles):
        if not (_gone(step, at) or _new(step, at) or _is_ill_defined(profiles, at)):
            yield _told(profiles, step, at)


def _disappears(profiles: Profiles) -> Iterator[Fault]:
    for step, at in _moved(profiles):
        if _gone(step, at) and not _is_ill_defined(profiles, at):
            yield _told(profiles, step, at)


def _appears(profiles: Profiles) -> Iterator[Fault]:
    for step, at in _moved(profiles):
        if _new(step, at) and not _is_ill_defined(profiles, at):
            yield _told(profiles, step, at)


def _vague(profiles: Profiles, line: Line) -> float:
    """Share of deaths that say nothing of their cause; pending ones only where a year is final."""
    kinds = ("ill_defined", "not_underlying", *(() if line.provisional else ("pending",)))
    return float(line.counts[profiles.shares(*kinds)].sum() / line.total)


def _ill_defined(profiles: Profiles) -> Iterator[Fault]:
    for (area, year), line in profiles.lines.items():
        if line.total >= LEAST and (share := _vague(profiles, line)) > ILL_DEFINED:
            yield Fault(values={"area": area, "year": str(year), "share": round(100 * share, 1)})


def _ill_defined_jumps(profiles: Profiles) -> Iterator[Fault]:
    for step in steps(profiles):
        if step.before.provisional != step.after.provisional:
            continue
        before, after = (_vague(profiles, line) for line in (step.before, step.after))
        vague = profiles.shares("ill_defined", "not_underlying", "pending")
        far = np.abs(step.z[vague]).max() > FAR
        if far and abs(after - before) > JUMP:
            values = {"before": round(100 * before, 1), "after": round(100 * after, 1)}
            named = {"area": step.area, "year": str(step.last), "first": str(step.first)}
            yield Fault(values={**named, **values})


def _still_pending(profiles: Profiles) -> Iterator[Fault]:
    """Final years with many deaths whose cause is not yet known."""
    waiting = profiles.shares("pending", without=False)
    for (area, year), line in profiles.lines.items():
        if line.total < LEAST or line.provisional:
            continue
        share = float(line.counts[waiting].sum() / line.total)
        first = profiles.year_before(area, year)
        before = profiles.at(area, first) if first else None
        usual = float(before.counts[waiting].sum() / before.total) if before else 0.0
        if share > max(PENDING, 2 * usual):
            yield Fault(values={"area": area, "year": str(year), "share": round(100 * share, 1)})


def _list_changed(profiles: Profiles) -> Iterator[Fault]:
    stood, now = listed(profiles.standing.causes), listed(profiles.causes)
    if stood and now and stood != now:
        codes = sorted({cause.code for cause in stood ^ now})
        yield Fault(values={"count": len(codes), "codes": ", ".join(codes)[:200]})


def _left_out(profiles: Profiles) -> Iterator[Fault]:
    """Years handed in without causes of which causes stand."""
    died = {(key.area, key.period) for key in profiles.own if key.measure == "deaths"}
    parted = {(key.area, key.period) for key in profiles.own if key.cause}
    stood = {(key.area, key.period) for key in profiles.standing.held if key.cause}
    by_area: dict[str, list[str]] = defaultdict(list)
    for area, year in sorted((died - parted) & stood):
        by_area[area].append(year)
    for area, years in by_area.items():
        yield Fault(values={"area": area, "years": ", ".join(years)[:200]})


CHECKS: tuple[Check[Profiles], ...] = (
    Check(
        key="cause_list_changed",
        severity="warning",
        meaning="The list of causes is another than that of the edition that stands. Years under "
        "the old list cannot be read under the new one.",
        found="{count} causes that are new, gone or otherwise made up: {codes}",
        expected="the list of the edition that stands",
        remedy="Hand in all years under the new list, or go by the old one.",
        find=_list_changed,
    ),
    Check(
        key="causes_left_out",
        severity="warning",
        meaning="Deaths are handed in without causes for years of which the edition that stands "
        "has causes.",
        found="deaths in {area} without causes for {years}",
        expected="deaths by cause, as they stand",
        remedy="Hand in the deaths by cause; else these years have causes no longer.",
        find=_left_out,
    ),
    Check(
        key="ill_defined_high",
        severity="warning",
        meaning="A large share of deaths says nothing of its cause: signs and symptoms, codes that "
        "are no underlying cause, or no cause at all; in a final year also causes not yet known.",
        why="Where a fifth of deaths has no usable cause, ranks and courses of the other causes "
        "cannot be relied on.",
        found="{share} % of deaths in {area}, {year}",
        expected="fewer than 20 %",
        remedy="Ask how causes are certified and coded. Say in the note that shares of causes are "
        "doubtful.",
        source="Mahapatra et al. (2007), Civil registration systems and vital statistics: "
        "successes and missed opportunities, The Lancet 370",
        find=_ill_defined,
    ),
    Check(
        key="ill_defined_jumps",
        severity="warning",
        meaning="The share of deaths that say nothing of their cause changed at once, so that all "
        "other causes moved with it.",
        found="{after} % of deaths in {area}, {year}, after {before} % in {first}",
        expected="a share that changes slowly",
        remedy="Ask whether causes came late, or certification changed. Spreading such deaths over "
        "natural causes makes the years comparable.",
        find=_ill_defined_jumps,
    ),
    Check(
        key="still_pending",
        severity="warning",
        meaning="Many deaths of a final year have a cause that is not yet known (R99).",
        found="{share} % of deaths in {area}, {year}",
        expected="fewer than 5 % in a final year, and not twice as many as the year before",
        remedy="State the year as provisional, or hand in the causes found since.",
        find=_still_pending,
    ),
    Check(
        key="cause_share_jumps",
        severity="warning",
        meaning="The share of a cause changed at once, by more than chance and the usual movement "
        "of causes in the area explain.",
        found="{cause} with {after} % of deaths in {area}, {year}, after {before} % in {first}",
        expected="a share like that of the year before",
        remedy="Ask whether coding changed. If it did, state a break of coding with its ratio; if "
        "deaths did, say so in the note.",
        find=_jumps,
    ),
    Check(
        key="cause_disappears",
        severity="warning",
        meaning="A cause that had deaths the year before has none.",
        found="no deaths from {cause} in {area}, {year}, after {before} % in {first}",
        expected="deaths from it, or a break of coding",
        remedy="Look whether its codes are missing in the file, or whether it goes by another code "
        "since; then state a break of coding.",
        find=_disappears,
    ),
    Check(
        key="cause_appears",
        severity="warning",
        meaning="A cause that had no deaths the year before has many.",
        found="{after} % of deaths in {area}, {year} from {cause}, none in {first}",
        expected="some deaths from it before, or a break of coding",
        remedy="A new disease begins so. If coding changed, state a break of coding.",
        find=_appears,
    ),
)


def problems_of(profiles: Profiles) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(profiles)]
