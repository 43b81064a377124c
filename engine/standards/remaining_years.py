"""The years that a death at each age is taken to have cost, by a table printed for the purpose."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class RemainingYears:
    """Years left to live at exact ages, by a reference that no population needs to have reached."""

    label: str
    ages: tuple[int, ...]
    years: tuple[float, ...]
    source: str


GBD_2010 = RemainingYears(
    label="reference life table of the Global Burden of Disease Study 2010",
    ages=(0, 1, *range(5, 106, 5)),
    years=(
        86.02, 85.21, 81.25, 76.27, 71.29, 66.35, 61.40, 56.46, 51.53, 46.64, 41.80, 37.05, 32.38,
        27.81, 23.29, 18.93, 14.80, 10.99, 7.64, 5.05, 3.31, 2.23, 1.64,
    ),
    source=(
        "Murray, Ezzati, Flaxman, Lim, Lozano, Michaud, Naghavi, Salomon, Shibuya, Vos, Wikler &"
        " Lopez (2012), GBD 2010: design, definitions, and metrics, Lancet 380, 2063-2066"
    ),
)  # fmt: skip

REFERENCES: dict[str, RemainingYears] = {"gbd2010": GBD_2010}
