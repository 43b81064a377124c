"""Days in words."""

import datetime as dt

from server.sentences.text import _


def day(when: dt.date) -> str:
    """A day, in the time it is recorded in.

    >>> day(dt.date(2014, 9, 2))
    '2\\xa0September 2014'
    """
    months = (
        _("January"),
        _("February"),
        _("March"),
        _("April"),
        _("May"),
        _("June"),
        _("July"),
        _("August"),
        _("September"),
        _("October"),
        _("November"),
        _("December"),
    )
    return _(
        "{day}\N{NO-BREAK SPACE}{month} {year}",
        day=when.day,
        month=months[when.month - 1],
        year=when.year,
    )
