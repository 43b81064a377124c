"""What a command refuses in a sentence, without a traceback."""

from server.results.questions import BadAddress
from server.store.errors import Missing, Stale


class Refused(Exception):
    """A command cannot go on; its text says where, what was found and what to do."""

    def __init__(self, sentence: str, *, exit_code: int = 2) -> None:
        super().__init__(sentence)
        self.exit_code = exit_code


REFUSALS = (Refused, BadAddress, Missing, Stale, FileNotFoundError)
