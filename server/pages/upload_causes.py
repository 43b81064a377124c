"""Deaths of an upload by cause, on the page of what the checks found."""

from server.exports.table import Column, Row, Table
from server.intake.report import Report
from server.pages.contents_tables import Listing
from server.sentences import upload_causes as say
from server.sentences.text import _


def said(report: Report) -> str:
    """Above the table; empty where no deaths are by cause."""
    if not report.by_cause:
        return ""
    named = [one.deaths for one in report.by_cause if one.code]
    without = [one.deaths for one in report.by_cause if not one.code]
    return say.placed(len(named), sum(named), sum(without))


def listing(report: Report) -> Listing:
    return Listing((table(report),) if report.by_cause else ())


def table(report: Report) -> Table:
    """Deaths of each cause of the list; where some were shared out, not stating all, how many."""
    together = sum(one.deaths for one in report.by_cause)
    spread = any(one.shared for one in report.by_cause)
    columns = (
        Column("cause", _("cause")),
        Column("deaths", _("deaths"), decimals=0),
        Column("share", _("of all deaths"), unit="%", decimals=1),
        *((Column("shared", _("of them shared out"), decimals=1),) if spread else ()),
    )
    rows = tuple(
        Row(
            (
                one.label if one.code else say.without_cause(),
                one.deaths,
                100 * one.deaths / together,
                *((one.shared,) if spread else ()),
            )
        )
        for one in report.by_cause
    )
    note = say.how() if spread else ""
    return Table("by_cause", _("Deaths by cause"), columns, rows, note)
