"""How files handed in on the command line are to be read, and how their counts were made."""

import argparse
from dataclasses import fields, replace
from pathlib import Path

from server.cli.refusals import Declined
from server.intake.mapping import COLUMNS, ROLES, Mapping
from server.intake.parsing import Handed
from server.intake.reading import read
from server.intake.recognising.columns import fields_of, recognise
from server.sentences.text import _
from server.store.records import Basis


def add_files(command: argparse.ArgumentParser) -> None:
    files = command.add_argument_group(_("files"))
    for role, text in (
        ("counts", _("deaths and population in one file")),
        ("deaths", _("deaths")),
        ("population", _("population or person-years")),
        ("births", _("births: live and, if you have them, still; deaths before 28 days")),
        ("rates", _("death rates or probabilities, to be multiplied by the population")),
    ):
        files.add_argument(f"--{role}", metavar=_("FILE"), help=text)


def add_mapping(command: argparse.ArgumentParser) -> None:
    group = command.add_argument_group(
        _("reading"), _("Only where the columns do not speak for themselves.")
    )
    group.add_argument(
        "--column",
        action="append",
        default=[],
        type=_pair,
        metavar=_("FIELD=NAME"),
        help=_(
            "the column NAME holds FIELD, one of {fields}; before the field a kind of file may "
            "stand, as in population.age=group",
            fields=", ".join(COLUMNS),
        ),
    )
    group.add_argument(
        "--area", type=_pair, metavar="CODE=NAME", help=_("the one area, where no column says it")
    )
    group.add_argument(
        "--whole", type=_pair, metavar="CODE=NAME", help=_("the area that all others are part of")
    )
    group.add_argument(
        "--delivered",
        action="append",
        default=[],
        metavar="CODE",
        help=_("keep the counts of this area as delivered instead of summing its parts"),
    )
    group.add_argument("--sex", choices=("f", "m", "p"), help=_("where no column says it"))
    group.add_argument(
        "--sex-code",
        action="append",
        default=[],
        type=_pair,
        metavar=_("TEXT=SEX"),
        help=_("how a sex is written in the file, as in 1=m"),
    )
    group.add_argument(
        "--open-age", action="store_true", help=_("the last age has no upper end, though unmarked")
    )
    group.add_argument(
        "--provisional", nargs="+", default=[], metavar=_("YEAR"), help=_("years that may move")
    )


def add_basis(command: argparse.ArgumentParser) -> None:
    group = command.add_argument_group(_("basis"))
    group.add_argument(
        "--people", choices=("residents", "occurrences"), help=_("whose deaths are counted")
    )
    group.add_argument(
        "--dated-by", choices=("death", "registration"), help=_("what decides the year")
    )
    group.add_argument(
        "--population-is", choices=("midyear", "person_years"), help=_("what population means")
    )
    group.add_argument(
        "--population-date", metavar=_("TEXT"), help=_("its date, as in '1 July of each year'")
    )
    group.add_argument("--source", metavar=_("TEXT"), help=_("where the counts come from"))
    group.add_argument(
        "--vintage",
        metavar=_("TEXT"),
        help=_("which estimate of the population, as in 'after the 2021 census'"),
    )


def handed(asked: argparse.Namespace, *, limit: int) -> list[Handed]:
    """The files with their mappings. Declined where one cannot be opened or is too large."""
    given = [(role, Path(getattr(asked, role))) for role in ROLES if getattr(asked, role)]
    if not given:
        raise Declined(
            _("No file was given. Give --counts FILE, or --deaths FILE and --population FILE.")
        )
    return [_handed(role, path, asked, limit) for role, path in given]


def _handed(role: str, path: Path, asked: argparse.Namespace, limit: int) -> Handed:
    try:
        content = path.read_bytes()
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
    mapping = recognise(read(content, path.name), role).mapping
    return Handed(role, path.name, content, _corrected(mapping, role, asked))


def _corrected(mapping: Mapping, role: str, asked: argparse.Namespace) -> Mapping:
    """What the options say goes before what the headings say."""
    columns = {}
    for name, column in asked.column:
        kind, _dot, field = name.rpartition(".")
        if field not in COLUMNS or kind not in ("", *ROLES):
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
    area, whole = asked.area or ("", ""), asked.whole or ("", "")
    return replace(
        mapping,
        **columns,
        only_area=area[0],
        only_area_name=area[1],
        whole=whole[0],
        whole_name=whole[1],
        delivered=tuple(asked.delivered),
        only_sex=asked.sex or "",
        sex_codes=tuple(asked.sex_code),
        last_age_open=asked.open_age,
        provisional_years=tuple(asked.provisional),
    )


def basis(asked: argparse.Namespace, before: Basis | None) -> Basis:
    """As stated, else as before. Declined where neither says it."""
    given = {
        "people": asked.people,
        "dated_by": asked.dated_by,
        "population": asked.population_is,
        "population_date": asked.population_date,
        "source": asked.source,
        "vintage": asked.vintage,
    }
    options = {
        "people": "--people",
        "dated_by": "--dated-by",
        "population": "--population-is",
        "population_date": "--population-date",
        "source": "--source",
    }
    stated = {
        field.name: given[field.name] or (getattr(before, field.name) if before else "")
        for field in fields(Basis)
    }
    missing = [options[name] for name, text in stated.items() if not text and name in options]
    if missing:
        raise Declined(
            _(
                "The basis of the counts is not stated. Give {missing}: whoever reads the figures "
                "must know it. See ebbline hand-in --help.",
                missing=", ".join(missing),
            )
        )
    return Basis(**stated)


def _pair(text: str) -> tuple[str, str]:
    """'dk=Denmark'."""
    before, equals, after = text.partition("=")
    if not (before and equals and after):
        raise argparse.ArgumentTypeError(_("“{text}” is not of the form A=B", text=text))
    return before, after
