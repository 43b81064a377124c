"""The lists that come with the program, and codes in them."""

import pytest

from server.intake.causes.codes import ICD_10, Code, notation
from server.intake.causes.limits import MEN, WOMEN
from server.intake.causes.lists import BUILT_IN, CHAPTERS, SHORT
from server.intake.causes.placing import LISTS, CauseList, own_list
from server.store.records import CARE, CAUSE_KINDS, Cause

# chapters of ICD-10, 5th edition (2016), Volume 1, as printed; the last of them provisional codes
PRINTED = [
    "A00-B99",
    "C00-D48",
    "D50-D89",
    "E00-E90",
    "F00-F99",
    "G00-G99",
    "H00-H59",
    "H60-H95",
    "I00-I99",
    "J00-J99",
    "K00-K93",
    "L00-L99",
    "M00-M99",
    "N00-N99",
    "O00-O99",
    "P00-P96",
    "Q00-Q99",
    "R00-R99",
    "S00-T98",
    "V01-Y98",
    "Z00-Z99",
    "U00-U99",
]
NOT_IN_USE = (Code("C", 98), Code("C", 99))  # room for more: the last malignant one is C97
LETTERS = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"
ALL_CODES = [Code(letter, number) for letter in LETTERS for number in range(100)]


def printed() -> list[Code]:
    """Every category that the chapters have room for."""
    found = []
    for chapter in PRINTED:
        first, last = ((end[0], int(end[1:])) for end in chapter.split("-"))
        found += [code for code in ALL_CODES if first <= code[:2] <= last]
    return found


@pytest.mark.parametrize("name", BUILT_IN)
def test_every_code_is_in_one_cause_and_no_other_is_in_any(name: str) -> None:
    causes, known = LISTS[name], set(printed())
    for code in ALL_CODES:
        holding = [leaf for one, leaf in causes.ranges if one.holds(code)]
        assert len(holding) == (code in known) or code in NOT_IN_USE, code


@pytest.mark.parametrize("name", BUILT_IN)
def test_a_code_of_four_signs_is_where_its_category_is_or_in_a_finer_range(name: str) -> None:
    causes = LISTS[name]
    fine = [(one, leaf) for one, leaf in causes.ranges if one.fine]
    for code in set(printed()) - set(NOT_IN_USE):
        for digit in "0123456789":
            longer = code._replace(tail=digit)
            own = [leaf for one, leaf in fine if one.holds(longer)]
            assert len(own) <= 1
            assert causes.leaf_of(longer) == (own[0] if own else causes.leaf_of(code))


@pytest.mark.parametrize("listed", BUILT_IN.values(), ids=BUILT_IN)
def test_lists_are_trees_of_known_kinds_whose_groups_have_no_codes(
    listed: tuple[Cause, ...],
) -> None:
    codes = [cause.code for cause in listed]
    assert len(set(codes)) == len(codes)
    groups = {cause.parent for cause in listed} - {""}
    for place, cause in enumerate(listed):
        assert cause.parent in ("", *codes[:place])
        assert bool(cause.ranges) == (cause.code not in groups)
        assert cause.kind in CAUSE_KINDS
        assert cause.care in ("", *CARE)
        assert cause.sex in ("", "f", "m")
        assert len(cause.label) <= 45


def _holder(name: str, text: str) -> str:
    found = LISTS[name].read(text)
    return LISTS[name].causes[found.entry].code if found.entry >= 0 else found.kind


