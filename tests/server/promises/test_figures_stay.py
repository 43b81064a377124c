"""What an address has shown once it shows for ever: the figures of every address of the
demonstration, to the byte, whatever befalls the data after."""

from collections import Counter
from collections.abc import Callable
from pathlib import Path

import pytest

from tests.server.promises.island import (
    EDITION,
    addresses,
    differing,
    figures,
    reading,
    reinstate,
    revise,
    sample,
    shown,
    withdraw,
    writing,
)

pytestmark = pytest.mark.slow


@pytest.mark.parametrize(
    ("view", "most_alike"),
    [("population-year", 1), ("curves", 1), ("comparison", 1), ("trend", 3), ("contents", 3)],
)
def test_figures_of_every_address_stay_to_the_byte(
    copied: Callable[[], Path], view: str, most_alike: int
) -> None:
    island = copied()
    places = [place for place in addresses("json") if f"/{view}.json" in place]
    with reading(island) as reader:
        before = {place: figures(reader, place) for place in places}
    assert max(Counter(before.values()).values()) <= most_alike  # a law moves only old ages
    with writing(island) as session:
        newer = revise(session)
    with reading(island) as reader:
        withdraw(reader, EDITION, "Replaced.")
        after = {place: figures(reader, place) for place in places}
        place = places[0]
        assert figures(reader, place.replace(f"/{EDITION}/", f"/{newer}/")) != before[place]
    assert differing(before, after) == []


def test_all_twins_stay_through_revision_withdrawal_reinstatement_and_restart(
    copied: Callable[[], Path],
) -> None:
    island, asked = copied(), sample()
    with reading(island) as reader:
        before = shown(reader, asked)
        assert {place.split("?")[0].rpartition(".")[2] for place in before} == {
            "json",
            "csv",
            "xlsx",
        }
        with writing(island) as session:
            newer = revise(session)
        assert differing(before, shown(reader, asked)) == [], "after a revision"
        for place in before:
            if place.partition("?")[0].endswith(".json"):
                there = place.replace(f"/{EDITION}/", f"/{newer}/")
                assert figures(reader, there) != before[place], there
        withdraw(reader, EDITION, "Sent by mistake.")
        assert differing(before, shown(reader, asked)) == [], "after a withdrawal"
        reinstate(reader, EDITION)
        withdraw(reader, newer, "It was right.")
    with reading(island) as another:
        assert differing(before, shown(another, asked)) == [], "reinstated and started again"
