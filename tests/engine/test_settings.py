"""The named chains."""

from dataclasses import fields

import pytest

from engine.settings import SETTINGS, Settings, find, span
from engine.stages.inside import INSIDE
from engine.stages.open_interval import OPEN_INTERVALS
from engine.stages.separation import CHILD, FIRST_YEAR
from engine.stages.smoothing import SMOOTHINGS

pytestmark = pytest.mark.fast
EVERY = pytest.mark.parametrize("settings", SETTINGS.values(), ids=SETTINGS)
MOST = 13  # names that a reader can choose among
# What figures were published under: these entries and the defaults they rest on never change.
FIRST = {
    "first_year": "andreev_kingkade",
    "child": "coale_demeny",
    "level": 0.95,
    "fit_from": 70,
    "least_exposure": 5000.0,
    "few_exposure": 20000.0,
    "open_share": 0.05,
    "draws": 400,
    "ageing_span": (40, 84),
    "years": 1,
    "smoothing": "none",
    "borrow": False,
    "inside": "midpoint",
    "least_open_age": 0,
    "population_error": (),
}


def test_every_choice_names_a_stage_there_is() -> None:
    for key, settings in SETTINGS.items():
        assert settings.key == key
        assert settings.open_interval in OPEN_INTERVALS
        assert settings.first_year in FIRST_YEAR
        assert settings.child in CHILD
        assert settings.inside in INSIDE
        assert settings.smoothing in SMOOTHINGS
        assert settings.least_open_age <= settings.sound_open_age
        assert all(percent > 0 for _, percent in settings.population_error)
    assert {settings.open_interval for settings in SETTINGS.values()} == set(OPEN_INTERVALS)
    assert {settings.inside for settings in SETTINGS.values()} == set(INSIDE)
    assert {settings.smoothing for settings in SETTINGS.values()} == set(SMOOTHINGS)


def test_names_and_labels_are_few_and_told_apart() -> None:
    assert len(SETTINGS) <= MOST
    assert len({settings.label for settings in SETTINGS.values()}) == len(SETTINGS)
    choices = [
        tuple(getattr(one, field.name) for field in fields(Settings)[2:])
        for one in SETTINGS.values()
    ]
    assert len(set(choices)) == len(choices)


@pytest.mark.parametrize("law", ["one_over_m", "gompertz", "kannisto"])
def test_an_entry_is_never_edited(law: str) -> None:
    settings = find("almanac-1" if law == "one_over_m" else f"almanac-1-{law}")
    assert settings.open_interval == law
    assert {name: getattr(settings, name) for name in FIRST} == FIRST


@EVERY
def test_every_stage_has_its_sentence(settings: Settings) -> None:
    names = [stage.name for stage in settings.stages]
    assert len(set(names)) == len(names)
    assert all(stage.sentence.endswith(".") for stage in settings.stages)
    assert not any("{" in stage.sentence for stage in settings.stages)


@pytest.mark.parametrize("choices", [FIRST_YEAR, CHILD, INSIDE, OPEN_INTERVALS, SMOOTHINGS])
def test_every_stage_there_is_can_be_put_in_words(choices: dict[str, object]) -> None:
    names = ("first_year", "child", "inside", "open_interval", "smoothing")
    field = names[[FIRST_YEAR, CHILD, INSIDE, OPEN_INTERVALS, SMOOTHINGS].index(choices)]
    for key in choices:
        chosen = {"open_interval": "one_over_m", field: key}
        assert all(stage.sentence for stage in Settings("x", "X", **chosen).stages)


def test_what_a_chain_does_besides_is_said() -> None:
    def said(key: str) -> str:
        return " ".join(stage.sentence for stage in find(key).stages)

    assert "3 years, the one named and those before" in said("almanac-1-3-years")
    assert "borrowed" in said("almanac-1-borrow")
    assert "borrowed" not in said("almanac-1")
    assert "below 75" in said("almanac-2")
    assert "by 2 % from age 0" in said("almanac-1-population-2")
    assert "smooth curve" in said("almanac-1-smooth")
    assert "Dobson" in said("almanac-1-dobson")


def test_the_years_that_are_added_up() -> None:
    assert span("2014", 1) == ("2014",)
    assert span("2014", 3) == ("2012", "2013", "2014")
    assert span("2001", 5)[0] == "1997"
    assert span("1001", 3) == ("0999", "1000", "1001")
    for period, years in (("2014-W05", 3), ("14", 3), ("2014", 0), ("0002", 3)):
        with pytest.raises(ValueError, match="is no span of years; name its last year"):
            span(period, years)


def test_an_unknown_name_is_answered_with_the_names_there_are() -> None:
    assert find("almanac-1").open_interval == "one_over_m"
    with pytest.raises(ValueError, match=r"'almanac-9'.*almanac-1, almanac-1-gompertz"):
        find("almanac-9")
