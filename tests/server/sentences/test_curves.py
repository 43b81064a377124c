"""What is said of the curves behind death rates, and never more than the numbers bear out."""

import pytest

from engine.settings import find as named
from server.sentences import curve_methods
from server.sentences import curves as say
from server.sentences.pieces import Piece, Sentence, plain


def words(sentence: Sentence) -> str:
    return plain(sentence).replace("\N{NO-BREAK SPACE}", " ")


@pytest.mark.parametrize(
    ("misses", "rough", "said"),
    [
        (False, False, "the law of Kannisto describes the death rates of women of Northlade in"),
        (True, False, "but misses more than chance would."),
        (True, True, "whether it misses something, so few deaths can hardly tell."),
        (False, True, "whether it misses something, so few deaths can hardly tell."),
    ],
)
def test_the_answer_says_whether_the_law_holds(misses: bool, rough: bool, said: str) -> None:
    told = words(say.answer("f", "Northlade", "2019", "Kannisto", 40, misses=misses, rough=rough))
    assert told.startswith("From age 40 the law of Kannisto ")
    assert said in told
    assert "women of Northlade in 2019" in told.replace("in\n", "in ")
    assert ("within what chance can do" in told) == (not misses and not rough)


def test_without_a_law_the_answer_says_why() -> None:
    assert words(say.no_answer("m", "Rock", "2019", "Too few people.")) == (
        "No law could be fitted to the death rates of men of Rock in 2019. Too few people."
    )
    assert words(say.no_answer("m", "Rock", "2019", "")).endswith("in 2019.")


MODE, SLOPE = (85.25, 85.0, 85.54), (0.1058, 0.1034, 0.1083)


def test_the_numbers_of_a_law_in_words() -> None:
    plain_law = words(say.meaning(MODE, SLOPE, background=0.0, levels_off=False))
    assert plain_law == (
        "By it deaths gather about age 85.2 (85.0 to 85.5), and death rates rise at 10.6 %"
        " (10.3 to 10.8) per year of age."
    )
    levelling = words(say.meaning(MODE, SLOPE, background=0.0, levels_off=True))
    assert levelling.endswith("per year of age, more slowly where they are high.")
    alike = words(say.meaning(MODE, SLOPE, background=4.7e-4, levels_off=False))
    assert alike.endswith("per year of age, beside 47.0 per 100,000 at all ages alike.")
    nowhere = (float("nan"),) * 3
    alone = words(say.meaning(nowhere, SLOPE, background=0.0, levels_off=False))
    assert alone == "By it death rates rise at 10.6 % (10.3 to 10.8) per year of age."


def test_how_far_the_counts_lie_from_the_law() -> None:
    near = words(say.fitness(16.83, 18.31, 10, misses=False, rough=False))
    assert "as near to it as chance lets them: deviance 16.8 with 10 age groups more" in near
    assert near.endswith("where chance seldom goes above 18.3.")
    far = words(say.fitness(31.4, 3.84, 1, misses=True, rough=True))
    assert "farther from it than chance brings them: deviance 31.4 with one age group" in far
    assert far.endswith("With so few deaths in many age groups this is rough.")


def test_other_laws() -> None:
    assert words(say.rivals("Kannisto", [])).endswith("The other laws do clearly less well.")
    near = words(say.rivals("Kannisto", [("Gompertz", 0.74), ("Makeham", 1.9)]))
    assert near.endswith("Gompertz (0.7 more) and Makeham (1.9 more).")


def test_where_a_law_leaves_the_band() -> None:
    inside = say.beside("Kannisto", [], 40, 100)
    assert inside.endswith("keeps within the band of the smooth curve from age 40 to 100")
    outside = say.beside("Kannisto", [40, 41, 42, 60, 99, 100], 40, 100)
    assert outside.endswith("leaves the band of the smooth curve at ages 40–42, 60 and 99–100")


def test_the_group_farthest_from_the_law() -> None:
    assert say.farthest("40–44", 12.4, clear=True).endswith("12 deaths more than it expects")
    assert say.farthest("98", -61.2, clear=True) == (
        "Farthest from the law: age 98, with 61 deaths fewer than it expects"
    )
    assert "No age group" in say.farthest("98", -61.2, clear=False)


LEVELS = {-1: (-0.05, -0.06, -0.04), 0: (-0.01, -0.03, 0.01), 1: (0.05, 0.04, 0.06)}
SHAPES = {-1: (0.95, 0.93, 0.97), 0: (1.01, 0.99, 1.03), 1: (1.05, 1.03, 1.07)}


WHERE = {
    (-1, 1): "the advantage is largest at young ages",
    (-1, -1): "the advantage is largest at old ages",
    (1, 1): "the disadvantage is largest at old ages",
    (1, -1): "the disadvantage is largest at young ages",
    (0, 1): "lower before it and higher after it",
    (0, -1): "higher before it and lower after it",
}


@pytest.mark.parametrize("level", LEVELS)
@pytest.mark.parametrize("shape", SHAPES)
def test_level_and_shape_are_told_as_far_as_they_are_clear(level: int, shape: int) -> None:
    said = words(say.related("Isle", 84.4, LEVELS[level], SHAPES[shape]))
    assert said.startswith("Against Isle ")
    assert ("more live to" in said or "are lower at all ages alike" in said) == (level < 0)
    assert ("fewer live to" in said or "are higher at all ages alike" in said) == (level > 0)
    assert ("rise faster with age" in said) == (shape > 0)
    assert ("rise more slowly with age" in said) == (shape < 0)
    assert ("no clear difference" in said) == (level == shape == 0)
    for key, text in WHERE.items():
        assert (text in said) == (key == (level, shape))
    assert f"{abs(LEVELS[level][0]):.3f}" in said
    assert f"{SHAPES[shape][0]:.3f}" in said
    assert ("age 84, which half" in said) == (shape != 0)


def test_the_age_that_half_would_reach_may_lie_beyond_the_table() -> None:
    said = words(say.related("Isle", float("nan"), LEVELS[1], SHAPES[1]))
    assert "fewer live to the age that half would reach there" in said


def test_methods_name_their_sources_and_only_those_used() -> None:
    settings = named("almanac-1-3-years")
    full = " ".join(
        words(step) for step in curve_methods.computed(settings, grouped=True, whole_area="Isle")
    )
    for source in ("Eilers & Marx 1996", "Whittaker 1923", "Henderson 1924", "Brass 1971"):
        assert source in full
    assert "Rizzi, Gampe & Eilers 2015" in full
    assert "Fritsch & Carlson 1980" in full
    assert "3 years" in full
    bare = " ".join(
        words(step) for step in curve_methods.computed(settings, grouped=False, whole_area="")
    )
    assert "Rizzi" not in bare
    assert "Brass" not in bare


def test_where_to_go_from_here() -> None:
    life, women = Piece("Life table", "/life"), Piece("women", "/women")
    links = say.further(life, [women], Piece("Compare it with Isle", "/compare"))
    assert [piece.href for said in links for piece in said if piece.href] == [
        *("/life", "/women", "/compare")
    ]
    assert len(say.further(life, [], None)) == 1
