"""Deaths by cause as counts: chance is in those that were counted."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.causes.counts import CauseCounts
from tests.factories import GRIDS, gompertz_panel, parted

pytestmark = pytest.mark.fast


def test_shares_add_up_and_where_nobody_died_are_those_of_all_deaths() -> None:
    panel = gompertz_panel(GRIDS["single"], seed=2, people=20_000)
    causes = parted(panel)
    shares = causes.shares(panel)
    np.testing.assert_allclose(shares.sum(axis=-2), 1, rtol=1e-12)
    assert (panel.deaths == 0).any()
    together = causes.deaths.sum(axis=-1) / panel.deaths.sum()
    for x in np.flatnonzero(panel.deaths == 0):
        np.testing.assert_array_equal(shares[:, x], together)


def test_a_death_counted_stands_for_those_shared_out_by_it() -> None:
    deaths = np.array([[3.0, 6.0, 0.0], [0.0, 0.0, 2.0]])
    counted = np.array([[2.0, 3.0, 0.0], [1.0, 4.0, 0.0]])
    causes = CauseCounts(deaths, counted)
    np.testing.assert_array_equal(causes.counts, [[2, 3, 0], [1, 4, 2]])
    np.testing.assert_allclose(causes.worth[0], [1.5, 2.0, 9 / 5])
    np.testing.assert_array_equal(causes.worth[1, :2], [0.0, 0.0])  # its deaths went elsewhere
    np.testing.assert_array_equal(CauseCounts(deaths).worth, np.ones((2, 3)))


def test_coarser_groups_are_exact_sums() -> None:
    panel = gompertz_panel(seed=1)
    causes, to = parted(panel), AgeGrid((0, 15, 65))
    summed = causes.regroup(panel.grid, to).deaths
    np.testing.assert_array_equal(summed.sum(axis=-2), panel.grid.regroup(panel.deaths, to))