# where textbooks and national offices put these; the sequelae of suicide and assault by Y87
@pytest.mark.parametrize(
    ("text", "short", "chapter"),
    [
        ("I21.9", "heart-attack", "circulation"),
        ("i219", "heart-attack", "circulation"),
        ("I21 ", "heart-attack", "circulation"),
        ("I21.-", "heart-attack", "circulation"),
        ("I10X", "circulatory-other", "circulation"),
        ("G30.9*", "dementia", "nerves"),
        ("F01", "dementia", "mind"),
        ("K70.3", "liver-alcohol", "digestion"),
        ("X42", "overdose", "external"),
        ("X60", "suicide", "external"),
        ("Y87.0", "suicide", "external"),
        ("Y87.1", "violence", "external"),
        ("Y87", "external-other", "external"),
        ("Y87.2", "undetermined", "undetermined"),
        ("Y10", "undetermined", "undetermined"),
        ("R95", "sudden-infant", "sudden-infant"),
        ("R99", "pending", "pending"),
        ("R54", "ill-defined", "ill-defined"),
        ("U07.1", "covid", "special"),
        ("S06", "not-underlying", "not-underlying"),
        ("Y95", "not-underlying", "not-underlying"),
        ("O95", "pregnancy", "pregnancy"),
        ("C61", "cancer-prostate", "tumours"),
        ("I20-I25", "heart-attack", "circulation"),
        ("I00-I99", "circulatory", "circulation"),
        ("C00-D48", "cancers", "tumours"),
        ("A00-B99", "several", "infections"),
        ("I21 Acute myocardial infarction", "heart-attack", "circulation"),
        ("Stroke (I60–I69)", "stroke", "circulation"),
        ("Stroke", "stroke", "unreadable"),
        ("A00-Y98", "all", "all"),
        ("A00-R99, V01-Y98", "all", "all"),
        ("All causes", "all", "all"),
        ("Toutes causes confondues", "all", "all"),
        ("Dødsårsager i alt", "all", "all"),
        ("unknown", "not_stated", "not_stated"),
        ("Todesursache unbekannt", "not_stated", "not_stated"),
        ("E95", "unknown", "unknown"),
        ("D49", "unknown", "unknown"),
        ("flu", "unreadable", "unreadable"),
        ("I2", "unreadable", "unreadable"),
        ("410", "unknown", "unknown"),
    ],
)
def test_texts_are_read_as_people_mean_them(text: str, short: str, chapter: str) -> None:
    assert (_holder("short", text), _holder("chapters", text)) == (short, chapter)


def test_kinds_are_those_the_rules_for_ill_defined_deaths_name() -> None:
    kinds = {cause.code: cause.kind for cause in SHORT}
    assert kinds["ill-defined"] == "ill_defined"
    assert kinds["sudden-infant"] == "natural"
    assert kinds["pending"] == "pending"
    assert kinds["undetermined"] == "undetermined"
    external = {cause.code for cause in SHORT if cause.parent == "external"}
    assert {kinds[code] for code in external} == {"external"}
    assert {cause.care for cause in SHORT} == {"", *CARE}
    assert [cause.code for cause in CHAPTERS if cause.kind == "external"] == ["external"]


def test_other_classifications_are_compared_as_letters_and_digits() -> None:
    ninth = own_list(
        (
            Cause("heart", "Heart", "", ("410-414",)),
            Cause("other", "Other", "", ("001-409", "415-799")),
            Cause("suicide", "Suicide", "", ("E950-E959",), "external"),
        )
    )
    read = {
        text: ninth.read(text).entry
        for text in ("4109", "410.9", "410", "41", "E9500", "e950", "800")
    }
    assert read == {"4109": 0, "410.9": 0, "410": 0, "41": 1, "E9500": 2, "e950": 2, "800": -1}
    numbered = own_list((Cause("a", "A", "", ("1-9",)), Cause("b", "B", "", ("10-15",))))
    assert [numbered.read(text).entry for text in ("1", "10", "15", "16")] == [0, 1, 1, -1]
    assert not ninth.is_icd_10


def test_a_list_by_letters_and_two_digits_is_one_of_the_tenth_revision() -> None:
    assert own_list(SHORT).notation is ICD_10
    assert own_list(SHORT[:5]).notation is not ICD_10


def test_codes_of_the_list_go_before_those_of_the_classification() -> None:
    causes = CauseList((Cause("2", "Two", "", ("1",)), Cause("1", "One", "", ("2",))), notation([]))
    assert [causes.read(text).entry for text in ("1", "2", "One")] == [1, 0, 1]


@pytest.mark.parametrize("text", ["X84-X60", "A00-", "first", "", "A00-B99, x"])
def test_what_is_no_range_is_none(text: str) -> None:
    found = ICD_10.ranges(text)
    assert found is None or text == "A00-"


def test_what_befalls_one_sex_befalls_not_the_other() -> None:
    women, men = ICD_10.ranges(WOMEN), ICD_10.ranges(MEN)
    assert women is not None
    assert men is not None
    assert not any(one.meets(other) for one in women for other in men)
