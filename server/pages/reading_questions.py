"""What no column of an upload says, as lines of a form: areas, ages, what is not stated, basis."""

from collections.abc import Mapping as Mapped
from dataclasses import dataclass

from server.intake.mapping import LISTS, Mapping
from server.intake.recognising.look import Looked
from server.pages.form_fields import Field, radios, select, text
from server.sentences import reading as say
from server.sentences import reading_causes
from server.sentences import reading_form as ask
from server.sentences.text import _
from server.store.records import Basis

MATTERS = ("sex", "age", "area")  # in the order in which counts that do not state them are shared


@dataclass(frozen=True, slots=True)
class Asked:
    """What holds for all files."""

    here: tuple[Field, ...]  # what these files leave open
    more: tuple[Field, ...]  # what other files would
    basis: tuple[Field, ...]


@dataclass(frozen=True, slots=True)
class _Form:
    """Values and errors of the fields, by name."""

    stated: Mapped[str, str]
    texts: Mapped[str, str] | None  # as sent; they go before what was stated
    errors: Mapped[str, str]

    def value(self, name: str) -> str:
        if self.texts is not None:
            return self.texts.get(name, "")
        return self.stated.get(name, "")

    def error(self, name: str) -> str:
        return self.errors.get(name, "")


def asked(
    looked: tuple[Looked, ...],
    *,
    basis: Basis,
    stated: Mapping,
    texts: Mapped[str, str] | None,
    errors: Mapped[str, str],
) -> Asked:
    """The lines, filled with what was sent, or what was stated before."""
    counts = tuple(one for one in looked if one.role not in LISTS)
    form = _Form(_stated(stated, counts) | _basis_texts(basis), texts, errors)
    here: list[Field] = []
    more: list[Field] = []
    for group, open_here in (
        (_one_area(form, without=_lacks(counts, "area")), _lacks(counts, "area")),
        ([_one_sex(form)], _lacks(counts, "sex")),
        (_unstated(form, counts), True),
        (_whole(form), not all(_without(one, "area") for one in counts)),
        ([_provisional(form)], True),
        ([_last_age(form, counts)], any(one.noticed.last_age for one in counts)),
    ):
        (here if open_here else more).extend(group)
    return Asked(tuple(here), tuple(more), tuple(_basis(form)))


def open_errors(looked: tuple[Looked, ...], texts: Mapped[str, str]) -> dict[str, str]:
    """Questions about the files that were not answered, by the name of the field."""
    found = {}
    for one in looked:
        if one.changed:
            continue
        role = one.role
        if "kind" in one.open:
            found[f"{role}.role"] = ask.kind_missing()
        if "marks" in one.open:
            likely = ask.marks_example(one.marks.decimal, one.marks.thousands)
            found[f"{role}.marks"] = ask.marks_missing(one.marks.example, likely)
        if "number" in one.open:
            found[f"{role}.across_number"] = ask.number_missing()
        if "rate_is" in one.open:
            found[f"{role}.rate_is"] = ask.rate_missing()
        if "cause_list" in one.open:
            found[f"{role}.cause_list"] = reading_causes.cause_list_missing()
        units = dict(one.mapping.units)
        for number, _proposal in one.units:
            if number not in units:
                found[f"{role}.unit.{number}"] = ask.unit_missing()
        signs = dict(one.mapping.signs)
        for place, sign in enumerate(one.signs):
            if sign not in signs:
                found[f"{role}.sign.{place}"] = ask.sign_missing(sign)
        codes = dict(one.mapping.sex_codes)
        for place, code in enumerate(one.noticed.sexes):
            if code.asked and code.text not in codes:
                found[f"{role}.sex.{place}"] = ask.sex_missing(code.text)
    given = {name for name in ("only_area", "only_area_name", "only_sex") if texts.get(name, "")}
    counts = tuple(one for one in looked if one.role not in LISTS and not one.changed)
    if _lacks(counts, "area") and not given & {"only_area", "only_area_name"}:
        found["only_area"] = ask.area_missing()
    if _lacks(counts, "sex") and "only_sex" not in given:
        found["only_sex"] = ask.only_sex_missing()
    for matter in _unstated_texts(looked):
        if texts.get(f"unstated_{matter}", "") not in ("spread", "left_out"):
            found[f"unstated_{matter}"] = ask.unstated_missing()
    return found


def _stated(mapping: Mapping, looked: tuple[Looked, ...]) -> dict[str, str]:
    """The shared fields of a mapping as texts; an area called by a word for all is the whole."""
    found = {
        name: getattr(mapping, name)
        for name in ("only_area", "only_area_name", "only_sex", "whole", "whole_name")
    }
    if not (found["whole"] or found["whole_name"]):
        called = next(((one, one.noticed.whole) for one in looked if one.noticed.whole), None)
        if called:
            found["whole" if called[0].mapping.area else "whole_name"] = called[1]
    return found | {
        "delivered": ", ".join(mapping.delivered),
        "provisional": ", ".join(mapping.provisional_years),
        "last_age_open": "yes" if mapping.last_age_open else "",
        "most_unstated": str(mapping.most_unstated),
        **{f"unstated_{matter}": what for matter, what in mapping.unstated},
    }


