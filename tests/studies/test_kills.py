"""A few kills of the long study: python -m tests.studies.kills."""

from tests.studies.kills import STAGES, study


def test_a_killed_commit_leaves_the_old_state_or_the_new_one() -> None:
    found = study(20, seed=7)
    assert sum(found.values()) == 20
    stages = {killed.stage for killed in found}
    assert stages <= set(STAGES)
    assert len(stages) >= 2  # it is not always killed before it has begun
