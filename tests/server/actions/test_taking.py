"""Part of an upload, and what gives way to it: each choice, and random histories of them against a
plain model."""

import os
import random
from dataclasses import replace

import pytest
from sqlalchemy.orm import Session

from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.actions.rebuild_editions import rebuild_editions
from server.actions.totals import giving_way
from server.store import areas, editions, schedules
from server.store.errors import Refused
from server.store.records import (
    ALL_OF_IT,
    GIVES_WAY,
    Edition,
    Effect,
    Key,
    Selection,
    Taking,
)
from tests.factories import COLUMNS, NOON, checked_upload, counts_csv, stored_collection, withdrawn

WHOLE = replace(COLUMNS, whole="isle", whole_name="The isle")
HISTORIES = {"sqlite": 5, "postgresql": 1}
EVERYTHING = Selection(cause=None)
Held = dict[tuple[str, str, str, str], list[float]]  # area, sex, period, measure


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


def handed(
    session: Session, content: bytes, taking: Taking = ALL_OF_IT, *, code: str = "saltmarsh"
) -> Edition:
    upload = checked_upload(session, content, mapping=WHOLE, collection=code)
    return commit_upload(session, upload_id=upload.id, note="n", by=LOCAL, now=NOON, taking=taking)


def held(session: Session, number: int, code: str = "saltmarsh") -> Held:
    found = schedules.load(session, code, number, EVERYTHING)
    return {
        (key.area, key.sex, key.period, key.measure): cell.values.tolist()
        for key, cell in found.items()
    }


def places(content: Held, sexes: str = "f") -> set[tuple[str, str]]:
    """Areas and years with deaths of these."""
    return {(a, year) for a, sex, year, measure in content if sex in sexes and measure == "deaths"}


def test_only_a_year_is_taken(session: Session) -> None:
    handed(session, counts_csv())
    edition = handed(session, counts_csv(times=3), Taking(periods=("2001",)))
    before, after = held(session, 1), held(session, 2)
    assert {key[2] for key in after if after[key] != before[key]} == {"2001"}
    assert (edition.taking, edition.replaces) == (Taking(periods=("2001",)), False)
    assert edition.effect == Effect(changed=9)  # deaths of two areas and their whole, three sexes
    assert after["isle", "p", "2001", "deaths"][0] == 3 * before["isle", "p", "2001", "deaths"][0]


def test_only_an_area_is_taken_and_the_whole_follows(session: Session) -> None:
    handed(session, counts_csv())
    handed(session, counts_csv(times=2), Taking(areas=("south",)))
    before, after = held(session, 1), held(session, 2)
    assert {key[0] for key in after if after[key] != before[key]} == {"south", "isle"}
    for at, whole in enumerate(after["isle", "m", "2002", "deaths"]):
        parts = [after[one, "m", "2002", "deaths"][at] for one in ("north", "south")]
        assert whole == sum(parts)


def test_an_area_taken_alone_brings_its_whole_into_an_empty_collection(session: Session) -> None:
    handed(session, counts_csv(), Taking(areas=("south",)))
    tree = [(one.code, one.parent) for one in areas.listing(session, "saltmarsh", 1)]
    assert tree == [("isle", ""), ("south", "isle")]
    assert places(held(session, 1)) == {
        (area, year) for area in ("isle", "south") for year in ("2001", "2002")
    }


@pytest.mark.parametrize(
    ("gives_way", "left"),
    [
        ("cells", {("north", "2001"), ("north", "2002"), ("south", "2001"), ("south", "2002")}),
        ("handed", {("north", "2002"), ("south", "2001"), ("south", "2002")}),
        ("years", {("north", "2002"), ("south", "2002")}),
        ("areas", {("south", "2001"), ("south", "2002")}),
        ("all", set()),
    ],
)
def test_what_gives_way(session: Session, gives_way: str, left: set[tuple[str, str]]) -> None:
    """The women of one area and year are handed in; what stays of the men says what was dropped."""
    handed(session, counts_csv())
    content = counts_csv(["north"], years=[2001], sexes="f", times=5)
    edition = handed(session, content, Taking(gives_way=gives_way))
    after = held(session, 2)
    parts = {key: value for key, value in after.items() if key[0] != "isle"}
    assert places(parts, "m") == left
    assert parts["north", "f", "2001", "deaths"][0] == 105.0
    # persons and the whole stand only where both sexes and both areas do
    assert places(parts, "p") == places(parts, "f") & left
    whole = {year for _, year in places({k: v for k, v in after.items() if k[0] == "isle"}, "m")}
    assert whole == {y for y in ("2001", "2002") if {("north", y), ("south", y)} <= left}
    assert edition.replaces == (gives_way == "all")
    stood, effect = held(session, 1), edition.effect
    assert effect is not None
    assert effect.dropped == len(stood.keys() - after.keys())
    assert effect.added == len(after.keys() - stood.keys())
    assert effect.changed == sum(after[key] != stood[key] for key in after.keys() & stood.keys())


