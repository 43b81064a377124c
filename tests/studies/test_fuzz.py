"""Some of the spoilt files of the long study: python -m tests.studies.fuzz."""

import pytest

from tests.studies.fuzz import study


@pytest.mark.slow
def test_spoilt_files_are_answered_and_many_reach_the_checks() -> None:
    found = study(2_000, seed=4)
    assert found.outcomes.total() == 2_000
    assert found.share_checked() >= 0.3
    assert len(found.messages) >= 20
