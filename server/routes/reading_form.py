"""What the form about a file's columns and counts says, as answers. What cannot be understood is
told beside its field; nothing here looks into a file."""

import re
from collections.abc import Iterable, Mapping
from typing import Any

from server.intake import mapping as intake
from server.intake.forms.delimiters import NAMES
from server.intake.reading import MOST_SIGNS
from server.intake.recognising.look import Said
from server.pages.upload_reading import Answers
from server.sentences import reading_form as ask
from server.sentences.text import _
from server.store.records import Basis

Form = Mapping[str, str]
CHOICES = {
    "people": ("residents", "occurrences"),
    "dated_by": ("death", "registration"),
    "population_is": ("midyear", "person_years", intake.JANUARY),
}
MATTERS = ("sex", "age", "area")
_SIGNS = {name: sign for sign, name in NAMES.items()}
_MOST_ROWS = 9  # of headings


def answers(form: Form, roles: Iterable[str]) -> Answers:
    """All that was sent; errors by the name of the field."""
    errors: dict[str, str] = {}
    files = {role: _said(form, role, errors) for role in roles}
    shared = _shared(form, errors)
    basis = _basis(form, errors)
    return Answers(files=files, texts=form, shared=shared, basis=basis, errors=errors)


def roles_said(form: Form, roles: Iterable[str]) -> dict[str, str]:
    """What each file is now said to hold, by the role it was handed in as."""
    said = {role: form.get(f"{role}.role") or role for role in roles}
    return {old: new if new in intake.EVERY_ROLE else old for old, new in said.items()}


def _said(form: Form, role: str, errors: dict[str, str]) -> Said:
    shown = _shown(form.get(f"{role}.shown", ""))
    known = shown or intake.Form()
    codes = (
        (form.get(f"{role}.sex_text.{place}", ""), form.get(f"{role}.sex.{place}", ""))
        for place in range(12)
    )
    signs = (
        (form.get(f"{role}.sign_text.{place}", ""), form.get(f"{role}.sign.{place}", ""))
        for place in range(MOST_SIGNS)
    )
    units = (
        (number, unit)
        for number in intake.NUMBERS
        if (unit := form.get(f"{role}.unit.{number}", "")) in ask.UNITS
    )
    wide = form.get(f"{role}.wide", "")
    return Said(
        kind=form.get(f"{role}.role", ""),
        form=_form(form, role, shown, errors) if shown else None,
        shown=shown,
        marks=form.get(f"{role}.marks", "") in ask.MARKS,
        columns={field: form.get(f"{role}.{field}", "") for field in intake.COLUMNS},
        wide=() if wide == ask.LONG else tuple(wide.split("-")) if wide else known.across,
        across_number=form.get(f"{role}.across_number", ""),
        units=tuple(units),
        rate_is=form.get(f"{role}.rate_is", ""),
        cause_list=form.get(f"{role}.cause_list", ""),
        sex_codes=tuple((said, sex) for said, sex in codes if said and sex),
        signs=tuple((said, what) for said, what in signs if said and what in intake.SIGNS),
    )


def _shown(text: str) -> intake.Form | None:
    """The form in which the file was shown; None where it was not, or the text was tampered with:
    then the answers are about what is likely."""
    try:
        return intake.Mapping.from_json(text).form
    except (ValueError, TypeError):
        return None


def _form(form: Form, role: str, shown: intake.Form, errors: dict[str, str]) -> intake.Form:
    decimal, thousands = ask.MARKS.get(
        form.get(f"{role}.marks", ""), (shown.decimal, shown.thousands)
    )
    return intake.Form(
        encoding=form.get(f"{role}.encoding", shown.encoding),
        delimiter=_SIGNS.get(form.get(f"{role}.delimiter", ""), shown.delimiter),
        sheet=form.get(f"{role}.sheet", shown.sheet),
        heading=_row(form, f"{role}.heading", shown.heading, errors),
        heading_rows=_row(form, f"{role}.heading_rows", shown.heading_rows, errors),
        decimal=decimal,
        thousands=thousands,
    )


def _row(form: Form, name: str, shown: int, errors: dict[str, str]) -> int:
    said = _text(form, name) or str(shown)
    if not said.isdecimal() or not 0 < int(said[:9]) < 10_000:
        errors[name] = ask.not_a_row()
        return shown
    return min(int(said), _MOST_ROWS) if name.endswith("heading_rows") else int(said)


def _shared(form: Form, errors: dict[str, str]) -> dict[str, Any]:
    """The fields of every file's mapping that no column says."""
    return {
        **{name: _text(form, name) for name in ("only_area", "only_area_name", "only_sex")},
        **{name: _text(form, name) for name in ("whole", "whole_name")},
        "delivered": _parts(form, "delivered"),
        "last_age_open": form.get("last_age_open") == "yes",
        "provisional_years": _years(form, errors),
        "unstated": tuple(
            (matter, what)
            for matter in MATTERS
            if (what := form.get(f"unstated_{matter}", "")) in ("spread", "left_out")
        ),
        "most_unstated": _percent(form, errors),
    }


def _percent(form: Form, errors: dict[str, str]) -> int:
    said = _text(form, "most_unstated") or "5"
    if not said.isdecimal() or int(said[:4]) > 100:
        errors["most_unstated"] = ask.not_a_percent()
        return 5
    return int(said)


def _basis(form: Form, errors: dict[str, str]) -> Basis | None:
    """How the counts were made; None where an answer is missing."""
    named = {
        "people": _("whose deaths are counted"),
        "dated_by": _("what decides the year of a death"),
        "population_is": _("what population means"),
        "population_date": _("the date of the population"),
        "source": _("where the counts come from"),
    }
    given = {key: _text(form, key) for key in named}
    for key, name in named.items():
        if not given[key] or given[key] not in CHOICES.get(key, (given[key],)):
            errors[key] = ask.needed(name)
    if set(named) & set(errors):
        return None
    return Basis(
        people=given["people"],
        dated_by=given["dated_by"],
        population=given["population_is"],
        population_date=given["population_date"],
        source=given["source"],
        vintage=_text(form, "vintage"),
    )


def _years(form: Form, errors: dict[str, str]) -> tuple[str, ...]:
    """'2021, 2023' or '2021-2023'."""
    years: list[str] = []
    for part in _parts(form, "provisional"):
        found = re.fullmatch(r"(\d{4})(?:\s*[-–]\s*(\d{4}))?", part)
        if found is None:
            errors["provisional"] = ask.not_years(part)
            continue
        first, last = int(found[1]), int(found[2] or found[1])
        years += [str(year) for year in range(first, last + 1)]
    return tuple(dict.fromkeys(years))


def _parts(form: Form, key: str) -> tuple[str, ...]:
    """What stands between commas or semicolons."""
    return tuple(part for part in re.split(r"\s*[,;]\s*", _text(form, key)) if part)


def _text(form: Form, key: str) -> str:
    return form.get(key, "").strip()
