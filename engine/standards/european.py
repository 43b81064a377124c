"""The European standard populations."""

from engine.standards.standard import Standard

EUROPEAN = (
    Standard(
        key="esp2013",
        symbol="E2013",
        label="European Standard Population 2013",
        starts=(0, 1, *range(5, 96, 5)),
        weights=(
            1000, 4000, 5500, 5500, 5500, 6000, 6000, 6500, 7000, 7000, 7000, 7000, 6500, 6000,
            5500, 5000, 4000, 2500, 1500, 800, 200,
        ),
        source=(
            "Eurostat (2013), Revision of the European Standard Population, report of the task"
            " force, KS-RA-13-028"
        ),
    ),
    Standard(
        key="esp1976",
        symbol="E1976",
        label="European Standard Population 1976",
        starts=(0, 1, *range(5, 86, 5)),
        weights=(
            1600, 6400, 7000, 7000, 7000, 7000, 7000, 7000, 7000, 7000, 7000, 7000, 6000, 5000,
            4000, 3000, 2000, 1000, 1000,
        ),
        source=(
            "Waterhouse, Muir, Correa & Powell (1976), Cancer Incidence in Five Continents III"
        ),
    ),
)  # fmt: skip
