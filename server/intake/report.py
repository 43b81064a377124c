"""What the checks of an upload found, as it is kept beside the upload."""

import json
from dataclasses import asdict, dataclass

from server.intake.break_rows import NONE
from server.intake.causes.counted import Counted, counted
from server.intake.parsing import Parsed
from server.intake.problems import Problem
from server.intake.sharing import Unstated


@dataclass(frozen=True, slots=True)
class Report:
    """Problems, and what the upload would become."""

    problems: tuple[Problem, ...]
    rows: int  # read; headings and blank lines not counted
    sound: int  # of them without an error
    areas: tuple[str, ...]  # codes
    sexes: tuple[str, ...]
    periods: tuple[str, ...]
    measures: tuple[str, ...]
    provisional: tuple[str, ...]  # periods that are provisional somewhere
    grids: tuple[tuple[str, ...], ...]  # labels of each grid of deaths, or of people alone
    whole: str  # code of the area that is summed from the others; empty where none is
    persons: bool  # persons are summed from women and men
    delivered: tuple[str, ...]  # codes of areas kept as delivered
    unstated: tuple[Unstated, ...] = ()  # what became of counts that do not state all
    becoming: tuple[tuple[str, ...], ...] = ()  # old code, first and last year, new codes, how
    breaks: tuple[tuple[str, ...], ...] = ()  # year, kind (empty: it ends), area
    rebased: tuple[str, ...] = ()  # years held that get a new population
    by_cause: tuple[Counted, ...] = ()  # deaths under each cause, and those without

    @classmethod
    def of(cls, parsed: Parsed) -> "Report":
        keys = parsed.cells.keys()
        sexes = {(key.area, key.period, key.measure, key.sex) for key in keys}
        delivered = tuple(area.code for area in parsed.areas if area.delivered)
        by_age = "deaths" if any(key.measure == "deaths" for key in keys) else "person_years"
        grids = dict.fromkeys(
            cell.grid for key, cell in parsed.cells.items() if key.measure == by_age
        )
        provisional = {k.period for k, cell in parsed.cells.items() if cell.status != "final"}
        return cls(
            problems=parsed.problems,
            rows=parsed.row_count,
            sound=parsed.sound_count,
            areas=tuple(area.code for area in parsed.areas),
            sexes=tuple(sorted({key.sex for key in keys})),
            periods=tuple(sorted({key.period for key in keys})),
            measures=tuple(sorted({key.measure for key in keys} - {"counted_deaths"})),
            provisional=tuple(sorted(provisional)),
            grids=tuple(grid.labels for grid in grids),
            whole=parsed.whole if parsed.whole not in delivered else "",
            persons=any(sex == "f" and (*place, "m") in sexes for *place, sex in sexes),
            delivered=delivered,
            unstated=parsed.unstated,
            becoming=tuple(
                (one.code, *one.span, ", ".join(one.becomes), one.way)
                for one in parsed.successions.of
            ),
            breaks=tuple(
                (one.period, one.kind if one.kind != NONE else "", one.area)
                for one in parsed.breaks
            ),
            rebased=parsed.rebased,
            by_cause=counted(parsed.cells, parsed.causes, _sum_of_others(parsed)),
        )

    @property
    def errors(self) -> tuple[Problem, ...]:
        return tuple(problem for problem in self.problems if problem.severity == "error")

    @property
    def warnings(self) -> tuple[Problem, ...]:
        return tuple(problem for problem in self.problems if problem.severity == "warning")

    def to_json(self) -> str:
        stored = {name: getattr(self, name) for name in self.__slots__}
        stored["problems"] = [problem.to_json() for problem in self.problems]
        stored["unstated"] = [asdict(year) for year in self.unstated]
        stored["by_cause"] = [asdict(cause) for cause in self.by_cause]
        return json.dumps(stored, sort_keys=True, ensure_ascii=False)

    @classmethod
    def from_json(cls, text: str) -> "Report":
        stored = json.loads(text)
        lists = {name: tuple(value) for name, value in stored.items() if isinstance(value, list)}
        lists["problems"] = tuple(Problem.from_json(problem) for problem in stored["problems"])
        for name in ("becoming", "breaks"):
            lists[name] = tuple(tuple(row) for row in stored.get(name, ()))
        lists["grids"] = tuple(tuple(labels) for labels in stored["grids"])
        lists["unstated"] = tuple(Unstated(**year) for year in stored.get("unstated", ()))
        lists["by_cause"] = tuple(Counted(**cause) for cause in stored.get("by_cause", ()))
        return cls(**(stored | lists))


def _sum_of_others(parsed: Parsed) -> str:
    """The whole, where its parts are handed in too."""
    return parsed.whole if any(key.area != parsed.whole for key in parsed.cells) else ""
