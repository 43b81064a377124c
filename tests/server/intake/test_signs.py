"""A dash, or another sign, where a number belongs: asked, then read as was said."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.intake.mapping import SIGNS, Mapping
from server.intake.parsing import Handed, Parsed, parse
from server.intake.reading import MOST_SIGNS
from server.intake.recognising.look import Before, Looked, look, said_in
from server.store.records import Key
from tests.server.intake.tables import counts, csv, population, rows, setting, where
from tests.server.intake.tables import deaths as of_deaths

SOUND = rows()
WOMEN = where(SOUND, area="north", year=2012, sex="f")
NILS = [WOMEN[1], WOMEN[3]]
PLACE = Key("north", "f", "2012", "deaths")


def signed(*signs: str) -> list[dict[str, object]]:
    """The table with these signs for the deaths of as many rows."""
    table = SOUND
    for row, sign in zip(WOMEN, signs, strict=False):
        table = setting(table, [row], deaths=sign)
    return table


def answered(content: bytes, looked: Looked, *signs: tuple[str, str]) -> Looked:
    shown = looked.mapping.form
    said = replace(said_in(looked.mapping, looked.role), shown=shown, marks=True, signs=signs)
    return look(content, "counts.csv", looked.role, said)


def read(looked: Looked, content: bytes) -> Parsed:
    return parse([Handed("counts", "counts.csv", content, looked.mapping)])


@pytest.mark.parametrize("sign", ["-", "–", "—", "..", "...", ":", "*", "x", "n/a", "NA", "#N/A"])
def test_a_sign_is_asked_until_it_is_answered(sign: str) -> None:
    content = csv(signed(sign))
    looked = look(content, "counts.csv", "counts")
    assert (looked.open, looked.signs, looked.mapping.signs) == (("signs",), (sign,), ())
    assert answered(content, looked).open == ("signs",)
    assert answered(content, looked, ("other", "nil")).open == ("signs",)
    done = answered(content, looked, (sign, "nil"))
    assert done.open == ()
    assert (
        read(done, content).problems
        == parse([counts(setting(SOUND, WOMEN[:1], deaths=0))]).problems
    )


def test_unasked_it_is_never_taken_for_a_number() -> None:
    (problem,) = parse([counts(signed("–"))]).errors
    assert (problem.key, problem.row) == ("not_a_number", SOUND.index(WOMEN[0]) + 2)


def test_plain_numbers_raise_no_question() -> None:
    looked = look(csv(SOUND), "counts.csv", "counts")
    assert (looked.open, looked.signs) == ((), ())
    dotted = csv(setting(SOUND, WOMEN[:1], deaths="12a"))
    assert look(dotted, "counts.csv", "counts").signs == ()  # a slip, which the checks tell


def test_one_that_stands_far_down_is_asked_too() -> None:
    """Behind more different numbers than are looked at otherwise."""
    lines = [f"2014,f,{age},n,{age}.5,1000\n" for age in range(4_000)]
    content = "".join(["year,sex,age,area,deaths,population\n", *lines, "2014,m,0,n,..,9\n"])
    assert look(content.encode(), "counts.csv", "counts").signs == ("..",)


def test_a_column_of_many_texts_holds_something_else() -> None:
    table = SOUND
    for at, letter in enumerate("abcdefghijkl"):
        table = setting(table, [SOUND[at]], deaths=letter)
    assert len("abcdefghijkl") > MOST_SIGNS
    assert look(csv(table), "counts.csv", "counts").signs == ()


@given(cells=st.sets(st.integers(0, len(SOUND) - 1), min_size=1, max_size=12))
def test_nil_is_nought_and_nothing_else(cells: set[int]) -> None:
    """The law: what is read of a dash for nil is what is read of a 0 in its place."""
    picked = [SOUND[at] for at in cells]
    dashed = parse([counts(setting(SOUND, picked, deaths="–"), signs=(("–", "nil"),))])
    plain = parse([counts(setting(SOUND, picked, deaths=0))])
    assert dashed.problems == plain.problems
    assert dashed.cells.keys() == plain.cells.keys()
    for key, cell in dashed.cells.items():
        np.testing.assert_array_equal(cell.values, plain.cells[key].values)


@pytest.mark.parametrize("meaning", ["not_available", "withheld"])
@given(cells=st.sets(st.integers(0, len(SOUND) - 1), min_size=1, max_size=4))
def test_what_is_not_known_leaves_out_its_series_alone(meaning: str, cells: set[int]) -> None:
    """The law: all else is as if every row of these areas, sexes and years had not been there, and
    no 0 is put in a gap's place."""
    picked = [SOUND[at] for at in cells]
    said = parse([counts(setting(SOUND, picked, deaths="–"), signs=(("–", meaning),))])
    gone = {(row["area"], row["sex"], str(row["year"])) for row in picked}
    whole = parse([counts(SOUND)])
    left = {key for key in whole.cells if key[:3] not in gone}
    assert said.cells.keys() == left
    for key in left:
        np.testing.assert_array_equal(said.cells[key].values, whole.cells[key].values)
    assert not said.errors
    assert said.sound_count == said.row_count == len(SOUND)
    told = [one for one in said.problems if one.key == f"count_{meaning}"]
    assert sum(one.rows for one in told) == len(cells)


def test_a_mistake_is_told_row_by_row() -> None:
    found = parse([counts(signed("x", "x"), signs=(("x", "mistake"),))])
    assert [(one.key, one.rows) for one in found.errors] == [("not_a_number", 2)]


def test_population_in_a_file_of_its_own_stays() -> None:
    """Deaths of a series are not known; how many people there were is."""
    died = of_deaths(signed("–"), signs=(("–", "not_available"),))
    cells = parse([died, population(SOUND)]).cells
    assert PLACE not in cells
    assert PLACE._replace(measure="person_years") in cells


def test_a_total_that_is_not_known_leaves_its_ages_as_they_are() -> None:
    total = {**WOMEN[0], "age": "all ages", "deaths": "–", "population": 68_259}
    found = parse([counts([*SOUND, total], signs=(("–", "withheld"),))])
    assert found.cells.keys() == parse([counts(SOUND)]).cells.keys()
    assert [one.key for one in found.problems] == ["count_withheld"]


def test_what_was_said_is_remembered() -> None:
    content = csv(signed("–"))
    kept = answered(content, look(content, "a.csv", "counts"), ("–", "withheld")).mapping
    assert Mapping.from_json(kept.to_json()) == kept
    again = look(csv(signed("–", "–")), "b.csv", "counts", None, [Before(1, kept)])
    assert (again.open, again.mapping.signs) == ((), (("–", "withheld"),))
    other = look(csv(signed("..")), "b.csv", "counts", None, [Before(1, kept)])
    assert other.open == ("signs",)


def test_every_meaning_can_be_told_from_the_others() -> None:
    found = {}
    for meaning in SIGNS:
        parsed = parse([counts(signed("–"), signs=(("–", meaning),))])
        found[meaning] = ([one.key for one in parsed.problems], PLACE in parsed.cells)
    assert len({str(one) for one in found.values()}) == len(SIGNS)
