"""How the files of an upload are read: /uploads/{upload}/reading."""

import datetime as dt

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.actions.map_upload import map_upload
from server.actions.sort_files import sort_files
from server.pages import upload_reading as page
from server.routes import plain
from server.routes.asking import SessionDep, ViewerDep, needs
from server.routes.forms import FormDep
from server.routes.reading_form import answers, roles_said
from server.routes.uploads import check
from server.store import uploads
from server.web.render import READ, render

router = APIRouter()


@router.api_route("/uploads/{upload:int}/reading", methods=READ, dependencies=[needs(Right.READ)])
def show(request: Request, session: SessionDep, upload: int) -> Response:
    plain.keys(request)
    return render(request, page.build(session, upload))


@router.post("/uploads/{upload:int}/reading", dependencies=[needs(Right.UPLOAD)])
def answer(
    request: Request, session: SessionDep, viewer: ViewerDep, upload: int, form: FormDep
) -> Response:
    """Show the files as was answered; once nothing is left open, check them."""
    draft = uploads.find(session, upload)
    texts = {key: value for key, value in form.items() if isinstance(value, str)}
    roles = roles_said(texts, [file.role for file in draft.files])
    if moved := [new for old, new in roles.items() if old != new]:
        draft = sort_files(session, upload_id=upload, roles=roles, by=viewer)
        said = answers(texts, (role for role in roles.values() if role not in moved))
        looked = page.looked_at(session, draft, said, moved)
        return render(request, page.build(session, upload, looked, said))
    said = answers(texts, roles)
    looked = page.looked_at(session, draft, said)
    if "again" in texts or any(one.changed for one in looked):
        return render(request, page.build(session, upload, looked, said))
    if errors := page.errors_of(looked, said):
        return render(request, page.build(session, upload, looked, said, errors), status=422)
    assert said.basis is not None  # else it is among the errors
    map_upload(
        session,
        upload_id=upload,
        mappings=page.mappings(looked, said),
        basis=said.basis,
        by=viewer,
        now=dt.datetime.now(dt.UTC),
    )
    return check(request, session, upload)
