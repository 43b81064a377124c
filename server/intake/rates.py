"""Death rates and probabilities of dying made deaths, with the people they are of."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from engine.panel import SEXES
from server.intake.cells import Flags, parts_of, sexes_of
from server.intake.forms.found import Found
from server.intake.labels import NOT_STATED
from server.intake.ledger import Ledger
from server.intake.probabilities import death_rates
from server.intake.problems import Value
from server.intake.schedules import DECIMALS, Aside, Block

HIGHEST = 5.0  # deaths per person-year; the oldest of the old die at 1


@dataclass(frozen=True, slots=True)
class WorkedOut:
    """The ledger with the deaths among its blocks, and what stood in the way."""

    ledger: Ledger
    found: tuple[Found, ...]


def worked_out(
    ledger: Ledger, rates: Sequence[Block], unknown: Sequence[Aside], kind: str
) -> WorkedOut:
    """Deaths = rate x person-years, in the age groups of the rates; marked estimated.

    Rates of persons are not used where women and men have theirs: their deaths are summed.
    """
    found = [Found("rate_of_unknown", one.fault(one.row, {})) for one in unknown]
    if not rates:
        return WorkedOut(ledger, tuple(found))
    made: list[Block] = []
    for block in map(_without_persons(rates), rates):
        stated = ledger.states(block.place)
        beyond = [*_beyond(block, kind)]
        found += [*beyond, *_of_unknown(block, stated)]
        if not beyond:
            _with_people(ledger, block.pick(stated), kind, made, found)
    if kind == "probability":
        found += [one for block in made for one in _open_group(block)]
    return WorkedOut(replace(ledger, blocks=(*ledger.blocks, *made)), tuple(found))


def _with_people(
    ledger: Ledger, rates: Block, kind: str, made: list[Block], found: list[Found]
) -> None:
    """Add the deaths of those with people to `made`, and what is wrong with others to `found`."""
    alone = np.ones(len(rates.place), bool)
    for people in ledger.of("person_years"):
        _, here, there = np.intersect1d(rates.place, people.place, return_indices=True)
        if not len(here):
            continue
        alone[here] = False
        part, beside = rates.pick(here), people.pick(there)
        if set(part.grid.starts) <= set(beside.grid.starts):
            made.append(_deaths(part, beside, kind))
        else:
            found.append(_coarser(ledger, part, beside))
    found += _alone(ledger, rates.pick(alone))


def _without_persons(rates: Sequence[Block]) -> Callable[[Block], Block]:
    places = np.concatenate([block.place for block in rates])

    def kept(block: Block) -> Block:
        women, men = sexes_of(block.place)
        persons = parts_of(block.place)[1] == SEXES.index("p")
        return block.pick(~(persons & np.isin(women, places) & np.isin(men, places)))

    return kept


def _deaths(rates: Block, people: Block, kind: str) -> Block:
    exposure = people.regroup(rates.grid).values
    mx = death_rates(rates.values, rates.grid) if kind == "probability" else rates.values
    return replace(
        rates,
        measure="deaths",
        values=np.round(mx * exposure, DECIMALS) + 0.0,
        provisional=rates.provisional | people.provisional,
        estimated=True,
    )


def _beyond(rates: Block, kind: str) -> Iterator[Found]:
    """The highest value, if it cannot be a rate or a probability."""
    if not rates.values.size:
        return
    line, age = np.unravel_index(int(rates.values.argmax()), rates.values.shape)
    highest = float(rates.values[line, age])
    if highest > (1 if kind == "probability" else HIGHEST):
        values: dict[str, Value] = {"value": highest, "age": rates.grid.labels[age]}
        key = "probability_above_one" if kind == "probability" else "rate_too_high"
        yield Found(key, rates.fault(rates.row[line, age], values))


def _of_unknown(rates: Block, stated: Flags) -> Iterator[Found]:
    if not stated.all():
        yield Found("rate_of_unknown", rates.fault(rates.row[~stated], {}))


def _coarser(ledger: Ledger, rates: Block, people: Block) -> Found:
    lacking = sorted(set(rates.grid.starts) - set(people.grid.starts))
    values: dict[str, Value] = {
        **ledger.named(int(rates.place[0])),
        "ages": ", ".join(rates.grid.labels[rates.grid.position(start)] for start in lacking),
        "groups": ", ".join(people.grid.labels),
    }
    return Found("people_coarser_than_rates", rates.fault(rates.row, values))


def _alone(ledger: Ledger, rates: Block) -> Iterator[Found]:
    area, sex, year = parts_of(rates.place)
    for one in np.unique(area).tolist():
        here = area == one
        values: dict[str, Value] = {
            **ledger.named_area(one),
            "sexes": ", ".join((*SEXES, NOT_STATED)[number] for number in np.unique(sex[here])),
            "years": ", ".join(map(str, np.unique(year[here]).tolist())),
        }
        yield Found("rates_without_population", rates.fault(rates.row[here], values))


def _open_group(deaths: Block) -> Iterator[Found]:
    """Of probabilities: where the rate of the open group was worked out, and where it could not."""
    unknown = np.isnan(deaths.values[:, -1])
    values: dict[str, Value] = {"age": deaths.grid.labels[-1]}
    if unknown.any():
        yield Found("open_group_unknown", deaths.fault(deaths.row[unknown, -1], values))
    if not unknown.all():
        yield Found("open_group_worked_out", deaths.fault(deaths.row[~unknown, -1], values))
