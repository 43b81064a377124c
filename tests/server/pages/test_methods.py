"""The methods page as data: chapters as the registry groups them, standards as published."""

import pytest

from engine.indicators import GROUPS, INDICATORS, find
from engine.settings import SETTINGS
from engine.standards import STANDARDS
from server.pages.methods import MethodsPage, build
from server.sentences import methods as say


@pytest.fixture(scope="module")
def page() -> MethodsPage:
    return build()


def test_chapters_are_the_groups_of_the_registry(page: MethodsPage) -> None:
    assert [one.key for one in page.chapters] == [group.key for group in GROUPS]
    for chapter, group in zip(page.chapters, GROUPS, strict=True):
        assert (chapter.label, chapter.question) == (group.label, group.question)
        assert [entry.key for entry in chapter.entries] == [one.key for one in group.indicators]
    keys = [entry.key for chapter in page.chapters for entry in chapter.entries]
    assert sorted(keys) == sorted(INDICATORS)


def test_every_chapter_and_chain_is_linked_from_the_top(page: MethodsPage) -> None:
    targets = {piece.href for sentence in page.links for piece in sentence}
    assert targets >= {f"#{one.key}" for one in page.chapters}
    assert targets >= {f"#{one.key}" for one in page.chains}
    assert [one.key for one in page.chains] == list(SETTINGS)


def test_standards_are_told_age_by_age(page: MethodsPage) -> None:
    table = page.table("standards")
    found: dict[str, list[tuple[object, ...]]] = {}
    for row in table.rows:
        found.setdefault(str(row.cells[0]), []).append(row.cells)
    assert list(found) == [f"asr_{key}" for key in STANDARDS]
    at = {name: table.column(name) for name in ("age", "weight", "label")}
    for key, cells in found.items():
        standard = STANDARDS[key.removeprefix("asr_")]
        assert tuple(one[at["weight"]] for one in cells) == standard.weights
        assert tuple(one[at["age"]] for one in cells) == standard.grid.labels
        assert find(key).needs.whole is False  # each key can be asked for


def test_how_an_interval_comes_about_is_told_of_every_indicator(page: MethodsPage) -> None:
    for chapter in page.chapters:
        for entry in chapter.entries:
            assert dict(entry.facts)["Interval"] == say.interval(INDICATORS[entry.key])
