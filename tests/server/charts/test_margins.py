"""Names of rows have the room they need, and are cut on the phone before they take half of it."""

from server.charts.figure import figure
from server.charts.margins import LONGEST_NARROW, margins, short_name
from server.charts.template import CHARACTER, NARROW, WIDE
from tests.server.charts.records import RANKED, a_chart


def test_the_longest_name_fits_its_margin() -> None:
    longest = max(map(len, RANKED.y_text))
    assert margins(RANKED, WIDE)["l"] >= CHARACTER * longest
    narrow = margins(RANKED, NARROW)["l"]
    assert CHARACTER * LONGEST_NARROW * 13.5 / 14.5 <= narrow < NARROW.width / 2


def test_names_are_cut_on_the_phone_only() -> None:
    name = RANKED.y_text[0]
    assert short_name(name, RANKED, WIDE) == name
    cut = short_name(name, RANKED, NARROW)
    head, _mark, end = cut.partition("…")
    assert len(cut) <= LONGEST_NARROW
    assert name.startswith(head)
    assert name.endswith(end)
    other = a_chart(y_text=("a" * 40,))
    assert short_name("a" * 40, other, NARROW) == "a" * 40


def test_rows_of_one_area_keep_their_sex_and_year() -> None:
    names = [
        f"Copenhagen, inner and outer city together, {sex}, {year}"
        for sex in ("women", "men", "persons")
        for year in (2011, 2012)
    ]
    cut = [short_name(name, RANKED, NARROW) for name in names]
    assert cut[:2] == ["Copenhagen…, women, 2011", "Copenhagen…, women, 2012"]
    assert len(set(cut)) == len(names)
    assert all(len(one) <= LONGEST_NARROW for one in cut)
    assert short_name("Frederiksborg and Bornholm, men, 2011", RANKED, NARROW).endswith(
        ", men, 2011"
    )
    assert short_name("x" * 40, RANKED, NARROW) == "x" * (LONGEST_NARROW - 1) + "…"


def test_rows_reach_from_nought_to_their_amount() -> None:
    made = figure(RANKED, str)
    rays, ends = made["data"]
    assert rays["x"] == [0.0, -0.22, None, 0.0, 0.05, None]
    assert rays["y"] == [2.0, 2.0, None, 1.0, 1.0, None]
    assert (ends["x"], ends["y"]) == ([-0.22, 0.05], [2.0, 1.0])
    assert made["layout"]["xaxis"]["tickvals"] == [-0.2, -0.1, 0.0, 0.1]
    assert made["layout"]["xaxis"]["tickformat"] == "+,.1f"
    assert made["narrow"]["yaxis"]["ticktext"][1] == "Quillmere, women, 2021"
    upright = [one for one in made["layout"]["shapes"] if one["type"] == "line"]
    assert [(one["x0"], one["x1"], one["y0"], one["y1"]) for one in upright] == [(0, 0, 0, 1)]
