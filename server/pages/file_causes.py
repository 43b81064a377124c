"""Which list the causes of a file fall into, and how they do, beside the form about the file."""

from server.exports.table import Column, Row, Table
from server.intake.recognising.look import Looked
from server.pages.form_fields import Field, select
from server.sentences import reading_causes as ask
from server.sentences.text import _


def cause_lists(looked: Looked) -> list[Field]:
    """Which list its causes fall into: nothing is chosen beforehand."""
    if not looked.by_cause:
        return []
    name, label, chosen = (
        f"{looked.role}.cause_list",
        ask.cause_list_label(),
        looked.mapping.cause_list,
    )
    hint = ask.cause_list_hint()
    return [select(name, label, ask.cause_lists(), chosen, hint=hint, width="whole", required=True)]


def causes(looked: Looked) -> tuple[Table, ...]:
    """How the codes of a file fall into the list of causes that was chosen."""
    if looked.fallen is None:
        return ()
    columns = (
        Column("cause", _("cause")),
        Column("count", _("codes or names"), decimals=0),
        Column("codes", _("which")),
    )
    rows = tuple(
        Row((label, len(texts), ", ".join(texts))) for label, texts in looked.fallen.leaves
    )
    title = _("Causes of {file} in the list", file=looked.reading.name)
    return (Table(f"{looked.role}_causes", title, columns, rows),)


def fallen(looked: Looked) -> str:
    """The same in a sentence; empty where no list was chosen yet."""
    if looked.fallen is None:
        return ""
    return ask.fallen(looked.fallen.placed, len(looked.fallen.leaves), looked.fallen.sums)


def lost(looked: Looked) -> str:
    """Causes that the list does not have; empty where it has all."""
    return ask.not_in_list(looked.fallen.lost) if looked.fallen else ""