def test_the_same_numbers_made_final_are_told_from_new_ones(session: Session) -> None:
    provisional = replace(WHOLE, provisional_years=("2002",))
    upload = checked_upload(session, counts_csv(), mapping=provisional)
    commit_upload(session, upload_id=upload.id, note="n", by=LOCAL, now=NOON)
    edition = handed(session, counts_csv())
    assert edition.effect == Effect(restated=18)  # both measures, three areas, three sexes


@pytest.mark.parametrize(
    ("taking", "said"),
    [
        (Taking(areas=("east",)), "The areas east were not handed in; the files hold"),
        (Taking(periods=("1999", "2001")), "The years 1999 were not handed in.*2001, 2002"),
        (Taking(areas=("isle",)), "Of these areas and years the files hold no counts"),
    ],
)
def test_what_was_not_handed_in_is_refused(session: Session, taking: Taking, said: str) -> None:
    with pytest.raises(Refused, match=said):
        handed(session, counts_csv(), taking)
    assert editions.listing(session, "saltmarsh") == ()


def test_every_choice_has_its_rule() -> None:
    keys = [Key(area, "f", year, "deaths") for area in "ab" for year in ("2001", "2002")]
    for choice in GIVES_WAY:
        giving_way(keys, keys[:1], Taking(gives_way=choice))


class History:
    """A collection, and beside it a plain model of the women and men of each part."""

    def __init__(self, session: Session, seed: int) -> None:
        self.session, self.random, self.code = session, random.Random(seed), f"c{seed}"
        stored_collection(session, self.code)
        self.copies: dict[int, Held] = {}  # as committed, all of it
        self.parts: dict[int, Held] = {0: {}}  # the model's women and men
        self.gone: set[int] = set()

    def step(self) -> None:
        pick = self.random
        areas_ = pick.sample(("north", "south"), pick.choice((1, 2)))
        years = pick.sample((2001, 2002, 2003), pick.choice((1, 2)))
        sexes, times = pick.choice(("fm", "f", "fm")), pick.randrange(1, 9)
        taking = Taking(
            tuple(pick.sample(areas_, 1)) if pick.random() < 0.4 else (),
            tuple(str(year) for year in pick.sample(years, 1)) if pick.random() < 0.4 else (),
            pick.choice(GIVES_WAY),
        )
        base = max(set(self.parts) - self.gone)
        content = counts_csv(areas_, years=years, sexes=sexes, times=times)
        edition = handed(self.session, content, taking, code=self.code)
        self.copies[edition.number] = held(self.session, edition.number, self.code)
        self.parts[edition.number] = self.laid(base, content, taking)
        if pick.random() < 0.2:
            withdrawn(self.session, edition.number, self.code)
            self.gone.add(edition.number)

    def laid(self, base: int, content: bytes, taking: Taking) -> Held:
        taken: Held = {}
        for line in content.decode().splitlines()[1:]:
            year, sex, _, area, deaths, people = line.split(",")
            if (not taking.areas or area in taking.areas) and (
                not taking.periods or year in taking.periods
            ):
                for measure, count in (("deaths", deaths), ("person_years", people)):
                    taken.setdefault((area, sex, year, measure), []).append(float(count))
        areas_, years = {key[0] for key in taken}, {key[2] for key in taken}
        stays = {
            "cells": lambda area, year: True,
            "handed": lambda area, year: not (area in areas_ and year in years),
            "years": lambda area, year: year not in years,
            "areas": lambda area, year: area not in areas_,
            "all": lambda area, year: False,
        }[taking.gives_way]
        stood = self.parts[base]
        return {key: cell for key, cell in stood.items() if stays(key[0], key[2])} | taken

    def require_right(self) -> None:
        for number, copy in self.copies.items():
            assert held(self.session, number, self.code) == copy
            model = self.parts[number]
            assert {k: v for k, v in copy.items() if k[0] != "isle" and k[1] != "p"} == model
            for area, sex, year, measure in copy:
                if sex == "p" and area != "isle":
                    both = [model[area, one, year, measure] for one in "fm"]
                    assert copy[area, "p", year, measure] == [
                        a + b for a, b in zip(*both, strict=True)
                    ]
            persons = {k for k in copy if k[1] == "p" and k[0] != "isle"}
            women = {(a, y, m) for a, s, y, m in model if s == "f"}
            assert {(a, y, m) for a, _, y, m in persons} == {
                (a, y, m) for a, s, y, m in model if s == "m" and (a, y, m) in women
            }


def test_random_takings_leave_what_a_plain_model_says(session: Session) -> None:
    """EBBLINE_HISTORIES=100 in the environment makes the long run."""
    dialect = session.get_bind().dialect.name
    for seed in range(int(os.environ.get("EBBLINE_HISTORIES", HISTORIES[dialect]))):
        history = History(session, seed)
        for _ in range(6):
            history.step()
        history.require_right()
        report = rebuild_editions(session, collection=history.code, by=LOCAL)
        assert [one.same for one in report] == [True] * len(history.copies)
