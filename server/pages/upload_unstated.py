"""What became of counts that do not state their sex, age or area, on the page of an upload."""

from collections.abc import Callable

from server.exports.table import Column, Row, Table
from server.intake.report import Report
from server.intake.sharing import Unstated
from server.pages.contents_tables import Listing
from server.sentences import sharing as say
from server.sentences.text import _


def said(report: Report) -> str:
    """Above the table; empty where all counts state all."""
    return say.report(
        _sums(report, lambda year: year.sex + year.age + year.area),
        _sums(report, lambda year: year.left_out),
    )


def listing(report: Report) -> Listing:
    return Listing((table(report),) if report.unstated else ())


def table(report: Report) -> Table:
    """Stated, not stated and together, by year."""
    columns = (
        Column("year", _("year")),
        Column("kind", _("counts")),
        _count("stated", _("stated")),
        _count("sex", _("sex"), span=_("not stated, shared out")),
        _count("age", _("age"), span=_("not stated, shared out")),
        _count("area", _("area"), span=_("not stated, shared out")),
        _count("left_out", _("left out")),
        _count("after", _("after")),
    )
    rows = tuple(
        Row(
            (
                year.year,
                say.kind(year.measure),
                *(getattr(year, column.key) for column in columns[2:]),
            )
        )
        for year in sorted(report.unstated, key=lambda year: year.year, reverse=True)
    )
    return Table("not_stated", _("What was not stated"), columns, rows, say.how())


def _count(key: str, label: str, span: str = "") -> Column:
    return Column(key, label, decimals=0, span=span)


def _sums(report: Report, of: Callable[[Unstated], float]) -> dict[str, float]:
    """By measure, where there are any."""
    sums: dict[str, float] = {}
    for year in report.unstated:
        sums[year.measure] = sums.get(year.measure, 0.0) + of(year)
    return {measure: count for measure, count in sums.items() if count}
