"""Small countries whose counts must be protected: drawn deaths, few in most cells."""

import numpy as np

from engine.ages import AgeGrid
from server.store.records import Area, Cause, Key, Vector

GRID = AgeGrid((0, 1, 5, 20, 40, 60, 80))
_WIDTHS = np.array([1, 4, 15, 20, 20, 20, 10.0])
_RATES = np.array([4e-3, 3e-4, 2e-4, 8e-4, 4e-3, 2.5e-2, 1.2e-1])
Cells = dict[Key, Vector]
NATION = (Area("n", "N"), Area("r", "R", "n"), Area("s", "S", "n"))
TREE = (
    *NATION,
    *(Area(f"r{at}", "", "r") for at in range(3)),
    *(Area(f"s{at}", "", "s") for at in range(4)),
)
FLAT = (Area("n", "N"), *(Area(f"a{at}", "", "n") for at in range(5)))


def drawn(
    areas: tuple[Area, ...],
    *,
    seed: int,
    years: tuple[str, ...] = ("2001",),
    people: float = 9e3,
    small: str = "",
) -> Cells:
    """Deaths and person-years of the areas without parts, drawn, and every sum of them."""
    rng = np.random.default_rng(seed)
    parents = {area.code: area.parent for area in areas}
    leaves = [area.code for area in areas if area.code not in set(parents.values())]
    cells: Cells = {}
    for year in years:
        for code in leaves:
            size = people * rng.uniform(0.2, 2.0) * (0.005 if code == small else 1)
            for sex in "fm":
                lived = np.round(size * _WIDTHS / _WIDTHS.sum() / 2)
                deaths = rng.poisson(lived * _RATES * (1.3 if sex == "m" else 0.8)).astype(float)
                for key, values in (("deaths", deaths), ("person_years", lived)):
                    add(cells, parents, Key(code, sex, year, key), values)
    return cells


def add(cells: Cells, parents: dict[str, str], key: Key, values: np.ndarray) -> None:  # type: ignore[type-arg]
    """Counts of one area and sex, also into persons and into every area it is part of."""
    area = key.area
    while area:
        for sex in (key.sex, "p"):
            one = key._replace(area=area, sex=sex)
            before = cells[one].values if one in cells else 0.0
            cells[one] = Vector("final", GRID, before + values)
        area = parents[area]


LIST = (
    Cause("body", "Diseases", kind="natural"),
    Cause("heart", "Heart", "body"),
    Cause("lungs", "Lungs", "body"),
    Cause("rare", "A disease that nobody had", "body"),
    Cause("outside", "Accidents", kind="external"),
    Cause("road", "Road traffic", "outside", kind="external"),
    Cause("fall", "Falls", "outside", kind="external"),
)
_SHARES = {  # at each age group
    "heart": (0.3, 0.1, 0.1, 0.2, 0.4, 0.6, 0.65),
    "lungs": (0.4, 0.3, 0.1, 0.2, 0.4, 0.3, 0.25),
    "road": (0.1, 0.4, 0.7, 0.4, 0.1, 0.03, 0.02),
    "fall": (0.2, 0.2, 0.1, 0.2, 0.1, 0.07, 0.08),
}


def by_cause(cells: Cells, *, seed: int) -> Cells:
    """The deaths of every area and sex parted over causes, and every sum of them. Nobody dies of
    one of the list, which has no schedules."""
    rng = np.random.default_rng(1000 + seed)
    out = dict(cells)
    parents = {area.code: area.parent for area in (*FLAT, *TREE)}
    wholes = set(parents.values())
    shares = np.array(list(_SHARES.values()))
    for key, vector in cells.items():
        if key.measure == "deaths" and key.sex != "p" and key.area not in wholes:
            parted = np.array(
                [rng.multinomial(int(n), p) for n, p in zip(vector.values, shares.T, strict=True)]
            )
            for at, cause in enumerate(_SHARES):
                add(out, parents, key._replace(cause=cause), parted[:, at].astype(float))
    return out


def late(cells: Cells, areas: tuple[Area, ...], seed: int, only: str = "") -> Cells:
    """Deaths reported late, each of a cause; `only` in one area."""
    rng = np.random.default_rng(seed)
    parents = {area.code: area.parent for area in areas}
    leaves = [code for code in parents if code not in set(parents.values())]
    out = dict(cells)
    for code in leaves if not only else [only]:
        for sex in "fm":
            for cause in _SHARES:
                more = rng.poisson(0.15, len(GRID)).astype(float)
                for one in ("", cause):
                    add(out, parents, Key(code, sex, "2001", "deaths", one), more)
    return out
