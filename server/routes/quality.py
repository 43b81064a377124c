"""How good are the counts? /c/{collection}/{edition}/quality, its twins, and what is stated."""

import datetime as dt

from fastapi import Response

from server.accounts.viewer import Right
from server.actions.state_quality import state_quality
from server.pages import quality
from server.results.quality import QualityQuestion
from server.routes.asking import SessionDep, ViewerDep, needs, pinned
from server.routes.forms import FormDep, text
from server.store.statements import QUESTIONS
from server.web.render import redirect

router = pinned(QualityQuestion, quality.build)


@router.post("/c/{collection}/{edition:int}/quality", dependencies=[needs(Right.COMMIT)])
def state(
    session: SessionDep, viewer: ViewerDep, collection: str, edition: int, form: FormDep
) -> Response:
    state_quality(
        session,
        collection=collection,
        number=edition,
        answers={key: text(form, key) for key in QUESTIONS},
        by=viewer,
        now=dt.datetime.now(dt.UTC),
    )
    return redirect(f"/c/{collection}/{edition}/quality#statement", status=303)
