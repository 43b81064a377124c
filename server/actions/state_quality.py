"""State what is known of an edition's quality. Nothing said before is changed: the newest holds."""

import datetime as dt
from collections.abc import Mapping

from server.accounts.viewer import Right, Viewer
from server.store import statements
from server.store.connect import Session, transaction
from server.store.errors import Refused
from server.store.records import Statement
from server.store.statements import LONGEST, QUESTIONS


def state_quality(
    session: Session,
    *,
    collection: str,
    number: int,
    answers: Mapping[str, str],
    by: Viewer,
    now: dt.datetime,
) -> Statement:
    """`answers` by question; those left out or empty are not answered.

    Raises: NotAllowed; Missing; Refused where nothing is said, or an answer is too long; ValueError
    where a question is not one of QUESTIONS.
    """
    by.require(Right.COMMIT)
    if unknown := set(answers) - set(QUESTIONS):
        raise ValueError(f"{sorted(unknown)} are no questions; there are {QUESTIONS}")
    said = {key: text for key in QUESTIONS if (text := " ".join(answers.get(key, "").split()))}
    if not said:
        raise Refused("Nothing is stated. Answer one of the questions at least.")
    for text in said.values():
        if len(text) > LONGEST:
            raise Refused(
                "An answer has {count} signs; at most {most} are kept. Shorten it.",
                count=len(text),
                most=LONGEST,
            )
    with transaction(session):
        return statements.add(session, collection, number, said, by=by.name, at=now)
