"""Each ugly file, looked at, answered and read, against the counts it was made of."""

from collections import defaultdict
from dataclasses import replace

import numpy as np
import pytest

from server.actions.recoding import recoded
from server.intake.parsing import Handed, Parsed, parse
from server.intake.recognising.look import look, said_in
from server.store.records import Key, Vector
from tests.ugly.make import CAUSES, FOLDER, SEXES, STARTS, YEARS, by_code, truth
from tests.ugly.stories import STORIES, Story

TRUTH = truth()
EVERY = pytest.mark.parametrize("story", STORIES.values(), ids=STORIES.keys())
REFUSED = [key for key, story in STORIES.items() if story.refused]


def handed(story: Story, role: str, *, mended: bool) -> Handed:
    """Looked at, answered, and looked at again as the page does with what was answered."""
    name = story.files[role]
    content = (FOLDER / name).read_bytes()
    if mended and story.mended:
        content = story.mended(content)
    first = look(content, name, role)
    assert not first.reading.problems
    answers = {} if role == "areas" else {**story.answers.get(role, {}), **story.shared}
    stated = replace(first.mapping, **answers)  # type: ignore[arg-type]
    said = replace(said_in(stated, role), shown=first.mapping.form)
    again = look(content, name, role, said)
    assert (again.open, again.changed) == ((), False)
    alone = {key: value for key, value in answers.items() if key in story.shared}
    return Handed(role, name, content, replace(again.mapping, **alone))  # type: ignore[arg-type]


def read(story: Story, *, mended: bool = True) -> Parsed:
    return parse([handed(story, role, mended=mended) for role in story.files])


def stored(story: Story, parsed: Parsed) -> dict[Key, Vector]:
    """With old codes given to what they became."""
    new = recoded(parsed.cells, parsed.successions)
    kept = {key: cell for key, cell in parsed.cells.items() if key not in new.gone}
    return kept | new.made


@EVERY
def test_only_what_a_file_does_not_say_is_asked(story: Story) -> None:
    asked = [
        look((FOLDER / name).read_bytes(), name, role).open for role, name in story.files.items()
    ]
    assert tuple(question for open_ in asked for question in open_) == story.asked


@EVERY
def test_the_counts_are_those_of_the_truth(story: Story) -> None:
    parsed = read(story)
    assert [one.key for one in parsed.problems] == list(story.warned)
    cells = stored(story, parsed)
    counts = {
        (key.measure, story.areas[key.area], key.sex, int(key.period)): cell
        for key, cell in cells.items()
        if key.measure in ("deaths", "person_years") and not key.cause
    }
    assert set(counts) == set(TRUTH)
    assert len(counts) == 2 * 3 * len(SEXES) * len(YEARS)
    for key, cell in counts.items():
        assert tuple(cell.grid.starts) == STARTS
        assert (cell.status == "provisional") == (str(key[3]) in story.provisional)
        if not (story.sums_alone and key[0] == "deaths"):
            np.testing.assert_allclose(cell.values, TRUTH[key], rtol=0, atol=story.near)
    for sums in by_year({key: cell.values for key, cell in counts.items()}, TRUTH).values():
        assert abs(sums[0] - sums[1]) <= max(story.near, 1e-6 * story.sums_alone)


def by_year(
    *of: dict[tuple[str, str, str, int], np.ndarray],
) -> dict[tuple[str, str, int], list[float]]:  # type: ignore[type-arg]
    """Sums over sexes and ages, of each."""
    found: dict[tuple[str, str, int], list[float]] = defaultdict(lambda: [0.0] * len(of))
    for place, counts in enumerate(of):
        for (measure, area, _, year), values in counts.items():
            found[measure, area, year][place] += float(values.sum())
    return found


def test_the_causes_are_those_of_the_truth() -> None:
    """Each code in its cause; a cause that has no vector has no deaths."""
    story = STORIES["11"]
    cells = read(story).cells
    for (measure, area, sex, year), dead in TRUTH.items():
        if measure != "deaths":
            continue
        code = next(code for code, name in story.areas.items() if name == area)
        key = Key(code, sex, str(year), "deaths")
        together = np.zeros(len(dead))
        for cause, codes in CAUSES.items():
            expected = np.array(
                [
                    sum(by_code(TRUTH, area, sex, year, place)[one] for one, _ in codes)
                    for place in range(len(dead))
                ]
            )
            cell = cells.get(key._replace(cause=cause))
            np.testing.assert_array_equal(0 * dead if cell is None else cell.values, expected)
            together += expected
        np.testing.assert_array_equal(together, dead)
    assert {key.cause for key in cells} == {"", *CAUSES}


def test_those_without_an_age_lie_near_where_they_belong() -> None:
    """Some 3 in 200 were moved at random, so that no age can be off by much."""
    cells = stored(STORIES["04"], read(STORIES["04"]))
    for key, cell in cells.items():
        if key.measure == "deaths":
            true = TRUTH[key.measure, key.area, key.sex, int(key.period)]
            assert (np.abs(cell.values - true) < 3 + 4 * np.sqrt(0.02 * true)).all()


def test_the_old_codes_are_gone() -> None:
    parsed = read(STORIES["05"])
    assert {key.area for key in parsed.cells} == {"N-01", "N-02", "south", "isle"}
    assert {key.area for key in stored(STORIES["05"], parsed)} == {"north", "south", "isle"}


def test_the_whole_is_said_in_one_step() -> None:
    name = STORIES["01"].files["counts"]
    assert look((FOLDER / name).read_bytes(), name, "counts").noticed.whole == "Insgesamt"
    parsed = read(STORIES["01"])
    assert parsed.whole == "insgesamt"
    assert {area.parent for area in parsed.areas if area.code != parsed.whole} == {"insgesamt"}


@pytest.mark.parametrize("which", REFUSED)
def test_what_cannot_be_believed_is_refused_cell_by_cell(which: str) -> None:
    story = STORIES[which]
    parsed = read(story, mended=False)
    told = tuple((one.key, one.rows, one.expected) for one in parsed.errors)
    assert told == story.refused
    assert all(one.row and one.column for one in parsed.errors)
