"""What an estimate says where it has no value, no limits or no standard error."""

import numpy as np
from numpy.testing import assert_array_equal

from engine.estimates import Estimate, Reason

NAN = np.nan
BARE = Estimate.bare(
    np.array([80.0, 81.0, 82.0, NAN]),
    np.array([0, 0, Reason.NO_WHOLE, Reason.TOO_FEW_AGES], np.uint8),
    Reason.NOT_SIMULATED,
)


def test_a_reason_against_a_value_takes_it_away() -> None:
    assert_array_equal(BARE.value, [80, 81, NAN, NAN])
    assert_array_equal(
        BARE.reason,
        [Reason.NOT_SIMULATED, Reason.NOT_SIMULATED, Reason.NO_WHOLE, Reason.TOO_FEW_AGES],
    )
    assert np.isnan([BARE.low, BARE.high, BARE.se]).all()


def test_limits_stand_in_pairs_and_where_there_is_a_value() -> None:
    low, high = np.array([79.0, NAN, 81.0, 1.0]), np.array([81.0, 82.0, 83.0, 2.0])
    got = BARE.within(low, high, np.array([NAN, 0.5, 0.5, 0.5]), Reason.OFTEN_LOST)
    assert_array_equal(got.low, [79, NAN, NAN, NAN])
    assert_array_equal(got.high, [81, NAN, NAN, NAN])
    assert np.isnan(got.se).all()  # limits without a standard error, and the reverse
    assert_array_equal(got.reason, [0, Reason.OFTEN_LOST, Reason.NO_WHOLE, Reason.TOO_FEW_AGES])
    assert got.reason.dtype == np.uint8


def test_part_of_a_batch_is_taken_of_every_field() -> None:
    part = BARE.within(BARE.value - 1, BARE.value + 1, BARE.value / 80, Reason.OFTEN_LOST)[1:3]
    assert_array_equal(part.value, [81, NAN])
    assert_array_equal(part.low, [80, NAN])
    assert_array_equal(part.high, [82, NAN])
    assert_array_equal(part.se, [81 / 80, NAN])
    assert_array_equal(part.reason, [Reason.NONE, Reason.NO_WHOLE])
