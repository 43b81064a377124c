"""The named chains."""

import pytest

from engine.settings import SETTINGS, find
from engine.stages.open_interval import OPEN_INTERVALS
from engine.stages.separation import CHILD, FIRST_YEAR


@pytest.mark.fast
def test_every_choice_names_a_stage_there_is() -> None:
    for key, settings in SETTINGS.items():
        assert settings.key == key
        assert settings.open_interval in OPEN_INTERVALS
        assert settings.first_year in FIRST_YEAR
        assert settings.child in CHILD
    assert {settings.open_interval for settings in SETTINGS.values()} == set(OPEN_INTERVALS)


@pytest.mark.fast
@pytest.mark.parametrize("settings", SETTINGS.values(), ids=SETTINGS)
def test_every_stage_has_its_sentence(settings) -> None:
    names = [stage.name for stage in settings.stages]
    assert len(set(names)) == len(names)
    assert all(stage.sentence.endswith(".") for stage in settings.stages)
    assert not any("{" in stage.sentence for stage in settings.stages)


@pytest.mark.fast
def test_an_unknown_name_is_answered_with_the_names_there_are() -> None:
    assert find("almanac-1").open_interval == "one_over_m"
    with pytest.raises(ValueError, match=r"'almanac-9'.*almanac-1, almanac-1-gompertz"):
        find("almanac-9")
