"""Keys, groups, how an entry is found, and what an unknown key is told."""

import pytest

from engine.indicators import FAMILIES, GROUPS, INDICATORS, find


def test_every_entry_of_a_family_stands_in_one_group() -> None:
    declared = [one.key for family in FAMILIES for one in family.FAMILY]
    grouped = [one.key for group in GROUPS for one in group.indicators]
    assert len(set(declared)) == len(declared)
    assert sorted(grouped) == sorted(declared)


def test_the_order_is_that_of_the_groups() -> None:
    assert [group.key for group in GROUPS] == ["level", "spread", "shape", "rates", "young"]
    assert list(INDICATORS) == [one.key for group in GROUPS for one in group.indicators]
    assert next(iter(INDICATORS)) == "e0"
    assert "5q0" in [one.key for one in GROUPS[-1].indicators]


def test_a_group_asks_one_question() -> None:
    assert all(group.label and group.question.endswith("?") for group in GROUPS)
    assert all(group.question.count("?") == 1 for group in GROUPS)
    assert len({group.label for group in GROUPS}) == len(GROUPS)


@pytest.mark.parametrize(
    ("key", "label"),
    [
        ("e0", "Life expectancy at birth"),
        ("e1", "Life expectancy at 1"),
        ("e120", "Life expectancy at 120"),
        ("e0_65", "Years lived before 65"),
        ("e30_70", "Years lived between 30 and 70"),
        ("1q0", "Chance of dying before age 1"),
        ("20q40", "Chance of dying between 40 and 60"),
        ("1q119", "Chance of dying between 119 and 120"),
        ("l1", "Survivors to 1"),
        ("l120", "Survivors to 120"),
        ("yll1", "Years of life lost before 1"),
        ("yll120", "Years of life lost before 120"),
        (
            "asr75_esp2013",
            "Age-standardised death rate before 75 (European Standard Population 2013)",
        ),
        ("asr_by_isle.f.2020", "Age-standardised death rate (ages of isle.f.2020)"),
        ("asr_by_st.ives-1.p.1998", "Age-standardised death rate (ages of st.ives-1.p.1998)"),
    ],
)
def test_ages_are_read_out_of_a_key(key: str, label: str) -> None:
    assert find(key).key == key
    assert find(key).label == label


def test_what_is_listed_is_what_is_found() -> None:
    for key, entry in INDICATORS.items():
        assert find(key) is entry
    for one in (find("40q30"), find("e15_65"), find("l65")):
        assert one in INDICATORS.values()


@pytest.mark.parametrize(
    "key",
    ["", "e", "e-1", "e065", "e5.5", "E0", "mode ", "q0", "5q", "5q05", "05q0", "l", "l065",
     "e15_065", "yll", "yll075", "asr_by_", "asr_by_isle", "asr_by_isle.x.2020", "asr_by_isle.f.20",
     "asr_esp2012", "asr75_", "asr75_esp2012", "asr075_esp2013",
     "e15-65", "e15_65_", "e1234", "\N{ARABIC-INDIC DIGIT FIVE}q0"],
)  # fmt: skip
def test_an_unknown_key_is_told_the_known_ones(key: str) -> None:
    told = r"the names are e0, e65, .*5q0.* with other ages.* e80, e15_65, 40q30, l65"
    with pytest.raises(ValueError, match=told):
        find(key)


@pytest.mark.parametrize(
    "key", ["e121", "e65_15", "e15_15", "e15_121", "0q30", "60q61", "l0", "l121", "yll0", "yll121"]
)
def test_ages_that_make_no_figure_are_refused(key: str) -> None:
    with pytest.raises(ValueError, match="make no indicator; ages rise from the first to the last"):
        find(key)


def test_what_is_not_smooth_has_no_derivatives() -> None:
    with pytest.raises(ValueError, match="not smooth"):
        INDICATORS["mode"].partials(None)  # type: ignore[arg-type]
    stepped = {key for key, i in INDICATORS.items() if not i.smooth}
    assert {
        "median", "lower_quartile", "upper_quartile", "iqr", "shortest_half",
        "mode", "mode_raw", "mode_parabola",
        "edagger_early", "edagger_late", "threshold_edagger", "threshold_H",
    } == stepped  # fmt: skip


def test_what_tells_of_spread_needs_a_small_open_group() -> None:
    apart = {"median", "lower_quartile"}
    for group in GROUPS:
        for one in group.indicators:
            if group.key in ("spread", "shape") and one.key != "ageing_rate":
                assert one.spread, one.key
            assert not (one.key in apart and one.spread)
    assert all(INDICATORS[key].spread for key in ("upper_quartile", "mode"))


def test_units_scale_for_print_only() -> None:
    units = {key: (i.unit.scale, i.unit.decimals) for key, i in INDICATORS.items()}
    assert units["e0"] == (1, 1)
    assert units["H"] == units["gini"] == (1, 3)
    assert units["theil"] == (1, 4)
    assert units["45q15"] == units["5q0"] == (1000, 1)
    assert units["l65"] == (100, 1)
    assert units["ageing_rate"] == (100, 1)
    assert units["cdr"] == units["asr_segi"] == units["isr"] == (100_000, 1)
    assert units["yll75"] == units["yll_ref"] == (100_000, 0)
    assert units["imr"] == units["sbr"] == (1000, 1)


def test_parts_of_a_whole_keep_limits_between_0_and_1() -> None:
    for key in ("l65", "45q15", "40q30", "5q0", "l90", "1q0"):
        assert find(key).unit.limits == "part", key
