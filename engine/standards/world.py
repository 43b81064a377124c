"""World standard populations."""

from engine.standards.standard import Standard

WORLD = (
    Standard(
        key="who2000",
        symbol="WHO",
        label="WHO World Standard Population 2000-2025",
        starts=tuple(range(0, 101, 5)),
        weights=(
            8.86, 8.69, 8.60, 8.47, 8.22, 7.93, 7.61, 7.15, 6.59, 6.04, 5.37, 4.55, 3.72, 2.96,
            2.21, 1.52, 0.91, 0.44, 0.15, 0.04, 0.005,
        ),
        source=(
            "Ahmad, Boschi-Pinto, Lopez, Murray, Lozano & Inoue (2001), Age standardization of"
            " rates: a new WHO standard, GPE Discussion Paper 31, World Health Organization"
        ),
        note=(
            "As published the weights add up to 100.035 per cent, not to 100. They are divided by"
            " their sum."
        ),
    ),
    Standard(
        key="segi",
        symbol="Segi",
        label="Segi world standard population",
        starts=tuple(range(0, 86, 5)),
        weights=(
            12000, 10000, 9000, 9000, 8000, 8000, 6000, 6000, 6000, 6000, 5000, 4000, 4000, 3000,
            2000, 1000, 500, 500,
        ),
        source=(
            "Segi (1960), Cancer Mortality for Selected Sites in 24 Countries; as modified by Doll,"
            " Payne & Waterhouse (1966), Cancer Incidence in Five Continents I"
        ),
    ),
)  # fmt: skip