def _without(one: Looked, matter: str) -> bool:
    """Whether a file of counts says nothing of its areas, or its sexes."""
    if one.reading.problems or matter in one.mapping.form.across:
        return False
    named = one.mapping.area_name if matter == "area" else ""
    return not (one.mapping.column(matter) or named)


def _lacks(looked: tuple[Looked, ...], matter: str) -> bool:
    return any(
        _without(one, matter) for one in looked if not (matter == "sex" and one.role == "births")
    )


def _one_area(form: _Form, *, without: bool) -> list[Field]:
    return [
        text(
            "only_area",
            _("Code of the one area"),
            form.value("only_area"),
            hint=say.area_hint(without=without),
            error=form.error("only_area"),
        ),
        text("only_area_name", _("Its name"), form.value("only_area_name")),
    ]


def _one_sex(form: _Form) -> Field:
    hint = _("only where no column says it")
    error, value = form.error("only_sex"), form.value("only_sex")
    return select("only_sex", _("Sex"), say.sexes(), value, hint=hint, error=error)


def _whole(form: _Form) -> list[Field]:
    return [
        text(
            "whole",
            _("Code of the whole"),
            form.value("whole"),
            hint=_("of which the other areas are parts"),
        ),
        text("whole_name", _("Its name"), form.value("whole_name")),
        text(
            "delivered",
            _("Areas kept as delivered"),
            form.value("delivered"),
            width="wide",
            hint=_("codes; otherwise a whole is summed from its parts"),
        ),
    ]


def _provisional(form: _Form) -> Field:
    return text(
        "provisional",
        _("Provisional years"),
        form.value("provisional"),
        width="wide",
        hint=_("such as 2022, 2023"),
        error=form.error("provisional"),
    )


def _last_age(form: _Form, looked: tuple[Looked, ...]) -> Field:
    last = next((one.noticed.last_age for one in looked if one.noticed.last_age), "")
    label = _("the last age of each series has no upper end, though nothing marks it")
    return Field(
        "boxes",
        "last_age_open",
        _("Ages"),
        form.value("last_age_open"),
        (("yes", label),),
        hint=say.last_age(last),
        width="whole",
    )


def _unstated_texts(looked: tuple[Looked, ...]) -> dict[str, tuple[str, ...]]:
    """Texts that say a matter is not stated, of all files, in the order of sharing."""
    found: dict[str, dict[str, None]] = {}
    for one in looked:
        for matter, texts in one.noticed.unstated:
            found.setdefault(matter, {}).update(dict.fromkeys(texts))
    return {matter: tuple(found[matter]) for matter in MATTERS if matter in found}


def _unstated(form: _Form, looked: tuple[Looked, ...]) -> list[Field]:
    lines = [
        radios(
            name := f"unstated_{matter}",
            ask.unstated_label(matter, texts),
            ask.unstated(),
            form.value(name),
            error=form.error(name),
            width="whole",
            required=True,
        )
        for matter, texts in _unstated_texts(looked).items()
    ]
    if lines:
        lines.append(
            text(
                "most_unstated",
                _("Share out at most, % of a year’s counts"),
                form.value("most_unstated") or "5",
                error=form.error("most_unstated"),
                width="wide",
                hint=_("where more do not state it, the file is refused"),
            )
        )
    return lines


def _basis_texts(basis: Basis) -> dict[str, str]:
    return {
        "people": basis.people,
        "dated_by": basis.dated_by,
        "population_is": basis.population,
        "population_date": basis.population_date,
        "source": basis.source,
        "vintage": basis.vintage,
    }


def _basis(form: _Form) -> list[Field]:
    """How the counts were made; all but the vintage must be answered."""

    def line(kind: str, name: str, label: str, options: say.Options = (), hint: str = "") -> Field:
        return Field(
            kind,  # type: ignore[arg-type]
            name,
            label,
            form.value(name),
            options,
            hint=hint,
            error=form.error(name),
            width="whole" if kind == "radios" or name == "source" else "wide",
            required=name != "vintage",
        )

    dates = _("such as 1 July of each year; with person-years: the whole year")
    return [
        line("radios", "people", _("Whose deaths are counted"), say.people()),
        line("radios", "dated_by", _("What decides the year of a death"), say.dated_by()),
        line("select", "population_is", _("What population means"), say.population()),
        line("text", "population_date", _("Its date"), hint=dates),
        line("text", "source", _("Where the counts come from"), hint=_("stands under every chart")),
        line(
            "text",
            "vintage",
            _("Which estimate of the population"),
            hint=_("if there are several, such as after the census of 2021"),
        ),
    ]
