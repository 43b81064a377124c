"""Checks of the mapping of deaths by cause: is it said into which list they fall."""

from collections.abc import Iterator

from server.intake.causes.lists import CAUSE_LISTS, OWN
from server.intake.causes.placing import by_cause
from server.intake.checks.check import Check
from server.intake.checks.columns import Mapped
from server.intake.problems import Fault, Problem


def _no_cause_list(mapped: Mapped) -> Iterator[Fault]:
    name = mapped.mapping.cause_list
    if by_cause(mapped.role, mapped.mapping) and name not in CAUSE_LISTS:
        yield Fault(column=mapped.mapping.cause, values={"text": name})


def _no_own_list(mapped: Mapped) -> Iterator[Fault]:
    own = mapped.mapping.cause_list == OWN and not mapped.own_causes
    if by_cause(mapped.role, mapped.mapping) and own:
        yield Fault(column=mapped.mapping.cause)


CHECKS: tuple[Check[Mapped], ...] = (
    Check(
        key="cause_list_not_stated",
        severity="error",
        meaning="Deaths are by cause, and it is not said into which list of causes they fall.",
        found="“{text}” as the list of causes",
        expected="chapters (those of ICD-10), short (a grouping for public health) or own (a table "
        "of the upload)",
        remedy="Say in the mapping which list the causes fall into.",
        find=_no_cause_list,
    ),
    Check(
        key="own_list_missing",
        severity="error",
        meaning="Causes are to fall into a list of your own, and no such list was handed in.",
        found="no table of causes in the upload",
        expected="a table with code, name and codes of each cause",
        remedy="Hand in the list with the deaths, or choose one of the lists there are.",
        find=_no_own_list,
    ),
)


def problems_of(mapped: Mapped) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(mapped, mapped.file.name)]
