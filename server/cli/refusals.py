"""What a command refuses in a sentence, without a traceback."""

from server.accounts.viewer import NotAllowed
from server.results.holdings import NotInEdition
from server.results.questions import BadAddress
from server.results.series import TooLarge
from server.routes.asking import NoSuchPage
from server.sentences.text import _
from server.store.errors import Refused


class Declined(Exception):
    """A command cannot go on; its text says where, what was found and what to do."""

    def __init__(self, sentence: str, *, exit_code: int = 2) -> None:
        super().__init__(sentence)
        self.exit_code = exit_code


REFUSALS = (Declined, Refused, NotAllowed, BadAddress, NoSuchPage, NotInEdition, TooLarge)


def sentence(error: Exception) -> str:
    """What to print: texts of the catalogue with their values, or a text that has passed it."""
    if isinstance(error, Refused | NotAllowed):
        return _(error.text, **error.values)
    return str(error)


def exit_code(error: Exception) -> int:
    return error.exit_code if isinstance(error, Declined) else 2
