"""Keys, how they are found, and what an unknown one is told."""

import pytest

from engine.indicators import INDICATORS, find


def test_the_order_is_that_of_the_pages() -> None:
    assert list(INDICATORS) == [
        "e0", "e65", "median", "mode", "mode_raw", "mode_parabola", "edagger", "H", "45q15", "5q0",
        "ageing_rate",
    ]  # fmt: skip


def test_life_expectancy_at_any_age_is_found() -> None:
    assert find("e0").label == "Life expectancy at birth"
    assert find("e1").label == "Life expectancy at 1"
    assert find("e120").key == "e120"


@pytest.mark.parametrize("key", ["", "e", "e121", "e-1", "e065", "e5.5", "E0", "mode ", "q0"])
def test_an_unknown_key_is_told_the_known_ones(key: str) -> None:
    with pytest.raises(ValueError, match=r"the names are e0, e65, .*ageing_rate, and e followed"):
        find(key)


def test_what_is_not_smooth_has_no_derivatives() -> None:
    with pytest.raises(ValueError, match="not smooth"):
        INDICATORS["mode"].partials(None)  # type: ignore[arg-type]
    assert {key for key, i in INDICATORS.items() if not i.smooth} == {
        "median", "mode", "mode_raw", "mode_parabola",
    }  # fmt: skip


def test_units_scale_for_print_only() -> None:
    units = {key: (i.unit.scale, i.unit.decimals) for key, i in INDICATORS.items()}
    assert units["e0"] == (1, 1)
    assert units["H"] == (1, 3)
    assert units["45q15"] == units["5q0"] == (1000, 1)
    assert units["ageing_rate"] == (100, 1)
