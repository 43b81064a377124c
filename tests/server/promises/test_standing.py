"""What is told of an edition that was withdrawn, and where an address without a number leads."""

from collections.abc import Callable
from pathlib import Path

import pytest

from seed_scenarios import quillmere
from server.results.questions import address
from tests.server.promises.island import EDITION, reading, reinstate, sample, withdraw

pytestmark = pytest.mark.slow

NOTE = "Deaths of one week were counted twice."


def test_a_withdrawal_is_told_on_every_page_and_undone(copied: Callable[[], Path]) -> None:
    asked = sample()
    pinned = {one: address(quillmere.CODE, EDITION, one) for one in asked}
    loose = {one: f"/c/{quillmere.CODE}/{one.view}?{one.canonical()}" for one in asked}
    with reading(copied()) as reader:
        for one in asked:
            assert NOTE not in reader.get(pinned[one]).text
            assert reader.get(loose[one]).headers["location"] == pinned[one]
        withdraw(reader, EDITION, NOTE)
        for one in asked:
            answer = reader.get(pinned[one])
            assert answer.status_code == 200
            assert f"Edition {EDITION} was withdrawn on" in answer.text
            assert NOTE in answer.text
            before = pinned[one].replace(f"/{EDITION}/", f"/{EDITION - 1}/")
            assert reader.get(loose[one]).headers["location"] == before
            assert "A newer edition stands" not in reader.get(before).text
        reinstate(reader, EDITION)
        for one in asked:
            assert NOTE not in reader.get(pinned[one]).text
            assert reader.get(loose[one]).headers["location"] == pinned[one]


def test_a_superseded_page_tells_by_how_much_the_revision_moves_it(island: Path) -> None:
    whole = "/c/quillmere/1/population-year?of=quillmere.m.2021&figures=released&settings=almanac-1"
    elsewhere = whole.replace("2021", "2020")
    with reading(island) as reader:
        said = reader.get(whole).text
        assert "A newer edition stands" in said
        assert " less here. Life expectancy at birth: " in said
        assert " gives the same here (Life expectancy at birth: " in reader.get(elsewhere).text
        assert "A newer edition stands" not in reader.get(whole.replace("/1/", "/2/")).text
