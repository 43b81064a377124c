"""Lines to fill in about areas and breaks, in place of a small file."""

from server.intake.break_rows import NONE
from server.intake.lists import HEADINGS
from server.pages.form_fields import Field, select, text
from server.sentences import small_tables as say
from server.store.records import BREAKS

LINES = 2  # of each table; a longer one is a file
TYPED = {
    "areas": ("code", "becomes", "from", "to", "share", "name"),
    "breaks": ("year", "kind", "area", "note"),
}


def lines(role: str) -> tuple[Field, ...]:
    """The fields of all lines of one table, line by line."""
    return tuple(_field(role, field, at) for at in range(1, LINES + 1) for field in TYPED[role])


def _field(role: str, field: str, at: int) -> Field:
    name, label = f"{role}.{at}.{field}", say.field(role, field, at)
    hint = say.hint(field) if at == 1 and field in HEADINGS[role] else ""
    if field == "kind":
        return select(name, label, say.kinds(BREAKS, NONE), "", hint=hint)
    return text(name, label, "", hint=hint, width="wide" if field in ("share", "name") else "")
