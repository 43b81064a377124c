"""What is said of a file's columns, and what is asked about its counts."""

from server.sentences import names
from server.sentences.numbers import whole
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _, n_

Options = tuple[tuple[str, str], ...]  # value and label, for a form


def role(code: str) -> str:
    """What kind of file it is."""
    return {
        "counts": _("deaths and population"),
        "deaths": _("deaths"),
        "population": _("population"),
        "births": _("births"),
        "rates": _("death rates or probabilities of dying"),
        "areas": _("what becomes of area codes"),
        "breaks": _("breaks of a series"),
        "causes": _("a list of causes of death"),
    }[code]


def field(code: str) -> str:
    """What a column can hold."""
    return {
        "year": _("year"),
        "sex": _("sex"),
        "age": _("age"),
        "area": _("area, code"),
        "area_name": _("area, name"),
        "deaths": _("deaths"),
        "population": _("population or person-years"),
        "births": _("live births"),
        "stillbirths": _("stillbirths"),
        "neonatal_deaths": _("deaths before 28 days"),
        "rate": _("death rate or probability"),
        "status": _("provisional or final"),
        "cause": _("cause of death"),
    }[code]


def answer(files: int) -> Sentence:
    return phrase(
        n_(
            "The file was read. Is each column what it is taken for, and how were the counts made?",
            "{count} files were read. Is each column what it is taken for, and how were the counts "
            "made?",
            files,
        )
    )


def unreadable(files: list[str]) -> Sentence:
    """Instead, where some of the files are no tables."""
    return phrase(
        n_(
            "{files} cannot be read as it stands. Put it right and upload it again.",
            "{files} cannot be read as they stand. Put them right and upload them again.",
            len(files),
            files=names.listed(files),
        )
    )


def file_line(code: str, name: str, rows: int, delimiter: str, encoding: str) -> str:
    """One file: what it is, its name and how it is written; a workbook has neither sign nor
    encoding."""
    counted = n_("one row", "{count} rows", rows, count=whole(rows))
    if not delimiter:
        return _("{role}: {name}, {rows}", role=role(code), name=name, rows=counted)
    return _(
        "{role}: {name}, {rows}, columns parted by {delimiter}, {encoding}",
        role=role(code),
        name=name,
        rows=counted,
        delimiter=_(delimiter),
        encoding=encoding,
    )


def confidence(level: str, why: str) -> str:
    """How sure the recognition of a column is, and why."""
    return {
        "sure": _("sure: {why}", why=_(why)),
        "likely": _("likely: {why}", why=_(why)),
        "not used": _("not used: {why}", why=_(why)),
        "kept": _("as stated before"),
    }[level]


def column_hint(why: str, values: tuple[str, ...]) -> str:
    """Beside a column: how sure it is, and some of its values."""
    if not values:
        return why
    return _("{values}; {why}", values=", ".join(values), why=why)


def not_found() -> str:
    return _("no column found")


def area_hint(*, without: bool) -> str:
    """Beside the one area's code; `without`: a file has no column of areas."""
    if without:
        return _("needed: no column of areas was found")
    return _("only where there is no column of areas")


def unused(columns: list[tuple[str, str]]) -> str:
    """Columns that are not used, with the reasons; empty where all are."""
    if not columns:
        return ""
    listed = "; ".join(_("{column} ({why})", column=column, why=_(why)) for column, why in columns)
    return _("Not used: {columns}.", columns=listed)


def people() -> Options:
    return (
        ("residents", _("those who live in the area, wherever they died")),
        ("occurrences", _("those who died in the area, wherever they lived")),
    )


def dated_by() -> Options:
    return (
        ("death", _("the day of death")),
        ("registration", _("the day of registration")),
    )


def population() -> Options:
    return (
        ("", _("choose")),
        ("midyear", _("people in the middle of the year")),
        ("person_years", _("person-years lived in the year")),
        ("january", _("people on 1 January, averaged with those a year later")),
    )


def sexes() -> Options:
    return (
        ("", _("a column says it")),
        *((code, names.sex(code)) for code in ("f", "m", "p")),
    )


def last_age(text: str) -> str:
    """Beside the box for an open last age; empty where one is marked as open."""
    return _("nothing marks the last one, “{text}”, as open", text=text) if text else ""
