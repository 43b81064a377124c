"""How files handed in on the command line are to be read: as was said, else as is likely; what is
in doubt and was not said is refused."""

import argparse
import re
from collections.abc import Mapping as Mapped
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

from server.cli.refusals import Declined
from server.intake.causes.lists import CAUSE_LISTS
from server.intake.forms.delimiters import NAMES
from server.intake.mapping import COLUMNS, EVERY_ROLE, JANUARY, LISTS, SIGNS, Mapping
from server.intake.parsing import Handed
from server.intake.recognising.columns import fields_of
from server.intake.recognising.kinds import sorted_out
from server.intake.recognising.look import Before, Looked, Said, look, said_in
from server.sentences import reading as say
from server.sentences import reading_form as ask
from server.sentences.text import _

Earlier = Mapped[str, Sequence[Before]]  # by role
WHAT = {"share": "spread", "leave-out": "left_out"}
OPTIONS = {  # that answer a question, by its key
    "kind": "--deaths, --population, --counts ...",
    "marks": "--numbers",
    "number": "--cells",
    "units": "--unit",
    "rate_is": "--rate-is",
    "sexes": "--sex-code",
    "signs": "--sign",
    "cause_list": "--cause-list",
}
MEANINGS = {sign.replace("_", "-"): sign for sign in SIGNS}


def handed(asked: argparse.Namespace, *, limit: int, before: Earlier | None = None) -> list[Handed]:
    """The files with their mappings. Declined where one cannot be opened or is too large, or does
    not say what was not said either."""
    named = [
        (role, *_opened(getattr(asked, role), limit))
        for role in EVERY_ROLE
        if getattr(asked, role, None)
    ]
    rest = sorted_out([_opened(path, limit) for path in asked.files], [role for role, *_ in named])
    if rest.twice:
        role, name = rest.twice[0]
        raise Declined(
            _(
                "{name} seems to hold the same as another file: {role}. Say which file holds what "
                "with --deaths FILE, --population FILE and the like.",
                name=name,
                role=say.role(role) if role else _("nothing that can be told"),
            )
        )
    files = [*named, *rest.files]
    if not files:
        raise Declined(
            _("No file was given. Give --counts FILE, or --deaths FILE and --population FILE.")
        )
    return [
        _handed(
            role,
            name,
            content,
            asked,
            (before or {}).get(role, ()),
            told=(role, name, content) in named,
        )
        for role, name, content in files
    ]


def _opened(path: str, limit: int) -> tuple[str, bytes]:
    """Name and content."""
    try:
        content = Path(path).read_bytes()
    except OSError as error:
        raise Declined(
            _(
                "The file {path} cannot be opened: {why}. Check its name.",
                path=path,
                why=error.strerror,
            )
        ) from error
    if len(content) > limit:
        raise Declined(
            _(
                "The file {path} is larger than {limit} MB. Send fewer years at a time, or raise "
                "EBBLINE_UPLOAD_LIMIT.",
                path=path,
                limit=limit // 1_000_000,
            )
        )
    return Path(path).name, content


def _handed(
    role: str,
    name: str,
    content: bytes,
    asked: argparse.Namespace,
    before: Sequence[Before],
    *,
    told: bool,
) -> Handed:
    """One file; `told`: what it holds was said, and need not be told by its columns."""
    looked = _likely(role, name, content, asked, before)
    kept = looked.mapping
    if role not in LISTS and not looked.reading.problems:
        said = _said(looked, asked, told=told)
        looked = look(content, name, role, said)
        _require_answers(name, looked)
    return Handed(role, name, content, _shared(looked.mapping, kept, asked))


def _likely(
    role: str, name: str, content: bytes, asked: argparse.Namespace, before: Sequence[Before]
) -> Looked:
    """As before or as likely, in the form that was said."""
    looked = look(content, name, role, None, before)
    for form in (_cut(asked, role), _rows(asked, role)):
        if form:
            shown = looked.mapping.form
            looked = look(content, name, role, Said(form=replace(shown, **form), shown=shown))
    if shape := _of(asked.shape, role):
        shown = looked.mapping.form
        wide = () if shape == ask.LONG else tuple(shape.split("-"))
        looked = look(content, name, role, Said(form=shown, shown=shown, wide=wide))
    return looked


def _cut(asked: argparse.Namespace, role: str) -> dict[str, str]:
    """Sheet, encoding and delimiter, where they were said."""
    parted = _of(asked.parted_by, role)
    signs = {name: sign for sign, name in NAMES.items()}
    if parted and parted not in signs:
        raise Declined(
            _(
                "--parted-by {sign}: expected one of {known}.",
                sign=parted,
                known=", ".join(signs),
            )
        )
    found = {
        "sheet": _of(asked.sheet, role),
        "encoding": _of(asked.encoding, role),
        "delimiter": signs.get(parted, ""),
    }
    return {part: value for part, value in found.items() if value}


def _rows(asked: argparse.Namespace, role: str) -> dict[str, int]:
    """'3' or '3-4'."""
    said = _of(asked.headings, role)
    if not said:
        return {}
    match = re.fullmatch(r"([1-9]\d{0,3})(?:-([1-9]\d{0,3}))?", said)
    if match is None or int(match[2] or match[1]) < int(match[1]):
        raise Declined(
            _("--headings {rows}: expected a row such as 3, or two such as 3-4.", rows=said)
        )
    return {"heading": int(match[1]), "heading_rows": int(match[2] or match[1]) - int(match[1]) + 1}


