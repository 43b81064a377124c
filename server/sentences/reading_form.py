"""What is asked about the form of a file: its sheet, signs, headings, units and codes."""

from collections.abc import Mapping

from server.sentences import names
from server.sentences.numbers import whole
from server.sentences.reading import Options, field, role
from server.sentences.text import _, n_

# how numbers are written, by decimal mark and mark of thousands
MARKS = {
    "point": (".", ""),
    "point-comma": (".", ","),
    "point-blank": (".", " "),
    "point-apostrophe": (".", "'"),
    "comma": (",", ""),
    "comma-point": (",", "."),
    "comma-blank": (",", " "),
    "comma-apostrophe": (",", "'"),
}
UNITS = ("1", "1000", "1000000", "1/100", "1/1000", "1/10000", "1/100000", "1/1000000")
LONG = "long"


def choose() -> tuple[str, str]:
    """The first line of a choice that nothing is proposed for."""
    return ("", _("choose"))


def marks() -> Options:
    return (
        ("point", _("1234.5: a point before decimals, nothing between thousands")),
        ("point-comma", _("1,234.5: a point before decimals, a comma between thousands")),
        ("point-blank", _("1 234.5: a point before decimals, a blank between thousands")),
        ("point-apostrophe", _("1'234.5: a point before decimals, an apostrophe in thousands")),
        ("comma", _("1234,5: a comma before decimals, nothing between thousands")),
        ("comma-point", _("1.234,5: a comma before decimals, a point between thousands")),
        ("comma-blank", _("1 234,5: a comma before decimals, a blank between thousands")),
        ("comma-apostrophe", _("1'234,5: a comma before decimals, an apostrophe in thousands")),
    )


def marks_code(decimal: str, thousands: str) -> str:
    """The answer that stands for two marks; empty where none does."""
    blank = " " if thousands and thousands.isspace() else thousands.replace("\u2019", "'")
    return next((code for code, signs in MARKS.items() if signs == (decimal, blank)), "")


def marks_example(decimal: str, thousands: str) -> str:
    """A number written with two marks: 1,234.5."""
    return dict(marks())[marks_code(decimal, thousands)].partition(":")[0]


def marks_hint(example: str, *, sure: bool, proposed: str) -> str:
    """Why the marks are asked; `proposed` is a number in the likelier way."""
    if sure:
        return _("as in “{example}”", example=example)
    return _(
        "“{example}” can be read in two ways, a thousand times apart; where counts are whole, they "
        "are written as {proposed}",
        example=example,
        proposed=proposed,
    )


def delimiters(known: tuple[str, ...]) -> Options:
    """Signs are named, since a tab or a blank cannot be seen."""
    return tuple((name, _(name)) for name in known)


def encodings(known: Mapping[str, str]) -> Options:
    return tuple((code, _(name)) for code, name in known.items())


def heading_rows() -> Options:
    return tuple((str(rows), n_("one row", "{count} rows", rows)) for rows in (1, 2, 3, 4))


def sheet(name: str, rows: int, columns: int) -> str:
    return _(
        "{name} ({rows} rows, {columns} columns)",
        name=name,
        rows=whole(rows),
        columns=whole(columns),
    )


def shape(fields: tuple[str, ...], headings: int) -> str:
    """How the table stands: `headings` of it hold these fields."""
    if not fields:
        return _("long: one row for each year, sex and age")
    return _(
        "wide: {headings} headings hold {fields}",
        headings=whole(headings),
        fields=names.listed([_across(one) for one in fields]),
    )


def _across(code: str) -> str:
    return {
        "year": _("years"),
        "sex": _("sexes"),
        "age": _("ages"),
        "number": _("the kind of count"),
        "cause": _("causes of death"),
    }[code]


def units() -> Options:
    return (
        ("1", _("persons")),
        ("1000", _("thousands")),
        ("1000000", _("millions")),
        ("1/100", _("per 100")),
        ("1/1000", _("per 1,000")),
        ("1/10000", _("per 10,000")),
        ("1/100000", _("per 100,000")),
        ("1/1000000", _("per million")),
    )


def unit_label(number: str) -> str:
    return _("{number}, counted in", number=field(number).capitalize())


def unit_hint(proposed: str) -> str:
    label = dict(units()).get(proposed, proposed)
    return _("a heading or title speaks of it; likely {unit}", unit=label)


def rate_kinds() -> Options:
    return (
        choose(),
        ("rate", _("death rates: deaths divided by person-years (m_x)")),
        ("probability", _("probabilities of dying within the age group (q_x)")),
    )


def sex_meanings() -> Options:
    return (
        choose(),
        ("f", _("women")),
        ("m", _("men")),
        ("p", _("both together")),
        ("not stated", _("not stated")),
    )


def sex_label(text: str) -> str:
    return _("Sex “{text}” means", text=text)


def sex_hint(proposed: str, *, asked: bool) -> str:
    if not asked:
        return _("not known; its rows are refused unless you say it")
    if not proposed:
        return _("tables differ in this; see the notes of the source")
    return _("likely {sex}", sex=dict(sex_meanings())[proposed])


