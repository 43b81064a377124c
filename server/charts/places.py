"""Where labels stand so that none covers another; lengths in px."""

from collections.abc import Callable, Sequence

from server.charts.chart import Mark
from server.charts.template import CHARACTER


def spread(wanted: Sequence[float], gap: float, low: float, high: float) -> list[float]:
    """Positions as near to the wanted ones as possible, at least `gap` apart, none above `high`;
    none below `low` either, as long as they all fit.

    Neighbours that are too near are pooled around their common middle, as in isotonic regression.
    """
    order = sorted(range(len(wanted)), key=wanted.__getitem__)
    blocks: list[tuple[int, float]] = []  # members, middle
    for one in order:
        blocks.append((1, wanted[one]))
        while len(blocks) > 1:
            (fewer, at), (more, over) = blocks[-2:]
            if at + gap * (fewer + more) / 2 <= over + 1e-9:
                break
            blocks[-2:] = [(fewer + more, (at * fewer + over * more) / (fewer + more))]
    line = [
        middle + gap * (index - (members - 1) / 2)
        for members, middle in blocks
        for index in range(members)
    ]
    for index in range(len(line)):
        line[index] = max(line[index], line[index - 1] + gap if index else low)
    for index in reversed(range(len(line))):
        line[index] = min(line[index], line[index + 1] - gap if index + 1 < len(line) else high)
    placed = [0.0] * len(wanted)
    for one, position in zip(order, line, strict=True):
        placed[one] = position
    return placed


def storeys(
    marks: Sequence[Mark], px: Callable[[float], float], width: float
) -> list[tuple[int, int]]:
    """For each labelled tick its storey and side (-1: the label stands left of it).

    Labels stand on the side where the picture is emptier; a tick whose label would cross a
    neighbour's tick rises by one storey.
    """
    if not marks:
        return []
    side = -1 if sum(px(mark.x) for mark in marks) / len(marks) > width / 2 else 1
    found = [(0, side)] * len(marks)
    past: list[tuple[float, int]] = []
    for one in sorted(range(len(marks)), key=lambda index: -side * px(marks[index].x)):
        at, need = px(marks[one].x), len(marks[one].label) * CHARACTER + 8
        storey = max((high + 1 for near, high in past if abs(near - at) < need), default=0)
        found[one] = (storey, side)
        past.append((at, storey))
    return found
