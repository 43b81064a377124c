"""What is sent with a form: texts and files."""

from collections.abc import AsyncIterator
from typing import Annotated

from fastapi import Depends, Request
from starlette.datastructures import FormData, UploadFile

from server.web.problem import Refusal


async def read_form(request: Request) -> AsyncIterator[FormData]:
    """All fields of a form, files too; these are closed once the answer is made. Refusal where a
    text holds a zero character, which not every database can keep."""
    async with request.form() as form:
        for field, value in form.multi_items():
            if isinstance(value, str) and "\0" in value:
                raise Refusal(
                    422,
                    "Not understood",
                    "The text of “{field}” holds a character that is none. Go back and type it "
                    "again.",
                    field=field,
                )
        yield form


FormDep = Annotated[FormData, Depends(read_form)]


def text(form: FormData, field: str) -> str:
    """What stands in a field, without white around it; empty where there is no such field."""
    value = form.get(field, "")
    return value.strip() if isinstance(value, str) else ""


def file(form: FormData, field: str) -> tuple[str, bytes] | None:
    """Name and content; None where none was chosen: browsers send one without a name."""
    value = form.get(field)
    if not isinstance(value, UploadFile) or not value.filename:
        return None
    return value.filename, value.file.read()


def files(form: FormData, field: str) -> list[tuple[str, bytes]]:
    """Name and content of each file of a field that takes several."""
    return [
        (value.filename, value.file.read())
        for value in form.getlist(field)
        if isinstance(value, UploadFile) and value.filename
    ]
