"""Checks of how well ages and sexes of the population are stated, by published indices."""

from collections.abc import Callable, Iterator

import numpy as np

from engine.ages import AgeGrid, Array
from engine.quality import ENOUGH_PEOPLE, age_sex_accuracy, myers, whipple
from server.intake.cells import YEARS, Flags, Ints, parts_of
from server.intake.checks.check import Check, several
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.schedules import Block

FEW = 5_000  # people of one sex under which digits are chance
WHIPPLE, MYERS, ACCURACY = 110.0, 5.0, 20.0
SURE = 5.0


def whipple_chance(people: Array) -> Array:
    """What chance alone adds to Whipple's index in so few people, at most, [...]."""
    return np.asarray(SURE * 500 * np.sqrt(0.16 / np.maximum(people / 2, 1)))


def myers_chance(people: Array) -> Array:
    """What chance alone makes of Myers' index, at most."""
    return np.asarray(2 * 40 * np.sqrt(0.09 / np.maximum(people, 1)) * 10)


def _index(
    ledger: Ledger,
    index: Callable[[AgeGrid, Array], Array],
    limit: float,
    chance: Callable[[Array], Array],
) -> Iterator[Fault]:
    for block in ledger.of("person_years"):
        found = index(block.grid, block.values)
        if np.isnan(found).all():
            continue
        people = block.values.sum(axis=-1)
        off = (found > limit + chance(people)) & (people >= FEW)
        lines = np.arange(len(found))
        yield from _told(ledger, block, lines, found, off)


def _accuracy(ledger: Ledger) -> Iterator[Fault]:
    for block in ledger.of("person_years"):
        women, men = couples(block)
        if not len(women):
            continue
        found = age_sex_accuracy(block.grid, block.values[women], block.values[men]).index
        people = (block.values[women] + block.values[men]).sum(axis=-1)
        with np.errstate(invalid="ignore"):
            off = (found > ACCURACY + accuracy_chance(people)) & (people >= ENOUGH_PEOPLE)
        yield from _told(ledger, block, women, found, off)


def _told(ledger: Ledger, block: Block, lines: Ints, found: Array, off: Flags) -> Iterator[Fault]:
    def fault(at: int) -> Fault:
        values: dict[str, Value] = {"index": round(float(found[at]), 1)}
        line = int(lines[at])
        return block.fault(block.row[line], ledger.named(int(block.place[line])) | values)

    yield from several(np.flatnonzero(off), fault)


def accuracy_chance(people: Array) -> Array:
    """What chance alone adds to the accuracy index in so few people: each five-year group of a sex
    has about a thirtieth of them."""
    group = np.maximum(people / 30, 1)
    return np.asarray(100 * (3 * np.sqrt(8 / np.pi / group) + 2 * np.sqrt(3 / np.pi / group)))


def couples(block: Block) -> tuple[Ints, Ints]:
    """Lines of women and of men of the same areas and years."""
    sex = parts_of(block.place)[1]
    women, men = np.flatnonzero(sex == 0), np.flatnonzero(sex == 1)
    _, left, right = np.intersect1d(
        block.place[women] + YEARS, block.place[men], assume_unique=True, return_indices=True
    )
    return women[left], men[right]


BOOK = "Shryock & Siegel (1971), The Methods and Materials of Demography, ch. 8"
REMEDY = (
    "Use five-year groups, and read single ages with care. Say in the quality statement how ages "
    "were asked for."
)

CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="whipple_index",
        severity="warning",
        meaning="Whipple's index of the population is above 110: ages that end in 0 or 5 are more "
        "than a tenth more frequent from 23 to 62 than they should be, beyond chance.",
        why="Where ages are guessed, people are put at round ones; rates of single ages, and the "
        "years of birth behind them, are then wrong.",
        found="an index of {index} in {area}, {sex} {year}",
        expected="about 100, at most 110",
        remedy=REMEDY,
        source=f"{BOOK}; up to 105 is called highly accurate, to 110 fairly accurate, to 125 "
        "approximate, to 175 rough, above very rough.",
        find=lambda ledger: _index(ledger, whipple, WHIPPLE, whipple_chance),
    ),
    Check(
        key="myers_index",
        severity="warning",
        meaning="Myers' blended index of the population is above 5: at least one person in twenty "
        "would have to be given another last digit of age to make all ten equally frequent.",
        why="It sees likings for any digit, not for 0 and 5 alone.",
        found="an index of {index} in {area}, {sex} {year}",
        expected="about 0, at most 5",
        remedy=REMEDY,
        source="Myers (1940), Transactions of the Actuarial Society of America 41, 395-415; "
        f"{BOOK}. The limit is Ebbline's own.",
        find=lambda ledger: _index(ledger, myers, MYERS, myers_chance),
    ),
    Check(
        key="age_sex_accuracy",
        severity="warning",
        meaning="The United Nations age-sex accuracy index of the population is above 20, in an "
        "area of 100,000 people or more and beyond chance.",
        why="Errors of age and people left out make five-year groups rise and fall, and the ratio "
        "of men to women with them. So do wars and waves of births, which the note can name.",
        found="an index of {index} in {area}, {year}",
        expected="at most 20",
        remedy="Look which ages stand out, and whether history explains them; say so in the note.",
        source="United Nations (1952), Population Bulletin 2, 59-79: under 20 accurate, to 40 "
        "inaccurate, above highly inaccurate.",
        find=_accuracy,
    ),
)
