"""A policy masks every edition, those that stand and those to come."""

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from engine.panel import Panel
from server.accounts.viewer import LOCAL, NotAllowed, Viewer
from server.actions import masking
from server.actions.set_policy import effect_of, set_policy
from server.disclosure.masking import Made, mask
from server.results.loading import load
from server.results.questions import PopulationYear
from server.store import editions, masks, policies
from server.store.connect import Session, transaction
from server.store.errors import Refused, Stale
from server.store.records import Change, Mask, Policy, Terms
from tests.factories import BASIS, NOON, edition, gompertz_panel

SMALL = PopulationYear("rock", "f", "2014")


def panels(seed: int = 0) -> dict[str, Panel]:
    return {
        f"{area}.{sex}.2014": gompertz_panel(sex=sex, seed=seed + at, people=people)
        for at, (area, sex, people) in enumerate(
            (area, sex, people)
            for area, people in (("north", 2e5), ("cape", 9e4), ("rock", 6e3))
            for sex in "fm"
        )
    }


def first(session: Session) -> None:
    edition(session, panels(), parents={"north": "isle", "cape": "isle", "rock": "isle"})


def set_to(session: Session, **terms: object) -> Policy:
    made = Terms(**terms)  # type: ignore[arg-type]
    return set_policy(session, collection="isle", terms=made, note="Why.", by=LOCAL, now=NOON)


def test_what_was_shown_is_withheld_and_the_rest_stays(session: Session) -> None:
    first(session)
    before = load(session, "isle", 1, [SMALL])[SMALL]
    assert not before.protected
    set_to(session, threshold=5)
    after = load(session, "isle", 1, [SMALL])[SMALL]
    small = (before.panel.deaths > 0) & (before.panel.deaths < 5)
    gone = after.withheld_on(after.panel.grid)
    assert small.any()
    assert gone[small].all()
    assert (after.panel.deaths[~gone] == before.panel.deaths[~gone]).all()
    full = load(session, "isle", 1, [SMALL], figures="full")[SMALL]
    assert (full.panel.deaths == before.panel.deaths).all()
    assert not full.protected


def test_an_edition_made_later_has_its_mask_and_keeps_the_earlier_one(session: Session) -> None:
    first(session)
    set_to(session)
    edition(session, {name: one for name, one in panels(7).items() if name.startswith("rock")})
    one, two = (masks.find(session, "isle", (1, 2))[number].kept.mask for number in (1, 2))
    for key, hidden in one.items():
        assert set(hidden.ages) <= set(two[key].ages)


def test_another_threshold_is_another_policy(session: Session) -> None:
    first(session)
    numbers = [set_to(session, threshold=at).number for at in (5, 3)]
    assert numbers == [1, 2]
    assert [one.terms.threshold for one in policies.listing(session, "isle")] == [3, 5]
    fewer, more = (masks.of_editions(session, "isle", number)[1].cells for number in (2, 1))
    assert 0 < fewer < more


def test_masks_are_made_beside_what_other_policies_showed(
    session: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    first(session)
    set_to(session, threshold=5)
    old = masks.of_editions(session, "isle", 1)[1].mask
    beside: list[list[Mask]] = []

    def noted(*given: Any, **more: Any) -> Made:
        beside.append([one.mask for one in given[4]])
        return mask(*given, **more)

    monkeypatch.setattr("server.actions.masking.mask", noted)
    set_to(session, threshold=4)
    edition(session, panels(7))
    assert beside == [[old], [old]]


def test_a_year_that_stays_keeps_what_could_not_be_protected_of_it(session: Session) -> None:
    """Whether it was left alone, made again as it was, or is masked by a policy set later."""
    told = {name: replace(one, exposure=np.round(one.exposure)) for name, one in panels().items()}
    edition(session, told, parents={"north": "isle", "cape": "isle", "rock": "isle"})
    set_to(session, threshold=100)
    year = masks.of_editions(session, "isle", 1)[1].unprotected["2014"]
    assert year.narrow > 0
    edition(session, {f"rock.{sex}.2015": told[f"rock.{sex}.2014"] for sex in "fm"})
    edition(session, told)
    set_to(session, threshold=100)
    for policy in (1, 2):
        kept = masks.of_editions(session, "isle", policy)
        assert [kept[number].unprotected["2014"] for number in (1, 2, 3)] == [year] * 3
        assert kept[1].narrow == year.narrow < kept[2].narrow == kept[3].narrow


def test_a_trial_writes_nothing(session: Session) -> None:
    first(session)
    tried = effect_of(session, "isle", Terms())
    assert tried[1].cells > 0
    assert policies.newest(session, "isle") is None
    assert set_to(session).number == 1
    assert masks.find(session, "isle", (1,))[1].kept == tried[1]


def test_an_edition_is_refused_whose_mask_was_made_under_another_policy(session: Session) -> None:
    first(session)
    set_to(session)
    held = editions.find(session, "isle", 1)
    assert held is not None
    change = Change("isle", 1, {}, (), BASIS)
    masked = masking.mask_of(session, change)
    set_to(session, threshold=3)
    with pytest.raises(Stale), transaction(session):
        masking.keep(session, change, 2, masked, at=NOON)


def test_nothing_is_released_without_a_mask(session: Session) -> None:
    first(session)
    with transaction(session):
        policies.write(session, "isle", Terms(), by="desk", note="Why.", at=NOON)
    with pytest.raises(Refused, match="no mask"):
        load(session, "isle", 1, [SMALL])
    assert load(session, "isle", 1, [SMALL], figures="full")


def test_the_digest_of_what_is_released_cannot_be_guessed_from_the_counts(
    session: Session,
) -> None:
    first(session)
    set_to(session)
    set_to(session)
    one, two = (masks.of_editions(session, "isle", number)[1] for number in (1, 2))
    assert one == two
    secrets = {policies.secret(session, "isle", number) for number in (1, 2)}
    assert len(secrets) == 2
    assert all(len(secret) == 32 for secret in secrets)


def test_terms_and_rights_are_required(session: Session) -> None:
    first(session)
    with pytest.raises(Refused, match="needs a note"):
        set_policy(session, collection="isle", terms=Terms(), note=" ", by=LOCAL, now=NOON)
    with pytest.raises(Refused, match="can be 2 to 100"):
        set_to(session, threshold=1)
    nobody = replace(LOCAL, rights=frozenset())
    with pytest.raises(NotAllowed):
        set_policy(session, collection="isle", terms=Terms(), note="x", by=nobody, now=NOON)
    assert isinstance(nobody, Viewer)
