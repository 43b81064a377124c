"""Ratios of reading an upload of a million rows to a bare read of the table, side by side.

    OPENBLAS_NUM_THREADS=1 taskset -c 0 python -m tests.benchmarks.intake

Sides of a ratio take turns; medians are compared. Nothing is asserted: machines differ.
"""

import io

import numpy as np
import pandas as pd

from server.intake.checks import OF_LEDGER, fields
from server.intake.layout import layout
from server.intake.mapping import Mapping
from server.intake.parsing import Handed, parse
from server.intake.sheets import load
from tests.benchmarks.engine import side_by_side

AREAS, YEARS = 1_000, 25
AGES = ["0", "1-4", *(f"{age}-{age + 4}" for age in range(5, 90, 5)), "90+"]
COLUMNS = Mapping(
    year="year", sex="sex", age="age", area="area", deaths="deaths", population="population"
)


STARTS = np.array([0, 1, *range(5, 95, 5)])
WIDTHS = np.append(np.diff(STARTS), 8)


def million() -> bytes:
    """1,000 areas, 25 years, two sexes, 20 ages: 50,000 schedules of each measure. Areas of some
    30,000 to 100,000 people under a Gompertz law, with Poisson deaths: clean, as most files are."""
    rng = np.random.default_rng(1)
    shape = (AREAS, YEARS, 2, len(AGES))
    law = 3e-5 * np.exp(0.098 * (STARTS + WIDTHS / 2)) + 2e-4
    law[:2] = 4e-3, 3e-4
    level = np.exp(rng.normal(0, 0.08, (AREAS, 1, 1, 1))) * np.array([0.8, 1.25])[:, None]
    dying = level.mean(axis=0, keepdims=True) * law * WIDTHS
    middle = STARTS + WIDTHS / 2
    alive = np.exp(dying / 2 - np.cumsum(dying, axis=-1) - 0.004 * middle) * WIDTHS
    grown = (1 + 0.004 * np.arange(YEARS))[:, None, None]
    size = rng.uniform(15_000, 50_000, (AREAS, 1, 1, 1)) * grown
    waves = 1 + rng.normal(0, 0.015, (AREAS, 1, 2, len(AGES)))
    people = np.round(
        size * alive / alive.sum(axis=-1, keepdims=True) * waves + rng.normal(0, 4, shape)
    ).astype(int)
    deaths = rng.poisson(level * law * people)
    area, year, sex, age = (part.ravel() for part in np.indices(shape))
    table = pd.DataFrame(
        {
            "area": np.array([f"a{number:04d}" for number in range(AREAS)])[area],
            "year": 1999 + year,
            "sex": np.array(["f", "m"])[sex],
            "age": np.array(AGES)[age],
            "deaths": deaths.ravel(),
            "population": people.ravel(),
        }
    )
    return table.to_csv(index=False).encode()


def main() -> None:
    content = million()
    handed = [Handed("counts", "counts.csv", content, COLUMNS)]
    parsed = parse(handed)
    print(f"{parsed.row_count} rows, {len(content) / 1e6:.0f} MB, {len(parsed.cells)} schedules")
    checks = (*fields.CHECKS, *OF_LEDGER)
    print(f"{len(checks)} checks of rows and series; problems: {len(parsed.problems)}")
    bare, columns, whole = side_by_side(
        lambda: pd.read_csv(io.BytesIO(content)),
        lambda: load(layout(content, "counts.csv"), COLUMNS, "counts"),
        lambda: parse(handed),
    )
    print(f"bare read of the table: {bare:.3f} s")
    print(f"cut into lines and read as codes: {columns:.3f} s, ratio {columns / bare:.1f}")
    print(f"read, checked and made schedules: {whole:.3f} s, ratio {whole / bare:.1f}")


if __name__ == "__main__":
    main()
