"""Sentences about counts that did not state all."""

from dataclasses import replace

import numpy as np
import pytest

from server.sentences import sharing
from server.sentences.pieces import plain
from tests.factories import gompertz_panel


def test_how_many_deaths_were_shared_out() -> None:
    panel = gompertz_panel(people=400_000)
    own = replace(panel, deaths=np.full_like(panel.deaths, 50.0))
    some = replace(own, counted=own.deaths * 0.98)
    (said,) = sharing.computed(some)
    assert plain(said).startswith("Not stated. 22 of the 1,100 deaths did not state their sex")
    (said,) = sharing.computed(some, own)
    assert plain(said).startswith("Not stated. 22 of the 2,200 deaths")
    assert "Curves are fitted" not in plain(said)
    (said,) = sharing.computed(replace(own, counted=own.deaths / 1.21), fits=True)
    assert plain(said).endswith("which makes their bands narrower by 9.1 %.")  # 1 - 1 / 1.1
    for whole in (own, replace(own, counted=own.deaths)):
        assert sharing.computed(whole) == ()


@pytest.mark.parametrize(
    ("shared", "left_out", "text"),
    [
        ({}, {}, ""),
        ({"deaths": 12.0}, {}, "12 deaths did not state their sex, age"),
        ({}, {"births": 3.0}, "3 live births that do not state all"),
        (
            {"deaths": 7.25, "person_years": 1204.5},
            {},
            "7.2 deaths and 1,204 person-years did not state",
        ),
    ],
)
def test_what_was_done_in_a_line(shared, left_out, text: str) -> None:
    assert sharing.report(shared, left_out).startswith(text)
    assert bool(sharing.report(shared, left_out)) == bool(text)
