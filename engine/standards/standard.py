"""A standard population: the people that weight the ages of a standardised rate."""

from dataclasses import dataclass

from engine.ages import AgeGrid


@dataclass(frozen=True, slots=True)
class Standard:
    """Weights by age group as they were published, in their own unit; the last group is open."""

    key: str
    symbol: str
    label: str
    starts: tuple[int, ...]
    weights: tuple[float, ...]
    source: str
    note: str = ""  # what a reader must know of the weights

    def __post_init__(self) -> None:
        if len(self.starts) != len(self.weights):
            raise ValueError(
                f"{self.label} has {len(self.weights)} weights for {len(self.starts)} age groups; "
                "each group has one"
            )

    @property
    def grid(self) -> AgeGrid:
        return AgeGrid(self.starts)
