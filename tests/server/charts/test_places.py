"""Labels do not cover each other."""

from itertools import pairwise

from hypothesis import given
from hypothesis import strategies as st

from server.charts.chart import Mark
from server.charts.places import spread, storeys

positions = st.lists(st.floats(-50, 400), max_size=12)


@given(wanted=positions, gap=st.floats(5, 25))
def test_labels_are_a_gap_apart_in_their_order_and_inside_if_they_fit(
    wanted: list[float], gap: float
) -> None:
    got = spread(wanted, gap, 0, 350)
    order = sorted(range(len(wanted)), key=wanted.__getitem__)
    line = [got[index] for index in order]
    assert all(b - a >= gap - 1e-6 for a, b in pairwise(line))
    if line:
        assert max(line) <= 350 + 1e-6
        if gap * (len(line) - 1) <= 350:
            assert min(line) >= -1e-6


@given(wanted=st.lists(st.integers(0, 10), max_size=8, unique=True))
def test_labels_with_room_stay_where_they_belong(wanted: list[int]) -> None:
    far = [40.0 * at for at in wanted]
    assert spread(far, 17, 0, 400) == far


def test_two_labels_of_one_height_part_evenly() -> None:
    assert spread([100.0, 100.0], 20, 0, 200) == [90.0, 110.0]


def test_a_tick_whose_label_would_cross_a_neighbour_rises() -> None:
    marks = [Mark(82.0, "mean 82.0"), Mark(84.4, "median 84.4"), Mark(88.9, "most common 88.9")]
    found = storeys(marks, lambda x: 8 * x, 800)
    assert [side for _, side in found] == [-1, -1, -1]
    assert [storey for storey, _ in found] == [0, 1, 2]
    assert storeys([Mark(10.0, "a"), Mark(60.0, "b")], lambda x: 8 * x, 800) == [(0, 1), (0, 1)]
    assert storeys([], lambda x: x, 800) == []
