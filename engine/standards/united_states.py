"""The standard population of the United States."""

from engine.standards.standard import Standard

UNITED_STATES = (
    Standard(
        key="us2000",
        symbol="US2000",
        label="United States standard population 2000",
        starts=(0, 1, *range(5, 86, 5)),
        weights=(
            13818, 55317, 72533, 73032, 72169, 66478, 64529, 71044, 80762, 81851, 72118, 62716,
            48454, 38793, 34264, 31773, 26999, 17842, 15508,
        ),
        source=(
            "Klein & Schoenborn (2001), Age adjustment using the 2000 projected U.S. population,"
            " Healthy People Statistical Notes 20"
        ),
    ),
)  # fmt: skip
