"""A page as its twins see it."""

from server.exports.twin import Twin
from server.pages.page import Page
from server.sentences.pieces import plain


def twin(page: Page) -> Twin:
    """Everything of the page but its pictures, in plain words."""
    return Twin(
        title=page.frame.title,
        address=page.frame.address,
        about=page.frame.colophon,
        notices=tuple((notice.word, plain(notice.text)) for notice in page.frame.notices),
        cautions=tuple((caution.word, caution.text) for caution in page.cautions),
        tables=page.tables,
    )
