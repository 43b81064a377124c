"""Options of the command line that say how files are to be read, and how their counts were made."""

import argparse

from server.intake.forms.delimiters import NAMES
from server.intake.forms.encodings import ENCODINGS
from server.intake.mapping import COLUMNS
from server.sentences.reading_form import MARKS
from server.sentences.text import _


def add_files(command: argparse.ArgumentParser) -> None:
    files = command.add_argument_group(_("files"))
    for role, text in (
        ("counts", _("deaths and population in one file")),
        ("deaths", _("deaths")),
        ("population", _("population or person-years")),
        ("births", _("births: live and, if you have them, still; deaths before 28 days")),
        ("rates", _("death rates or probabilities, to be multiplied by the population")),
        ("areas", _("what becomes of area codes: old code, new code, share")),
        ("breaks", _("years in which the series of an area breaks, and why")),
        ("causes", _("a list of causes of death of your own: code, name, codes")),
    ):
        files.add_argument(f"--{role}", metavar=_("FILE"), help=text)
    files.add_argument(
        "--files",
        nargs="+",
        default=[],
        metavar=_("FILE"),
        help=_("any of these; what each holds is told by its columns, its sheet or its name"),
    )


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


def add_form(command: argparse.ArgumentParser) -> None:
    """How the table stands in the file; each may be said of one kind of file alone."""
    group = command.add_argument_group(
        _("form"),
        _(
            "Only where a file is not what it looks like, or does not say. Before each a kind of "
            "file may stand, as in deaths=VALUE."
        ),
    )
    for option, metavar, text in (
        ("--sheet", _("NAME"), _("sheet of a workbook")),
        ("--encoding", _("NAME"), ", ".join(ENCODINGS)),
        ("--parted-by", _("SIGN"), ", ".join(NAMES.values())),
        ("--headings", _("ROW"), _("row of the headings, or the first and the last as in 3-4")),
        ("--numbers", _("MARKS"), _("as in {marks}", marks=", ".join(MARKS))),
        ("--shape", _("FIELDS"), _("long, or what the headings hold, as in sex-age")),
        ("--cells", _("NUMBER"), _("what the cells of a wide table count")),
        ("--rate-is", _("KIND"), _("rate or probability")),
        ("--cause-list", _("LIST"), _("what causes of death fall into: chapters, short or own")),
    ):
        group.add_argument(option, action="append", default=[], metavar=metavar, help=text)
    group.add_argument(
        "--unit",
        action="append",
        default=[],
        type=_pair,
        metavar=_("NUMBER=SIZE"),
        help=_("what figures are counted in, as in population=1000 or rate=1/100000"),
    )
    group.add_argument(
        "--sign",
        action="append",
        default=[],
        type=_pair,
        metavar=_("TEXT=MEANING"),
        help=_(
            "what stands where a number belongs, as in --sign=-=nil: nil, not-available, withheld "
            "or mistake"
        ),
    )
    group.add_argument(
        "--not-stated",
        action="append",
        default=[],
        type=_pair,
        metavar=_("FIELD=WHAT"),
        help=_("of sex, age or area: share out counts that do not state it, or leave-out"),
    )
    group.add_argument(
        "--share-at-most",
        type=int,
        default=None,
        metavar=_("PERCENT"),
        help=_("of a year's counts; where more do not state it, the file is refused (5)"),
    )
    group.add_argument(
        "--as-before",
        action="store_true",
        help=_("read the files as those of the newest edition whose columns they have"),
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
        "--population-is",
        choices=("midyear", "person_years", "january"),
        help=_("what population means"),
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


def _pair(text: str) -> tuple[str, str]:
    """'dk=Denmark'."""
    before, equals, after = text.partition("=")
    if not (before and equals and after):
        raise argparse.ArgumentTypeError(_("“{text}” is not of the form A=B", text=text))
    return before, after