def sign_meanings() -> Options:
    return (
        choose(),
        ("nil", _("nil: there were none, read as 0")),
        ("not_available", _("not available: its area, sex and year is left out")),
        ("withheld", _("withheld by the source: its area, sex and year is left out")),
        ("mistake", _("nothing: a mistake, to be told row by row")),
    )


def sign_label(text: str) -> str:
    return _("“{text}” in place of a number means", text=text)


def sign_hint() -> str:
    return _("tables differ in this; see the notes of the source")


def number_label() -> str:
    return _("The cells count")


def kinds(known: tuple[str, ...]) -> Options:
    return tuple((code, role(code)) for code in known)


def totals(found: tuple[tuple[str, tuple[str, ...]], ...]) -> str:
    """Rows that are sums; empty where there are none."""
    if not found:
        return ""
    return _(
        "Sums among the rows, kept as a cross-check and never counted twice: {listed}.",
        listed="; ".join(
            _("{field} {texts}", field=_matter(one), texts=quoted(texts)) for one, texts in found
        ),
    )


def _matter(code: str) -> str:
    return {"sex": _("sex"), "age": _("age"), "area": _("area"), "cause": _("cause")}[code]


def quoted(texts: tuple[str, ...]) -> str:
    """The first few texts of the file, in quotation marks."""
    listed = [_("“{text}”", text=text) for text in texts[:4]]
    more = len(texts) - len(listed)
    return names.listed([*listed, _("{count} more", count=more)] if more else listed)


def unstated_label(code: str, texts: tuple[str, ...]) -> str:
    said = {
        "sex": _("Counts whose sex is not stated: {texts}", texts=quoted(texts)),
        "age": _("Counts whose age is not stated: {texts}", texts=quoted(texts)),
        "area": _("Counts whose area is not stated: {texts}", texts=quoted(texts)),
    }
    return said[code]


def unstated() -> Options:
    return (
        ("spread", _("share them out as those are distributed that do state it")),
        ("left_out", _("leave them out")),
    )


def as_before(edition: int) -> str:
    return _(
        "Proposed as it was read for edition {edition}. Look whether that still holds.",
        edition=edition,
    )


def lost(edition: int, fields: tuple[tuple[str, str], ...]) -> str:
    """What an earlier edition took from columns that this file lacks."""
    listed = [
        _("{field} in “{column}”", field=field(one), column=column)
        if column
        else _("{field} in the headings", field=field(one))
        for one, column in fields
    ]
    return _(
        "Not like the file of edition {edition}, which had {columns}. The columns were recognised "
        "anew.",
        edition=edition,
        columns=names.listed(listed),
    )


def changed() -> str:
    return _("With this choice the table is another one: look at its columns, then check it.")


# what is wrong with an answer
def marks_missing(example: str, likely: str) -> str:
    return _(
        "Say how numbers are written: “{example}” can be read in two ways, a thousand times apart; "
        "where counts are whole, they are written as {likely}.",
        example=example,
        likely=likely,
    )


def kind_missing() -> str:
    return _("Say what the file holds.")


def unit_missing() -> str:
    return _("Say what this is counted in.")


def sex_missing(text: str) -> str:
    return _("Say which sex “{text}” stands for.", text=text)


def sign_missing(text: str) -> str:
    return _("Say what “{text}” in place of a number means.", text=text)


def area_missing() -> str:
    return _("Give the one area that the counts are of: no column says it.")


def only_sex_missing() -> str:
    return _("Say whose counts these are: no column says the sex.")


def number_missing() -> str:
    return _("Say what the cells of the table count.")


def rate_missing() -> str:
    return _("Say whether these are rates or probabilities.")


def unstated_missing() -> str:
    return _("Say what is to become of these counts.")


def not_a_row() -> str:
    return _("The row of the headings is a whole number of 1 or more.")


def not_a_percent() -> str:
    return _("This is a whole number from 0 to 100.")


def not_years(part: str) -> str:
    return _(
        "The provisional years hold “{part}”. Write years of four digits with commas between them, "
        "such as 2022, 2023, or the first and the last as 2021-2023.",
        part=part,
    )


def needed(name: str) -> str:
    """Of a question about the basis that has no answer."""
    return _("To be answered: {name}.", name=name)


def still_open(count: int) -> str:
    """The first sentence of the page where answers are missing."""
    return n_(
        "One answer is missing before the files can be checked; it is marked below.",
        "{count} answers are missing before the files can be checked; they are marked below.",
        count,
    )


def question(key: str, sexes: tuple[str, ...], signs: tuple[str, ...]) -> str:
    """A question about a file that nothing is chosen for yet."""
    if key == "sexes":
        return _("which sex is meant by {texts}", texts=quoted(sexes))
    if key == "signs":
        return _("what is meant by {texts} in place of a number", texts=quoted(signs))
    return {
        "kind": _("what it holds"),
        "marks": _("how numbers are written"),
        "number": _("what the cells count"),
        "units": _("what figures are counted in"),
        "rate_is": _("whether these are rates or probabilities"),
        "cause_list": _("which list its causes of death fall into"),
    }[key]


def asked_below(questions: tuple[str, ...]) -> str:
    """Under the first sentence."""
    return _("The files do not say by themselves: {listed}.", listed="; ".join(questions))
