"""The files of deaths by cause of Quillmere's mainland: CSV in long form, one row a count."""

import numpy as np
from numpy.typing import NDArray

from seed_scenarios.quillmere_causes_counts import CODES, MAINLAND, RECODED, Ratio
from seed_scenarios.quillmere_counts import HEAT, REBASED, SEXES, YEARS, Counts
from seed_scenarios.quillmere_files import PROVISIONAL, WORDS, ages, closed, text

ALL = "all causes"
CODED_TWICE = f"deaths of {RECODED - 1} coded by old rules and by new"


def deaths_csv(counts: dict[str, Counts], by_cause: dict[str, NDArray[np.int64]]) -> bytes:
    """Deaths by year, region, sex, age and cause: those of all causes, then each cause of which
    somebody died."""
    lines = ["year,status,area,area_name,sex,age,cause,deaths"]
    for region in MAINLAND:
        labels, causes = ages(region), np.array(CODES)
        for at, year in enumerate(YEARS):
            status = "provisional" if year == PROVISIONAL else "final"
            for row, sex in enumerate(SEXES):
                where = f"{year},{status},{region.code},{region.name},{WORDS[sex]}"
                total = closed(region, counts[region.code].deaths[at, row])
                lines += [
                    f"{where},{age},{ALL},{count}" for age, count in zip(labels, total, strict=True)
                ]
                parts = closed(region, by_cause[region.code][at, row])
                lines += [
                    f"{where},{labels[age]},{causes[cause]},{parts[age, cause]}"
                    for age, cause in np.argwhere(parts)
                ]
    return text(lines)


def breaks_csv(ratios: dict[str, Ratio]) -> bytes:
    """The new population base, the hot summer, and the new rules of coding with their ratios."""
    lines = [
        "area,year,kind,cause,note,ratio,ratio_error",
        f",{REBASED},population,,after the census of 2021,,",
        f",{HEAT},shock,,hot summer,,",
    ]
    lines += [
        f",{RECODED},coding,{code},{CODED_TWICE},{one.ratio:.4f},{one.error:.4f}"
        for code, one in ratios.items()
    ]
    return text(lines)
