"""Age groups by their starts, the last one open.

**Names** used all over the engine: `deaths, exposure` (person-years), `mx` (central death rate, per
person-year), `ax` (years lived in the group by those who die in it), `qx, px, lx` (radix 1), `dx,
Lx, Tx, ex`. Every array is `[..., age]`: any leading batch axes, age last, float64, C order.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class AgeGrid:
    """Age groups as their starts in completed years; the last group is open.

    Raises: ValueError where the starts do not begin at 0 or do not increase.
    >>> AgeGrid((0, 1, 5, 10)).labels
    ('0', '1–4', '5–9', '10+')
    """

    starts: tuple[int, ...]

    def __post_init__(self) -> None:
        if not self.starts or self.starts[0] != 0:
            raise ValueError(f"ages begin at {self.starts[:1]}; a grid begins at age 0")
        if any(b <= a for a, b in zip(self.starts, self.starts[1:], strict=False)):
            raise ValueError(f"age starts must increase; found {self.starts}")

    def __len__(self) -> int:
        return len(self.starts)

    @classmethod
    def parse(cls, code: str) -> "AgeGrid":
        """The grid of an address: AgeGrid.parse('0,1,5,10')."""
        return cls(tuple(int(part) for part in code.split(",")))

    @property
    def code(self) -> str:
        return ",".join(str(start) for start in self.starts)

    @property
    def widths(self) -> Array:
        """Years in each group, [age]; the open group is inf."""
        return np.append(np.diff(np.array(self.starts, float)), np.inf)

    @property
    def mids(self) -> Array:
        """Middle of each group, [age]; nan for the open group."""
        middle = np.array(self.starts, float) + self.widths / 2
        middle[-1] = np.nan
        return middle

    @property
    def labels(self) -> tuple[str, ...]:
        closed = tuple(
            str(a) if b - a == 1 else f"{a}–{b - 1}"
            for a, b in zip(self.starts, self.starts[1:], strict=False)
        )
        return (*closed, f"{self.starts[-1]}+")

    @property
    def label(self) -> str:
        """The grid in words.

        >>> AgeGrid((0, 1, 5, 10)).label
        '4 groups, open at 10'
        """
        return f"{len(self)} groups, open at {self.open_age}"

    @property
    def open_age(self) -> int:
        return self.starts[-1]

    def has(self, age: int) -> bool:
        return age in self.starts

    def position(self, age: int) -> int:
        """Index of the group that starts at this age; ValueError where none does."""
        if age not in self.starts:
            raise ValueError(f"no age group starts at {age}; the starts are {self.code}")
        return self.starts.index(age)

    def common(self, other: "AgeGrid") -> "AgeGrid":
        """The finest grid into which both can be summed exactly."""
        if other == self:
            return self
        return AgeGrid(tuple(start for start in self.starts if start in other.starts))

    @property
    def fives(self) -> "AgeGrid":
        """In groups of at least five years after the first, for pictures and tables.

        >>> AgeGrid((0, 1, 2, 3, 4, 5, 6)).fives.starts
        (0, 1, 5)
        """
        return AgeGrid(tuple(start for start in self.starts if start % 5 == 0 or start == 1))

    def regroup(self, counts: Array, to: "AgeGrid") -> Array:
        """Counts summed into the coarser grid, exactly: [..., age] -> [..., age of `to`].

        Raises: ValueError where a start of `to` is not a start here.
        >>> AgeGrid((0, 1, 5)).regroup(np.array([1.0, 2.0, 3.0]), AgeGrid((0, 5)))
        array([3., 3.])
        """
        if to == self:
            return counts
        return np.add.reduceat(counts, [self.position(start) for start in to.starts], axis=-1)
