"""The methods page is written from the registries: no entry of one is left out."""

import dataclasses

import pytest

from engine.causes.registry import NUMBERS
from engine.indicators import INDICATORS
from engine.settings import SETTINGS
from server.intake.checks import KINDS
from server.pages import methods
from server.pages.methods import MethodsPage

pytestmark = pytest.mark.house


@pytest.fixture(scope="module")
def page() -> MethodsPage:
    return methods.build()


def test_every_indicator_stands_there_with_all_it_declares(page: MethodsPage) -> None:
    entries = [entry for chapter in page.chapters for entry in chapter.entries]
    assert [entry.key for entry in entries] == list(INDICATORS)
    for entry in entries:
        declared = INDICATORS[entry.key]
        printed = str(entry.facts)
        for text in (declared.definition, declared.formula, declared.source, declared.unit.label):
            assert text in printed, entry.key
        if not declared.smooth:
            assert declared.why_not_smooth, entry.key
            assert declared.why_not_smooth in printed, entry.key


def test_every_number_by_cause_stands_there(page: MethodsPage) -> None:
    assert [entry.key for entry in page.by_cause] == [f"cause-{key}" for key in NUMBERS]
    for entry, declared in zip(page.by_cause, NUMBERS.values(), strict=True):
        printed = str(entry.facts)
        for text in (declared.definition, declared.formula, declared.source, declared.unit.label):
            assert text in printed, entry.key


def test_every_settings_chain_stands_there_with_its_stages(page: MethodsPage) -> None:
    assert [entry.key for entry in page.chains] == list(SETTINGS)
    for entry in page.chains:
        printed = str(entry.facts)
        assert all(stage.sentence in printed for stage in SETTINGS[entry.key].stages), entry.key


def test_every_check_at_intake_stands_there(page: MethodsPage) -> None:
    printed = str([table.rows for table in page.tables])
    assert [kind.key for kind in KINDS.values() if kind.meaning not in printed] == []


def test_an_indicator_has_room_for_twelve_facts_and_no_more() -> None:
    for declared in INDICATORS.values():
        assert len(dataclasses.fields(declared)) <= 12
