"""What is typed about areas and breaks, as the files that it stands for."""

from starlette.datastructures import FormData

from server.intake.lists import HEADINGS, written
from server.pages.small_tables import LINES
from server.routes.forms import text

File = tuple[str, str, bytes]  # role, name, content


def typed(form: FormData) -> list[File]:
    """A file for each small table of which a line was filled in: the same that could be handed in,
    and kept as one."""
    files = []
    for role, fields in HEADINGS.items():
        lines = [
            {field: found for field in fields if (found := text(form, f"{role}.{at}.{field}"))}
            for at in range(1, LINES + 1)
        ]
        if any(lines):
            filled = [line for line in lines if line]
            files.append((role, f"{role}-typed.csv", written(role, filled)))
    return files
