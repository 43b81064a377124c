"""What the form about a file's columns and counts says, as mappings and a basis."""

import re
from collections.abc import Iterable, Mapping
from typing import Any

from server.intake import mapping as intake
from server.intake.recognising.columns import fields_of
from server.sentences.text import _
from server.store.records import Basis
from server.web.problem import Refusal

Form = Mapping[str, str]
CHOICES = {
    "people": ("residents", "occurrences"),
    "dated_by": ("death", "registration"),
    "population_is": ("midyear", "person_years"),
}


def mappings(form: Form, roles: Iterable[str]) -> dict[str, intake.Mapping]:
    """One mapping a file: its own columns, and what no column says. Refusal."""
    return {role: _mapping(form, role) for role in roles}


def _mapping(form: Form, role: str) -> intake.Mapping:
    columns: dict[str, Any] = {field: form.get(f"{role}.{field}", "") for field in fields_of(role)}
    codes = ((_text(form, f"code_{sex}"), sex) for sex in ("f", "m", "p"))
    return intake.Mapping(
        **columns,
        only_area=_text(form, "only_area"),
        only_area_name=_text(form, "only_area_name"),
        only_sex=_text(form, "only_sex"),
        whole=_text(form, "whole"),
        whole_name=_text(form, "whole_name"),
        delivered=_parts(form, "delivered"),
        sex_codes=tuple((text, sex) for text, sex in codes if text),
        last_age_open=form.get("last_age_open") == "yes",
        provisional_years=_years(form),
    )


def basis(form: Form) -> Basis:
    """How the counts were made. Refusal names every answer that is missing."""
    named = {
        "people": _("whose deaths are counted"),
        "dated_by": _("what decides the year of a death"),
        "population_is": _("what population means"),
        "population_date": _("the date of the population"),
        "source": _("where the counts come from"),
    }
    given = {key: _text(form, key) for key in named}
    missing = [
        name
        for key, name in named.items()
        if not given[key] or given[key] not in CHOICES.get(key, (given[key],))
    ]
    if missing:
        raise Refusal(
            422,
            "Not understood",
            "The basis of the counts is not stated: {missing}. Go back and answer it; the files "
            "are kept.",
            missing=", ".join(missing),
        )
    return Basis(
        people=given["people"],
        dated_by=given["dated_by"],
        population=given["population_is"],
        population_date=given["population_date"],
        source=given["source"],
    )


def _years(form: Form) -> tuple[str, ...]:
    """'2021, 2023' or '2021-2023'. Refusal where a part is no year."""
    years: list[str] = []
    for part in _parts(form, "provisional"):
        found = re.fullmatch(r"(\d{4})(?:\s*[-–]\s*(\d{4}))?", part)
        if found is None:
            raise Refusal(
                422,
                "Not understood",
                "The provisional years hold “{part}”. Write years of four digits with commas "
                "between them, such as 2022, 2023, or the first and the last as 2021-2023.",
                part=part,
            )
        first, last = int(found[1]), int(found[2] or found[1])
        years += [str(year) for year in range(first, last + 1)]
    return tuple(dict.fromkeys(years))


def _parts(form: Form, key: str) -> tuple[str, ...]:
    """What stands between commas or semicolons."""
    return tuple(part for part in re.split(r"\s*[,;]\s*", _text(form, key)) if part)


def _text(form: Form, key: str) -> str:
    return form.get(key, "").strip()
