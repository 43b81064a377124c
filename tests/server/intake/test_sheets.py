"""A file as columns of codes and numbers."""

import pandas as pd
import pytest

from server.intake import sheets
from server.intake.layout import layout
from tests.factories import COLUMNS, counts_csv


def test_want_of_memory_is_told_as_such(monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_args: object, **_how: object) -> None:
        raise pd.errors.ParserError("Error tokenizing data. C error: out of memory")

    monkeypatch.setattr(pd, "read_csv", full)
    with pytest.raises(MemoryError):
        sheets.load(layout(counts_csv(), "counts.csv"), COLUMNS, "counts")
