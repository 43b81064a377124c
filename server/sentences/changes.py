"""What is said of the difference between two editions: exact, since it is no matter of chance."""

from collections.abc import Sequence

from server.sentences import names
from server.sentences.numbers import number, whole
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _, n_


def measure(key: str) -> str:
    """What a schedule counts, inside a sentence."""
    return {
        "deaths": _("deaths"),
        "person_years": _("person-years"),
        "births": _("live births"),
        "stillbirths": _("stillbirths"),
        "neonatal_deaths": _("deaths before 28 days"),
        "counted_deaths": _("deaths as counted"),
    }[key]


def counts(key: str, years: Sequence[str], areas: int) -> str:
    """The deaths of 2021 in 2 areas."""
    return _(
        "the {measure} of {years} in {areas}",
        measure=measure(key),
        years=_years(years),
        areas=n_("one area", "{count} areas", areas, count=whole(areas)),
    )


def _years(years: Sequence[str]) -> str:
    """Few years by name, many by their span."""
    if len(years) <= 3:
        return names.listed(list(years))
    return _(
        "{count} years between {first} and {last}",
        count=len(years),
        first=years[0],
        last=years[-1],
    )


def answer(number_: int, since: int, changed: Sequence[str], moved: str) -> Sentence:
    """`changed` are parts by `counts`, `moved` says how far the headline went."""
    if not changed:
        return phrase(
            _("Edition {number} holds the same numbers as edition {since}; {moved}."),
            number=str(number_),
            since=str(since),
            moved=moved,
        )
    return phrase(
        _("Since edition {since}, edition {number} changed {changed}; {moved}."),
        number=str(number_),
        since=str(since),
        changed=names.listed(list(changed), most=3),
        moved=moved,
    )


def most(label: str, amount: float, decimals: int, unit: str, who: str, year: str) -> str:
    """How far the headline went where it went farthest."""
    return _(
        "{label} moved at most by {amount}, for {who} in {year}",
        label=names.inside(label),
        amount=f"{number(abs(amount), decimals)}\N{NO-BREAK SPACE}{unit}",
        who=who,
        year=year,
    )


def unmoved(label: str) -> str:
    return _("no {label} moved", label=names.inside(label))


def rebase(years: Sequence[str], vintage: str) -> Sentence:
    """That nothing but the population is new; empty where more is, or nothing."""
    if not years:
        return ()
    if not vintage:
        return phrase(
            _("A rebase: the population of {years} is new, and no death changed."),
            years=_years(years),
        )
    return phrase(
        _("A rebase: the population of {years} is new ({vintage}), and no death changed."),
        years=_years(years),
        vintage=vintage,
    )


def lost(label: str, count: int) -> Sentence:
    """Figures that one of the two editions cannot give; empty where there is none."""
    if not count:
        return ()
    return phrase(
        n_(
            "One {label} stands in one of the two editions only.",
            "{count} of {label} stand in one of the two editions only.",
            count,
            label=names.inside(label),
            count=whole(count),
        )
    )


def finding(label: str, shown: int, all_: int) -> str:
    """Title of the picture."""
    if shown == all_:
        return _("What the revision did to {label}, largest first", label=names.inside(label))
    return _(
        "What the revision did to {label}: the {shown} largest of {all}",
        label=names.inside(label),
        shown=whole(shown),
        all=whole(all_),
    )


def no_interval() -> Sentence:
    return phrase(
        _(
            "These differences have no interval: they are the same deaths and people, counted "
            "again, and are shown exactly."
        )
    )


def kind(key: str) -> str:
    """What befell a column of ages."""
    return {
        "added": _("new"),
        "dropped": _("gone"),
        "groups": _("other age groups"),
        "numbers": _("changed"),
        "marks": _("same numbers"),
    }[key]


def status(code: str) -> str:
    return {"final": _("final"), "provisional": _("provisional"), "": _("not held")}[code]


def statuses(years: Sequence[str], now: str, *, moved: bool) -> Sentence:
    """That years changed their status; empty where none did. `moved`: with their numbers."""
    if not years:
        return ()
    texts = {
        ("final", False): (
            "{years} became final with no number moving.",
            "{years} became final with no number moving.",
        ),
        ("provisional", False): (
            "{years} became provisional with no number moving.",
            "{years} became provisional with no number moving.",
        ),
        ("final", True): (
            "{years} became final, and numbers moved.",
            "{years} became final, and numbers moved.",
        ),
        ("provisional", True): (
            "{years} became provisional, and numbers moved.",
            "{years} became provisional, and numbers moved.",
        ),
    }
    return phrase(
        n_(*texts[now, moved], len(years), years=names.listed(list(years), most=12)),
    )


def areas(added: Sequence[str], gone: Sequence[str], moved: Sequence[str]) -> Sentence:
    """Areas that are new, gone or placed elsewhere; empty where there is none."""
    parts = []
    for found, one, many in (
        (added, "{areas} is new", "{areas} are new"),
        (gone, "{areas} is gone", "{areas} are gone"),
        (moved, "{areas} stands elsewhere", "{areas} stand elsewhere"),
    ):
        if found:
            parts.append(n_(one, many, len(found), areas=names.listed(list(found), most=8)))
    return phrase(_("Areas: {parts}."), parts="; ".join(parts)) if parts else ()


def years(added: Sequence[str], gone: Sequence[str]) -> Sentence:
    """Years that are new or gone altogether."""
    parts = []
    if added:
        parts.append(n_("{years} is new", "{years} are new", len(added), years=_years(added)))
    if gone:
        parts.append(n_("{years} is gone", "{years} are gone", len(gone), years=_years(gone)))
    return phrase(_("Years: {parts}."), parts="; ".join(parts)) if parts else ()


def basis(parts: Sequence[str]) -> Sentence:
    """Parts of the basis that are other ones."""
    if not parts:
        return ()
    return phrase(
        _("The counts are made otherwise: {parts}."),
        parts=names.listed([basis_part(one) for one in parts]),
    )


def basis_part(key: str) -> str:
    return {
        "people": _("whose deaths are counted"),
        "dated_by": _("what decides the year of a death"),
        "population": _("what population means"),
        "population_date": _("the date of the population"),
        "source": _("where the counts come from"),
        "vintage": _("which estimate of the population"),
    }[key]


def by_cause(places: int) -> Sentence:
    """That deaths by cause moved; empty where none did."""
    if not places:
        return ()
    return phrase(
        n_(
            "Deaths by cause are others in one area, sex and year.",
            "Deaths by cause are others in {count} areas, sexes and years.",
            places,
            count=whole(places),
        )
    )


def breaks(count: int) -> Sentence:
    if not count:
        return ()
    return phrase(
        n_(
            "One dated break or year of shock is new, gone or told otherwise.",
            "{count} dated breaks and years of shock are new, gone or told otherwise.",
            count,
        )
    )