def _said(looked: Looked, asked: argparse.Namespace, *, told: bool) -> Said:
    """What is likely, corrected by what was said."""
    role, mapping = looked.role, looked.mapping
    numbers = _of(asked.numbers, role)
    if numbers and numbers not in ask.MARKS:
        raise Declined(
            _(
                "--numbers {marks}: expected one of {known}.",
                marks=numbers,
                known=", ".join(ask.MARKS),
            )
        )
    decimal, thousands = ask.MARKS.get(numbers, (mapping.form.decimal, mapping.form.thousands))
    signs = dict(mapping.signs) | _signs(asked)
    units = dict(mapping.units) | {n: size for n, size in asked.unit if n in looked.numbers}
    said = said_in(mapping, role)
    return replace(
        said,
        kind=role if told else "",
        form=replace(mapping.form, decimal=decimal, thousands=thousands),
        shown=mapping.form,
        marks=bool(numbers) or "marks" not in looked.open,
        columns={**said.columns, **_columns(role, asked)},
        across_number=_of(asked.cells, role) or said.across_number,
        units=tuple(units.items()),
        rate_is=_of(asked.rate_is, role) or said.rate_is,
        cause_list=_cause_list(asked, role) or said.cause_list,
        sex_codes=tuple((dict(mapping.sex_codes) | dict(asked.sex_code)).items()),
        signs=tuple((text, meaning) for text, meaning in signs.items() if text in looked.signs),
    )


def _cause_list(asked: argparse.Namespace, role: str) -> str:
    name = _of(asked.cause_list, role)
    if name and name not in CAUSE_LISTS:
        known = ", ".join(CAUSE_LISTS)
        raise Declined(_("--cause-list {name}: expected one of {known}.", name=name, known=known))
    return name


def _signs(asked: argparse.Namespace) -> dict[str, str]:
    """What texts in place of numbers were said to mean."""
    found = {}
    for text, meaning in asked.sign:
        if meaning not in MEANINGS:
            raise Declined(
                _(
                    "--sign {text}={meaning}: expected one of {known}.",
                    text=text,
                    meaning=meaning,
                    known=", ".join(MEANINGS),
                )
            )
        found[text] = MEANINGS[meaning]
    return found


def _columns(role: str, asked: argparse.Namespace) -> dict[str, str]:
    """What --column says of files of this role, by field."""
    columns = {}
    for name, column in asked.column:
        kind, _dot, field = name.rpartition(".")
        if field not in COLUMNS or kind not in ("", *EVERY_ROLE):
            raise Declined(
                _(
                    "--column {name}={column}: there is no field {name}. The fields are {known}.",
                    name=name,
                    column=column,
                    known=", ".join(COLUMNS),
                )
            )
        if kind == role or (not kind and field in fields_of(role)):
            columns[field] = column
    return columns


def _require_answers(name: str, looked: Looked) -> None:
    """Declined where the file can be read in two ways and it was not said in which."""
    if looked.open:
        sexes = tuple(code.text for code in looked.noticed.sexes if code.asked)
        raise Declined(
            _(
                "{name} does not say by itself: {listed}. Say it with {options}; see ebbline "
                "hand-in --help.",
                name=name,
                listed="; ".join(ask.question(one, sexes, looked.signs) for one in looked.open),
                options=", ".join(OPTIONS[one] for one in looked.open),
            )
        )


def _shared(mapping: Mapping, kept: Mapping, asked: argparse.Namespace) -> Mapping:
    """With what no column says, where it was said, else as it was kept."""
    area, whole = asked.area or ("", ""), asked.whole or ("", "")
    wrong = [
        pair
        for pair in asked.not_stated
        if pair[0] not in ("sex", "age", "area") or pair[1] not in WHAT
    ]
    if wrong:
        field, what = wrong[0]
        raise Declined(
            _(
                "--not-stated {field}={what}: expected sex, age or area, and share or leave-out.",
                field=field,
                what=what,
            )
        )
    unstated = dict(kept.unstated) | {field: WHAT[what] for field, what in asked.not_stated}
    said = {
        "only_area": area[0],
        "only_area_name": area[1],
        "whole": whole[0],
        "whole_name": whole[1],
        "delivered": tuple(asked.delivered),
        "only_sex": asked.sex or "",
        "last_age_open": asked.open_age,
        "provisional_years": tuple(asked.provisional),
        "population_is": JANUARY if asked.population_is == JANUARY else "",
        "unstated": tuple(unstated.items()),
        "most_unstated": asked.share_at_most,
    }
    known = {field: value or getattr(kept, field) for field, value in said.items()}
    return replace(mapping, **known)


def _of(said: Sequence[str], role: str) -> str:
    """The last that was said of files of this role, or of all: 'deaths=Tote' or 'Tote'."""
    found = ""
    for text in said:
        kind, equals, value = text.partition("=")
        if not (equals and kind in EVERY_ROLE):
            found = text
        elif kind == role:
            found = value
    return found
