"""What is said of one area, sex and year: the answer, the change, and each picture's finding."""

import math
from collections.abc import Mapping

from engine.estimates import Estimate, Reason
from engine.indicators import INDICATORS
from server.sentences import names
from server.sentences.movements import (
    Movement,
    bracketed,
    has_interval,
    limits,
    movement,
    shown,
    size_limits,
    years,
)
from server.sentences.numbers import number, whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_

Estimates = Mapping[str, Estimate]


def known(estimates: Estimates, key: str) -> bool:
    """Whether an indicator has a value to speak of."""
    return math.isfinite(float(estimates[key].value))


def answer(
    sex: str, area: str, period: str, e0: Estimate, why_not: str, *, years_added: bool = False
) -> Sentence:
    """The page's first line; `why_not` says why there is no figure where there is none. `period`
    may be several years added up."""
    who = names.population_first(sex, area)
    unit = INDICATORS["e0"].unit
    if not math.isfinite(float(e0.value)):
        return phrase(
            _("{who} in {year}: no life expectancy can be given. {why}"),
            who=who,
            year=period,
            why=why_not,
        )
    value = f"{shown(e0, unit)}\N{NO-BREAK SPACE}{_('years of life')}"
    rates = _("death rates of those years") if years_added else _("death rates of that year")
    if not has_interval(e0):
        return phrase(
            _("{who} in {year} could expect {value} at the {rates}."),
            rates=rates,
            who=who,
            year=period,
            value=value,
        )
    return phrase(
        _("{who} in {year} could expect {value} {interval} at the {rates}."),
        rates=rates,
        who=who,
        year=period,
        value=value,
        interval=bracketed(limits(e0, unit)),
    )


def change(e0: Estimate, period: str) -> Sentence:
    """How life expectancy moved since the year before."""
    unit = INDICATORS["e0"].unit
    kind = movement(e0, unit)
    if kind is Movement.UNKNOWN:
        return phrase(_("What changed since {year} cannot be given."), year=period)
    amount = years(float(e0.value), unit.decimals)
    if kind is Movement.TOO_SMALL:
        return phrase(
            _("The change from {year} goes beyond chance, but is less than {least}."),
            year=period,
            least=years(10.0**-unit.decimals, unit.decimals),
        )
    if kind is Movement.NOT_CLEAR:
        return phrase(
            _("No clear change from {year}: {value} {interval}."),
            year=period,
            value=f"{shown(e0, unit, signed=True)}\N{NO-BREAK SPACE}{_('years')}",
            interval=bracketed(limits(e0, unit, signed=True)),
        )
    if kind is Movement.WITHOUT_INTERVAL:
        return phrase(
            _("It was {value} in {year}; how much of the change is chance is not known."),
            value=_("{amount} less", amount=amount)
            if e0.value > 0
            else _("{amount} more", amount=amount),
            year=period,
        )
    texts = {
        Movement.MORE: _("That is {amount} more than in {year} {interval}."),
        Movement.LESS: _("That is {amount} less than in {year} {interval}."),
        Movement.BARELY_MORE: _(
            "That is {amount} more than in {year} {interval}, hardly more than chance alone could"
            " do."
        ),
        Movement.BARELY_LESS: _(
            "That is {amount} less than in {year} {interval}, hardly more than chance alone could"
            " do."
        ),
    }
    return phrase(
        texts[kind], amount=amount, year=period, interval=bracketed(size_limits(e0, unit))
    )


def meanings(estimates: Estimates) -> Sentence:
    """The median, e-dagger and H in plain words; those undefined are left out."""
    said = []
    if known(estimates, "median"):
        said.append(_("Half would live past age {age}.", age=_value(estimates, "median")))
    if known(estimates, "edagger"):
        said.append(
            _(
                "A death at these rates costs {amount} of further life on average.",
                amount=years(float(estimates["edagger"].value)),
            )
        )
    if known(estimates, "H"):
        said.append(
            _(
                "Set against life expectancy that is an unevenness of length of life (H) of"
                " {value}: at 0 all would reach the same age, at 1 the risk of dying would be the"
                " same at every age.",
                value=_value(estimates, "H"),
            )
        )
    return phrase("{said}", said=" ".join(said)) if said else ()


def not_read(estimates: Estimates, *, open_age: int, reach: float, law: Piece) -> Sentence:
    """What a table that ends too early cannot tell, what that costs, and where a law helps out."""
    short = {
        "median": _("the median"),
        "mode": _("the most common age at death"),
        "edagger": _("the years lost per death (e-dagger)"),
        "H": _("the unevenness of length of life (H)"),
    }
    missing = [
        text
        for key, text in short.items()
        if int(estimates[key].reason) == Reason.OPEN_GROUP_TOO_LARGE
    ]
    if not missing:
        return ()
    return phrase(
        _(
            "{figures} cannot be read off a table that ends at {age}: {share} of those born would"
            " reach that age, and how long they live on is known only on average. With the settings"
            " {law} a law fitted to the ages below spreads them, marked as a model."
        ),
        figures=names.first_capital(names.listed(missing)),
        age=str(open_age),
        share=f"{whole(100 * reach)}\N{NO-BREAK SPACE}%",
        law=law,
    )


def about_table(open_age: int, *, modelled: bool) -> Sentence:
    """What the life table holds and what it stands behind."""
    text = (
        _(
            "Ages from 0 to {age} and over, the highest from a fitted law: the table behind the"
            " pictures above."
        )
        if modelled
        else _("Ages from 0 to {age} and over: the table behind the pictures above.")
    )
    return phrase(text, age=str(open_age))


def table_rows(who: str, period: str, rows: int) -> str:
    """The summary of the folded life table."""
    return _("Life table of {who}, {year} ({rows} rows)", who=who, year=period, rows=rows)


def _value(estimates: Estimates, key: str) -> str:
    return shown(estimates[key], INDICATORS[key].unit)


def survivors(sex: str, reach: Mapping[int, float], estimates: Estimates) -> str:
    """`reach`: age to share of births that reach it."""
    who = names.sex(sex)
    parts = [
        _("{count} would reach age {age}", count=whole(100 * share), age=age)
        for age, share in reach.items()
    ]
    if known(estimates, "median"):
        parts = [*parts[:1], _("half would live past age {age}", age=_value(estimates, "median"))]
    return _("Of a hundred {who}, {parts}", who=who, parts=names.listed(parts))


def deaths(estimates: Estimates) -> str:
    if known(estimates, "median") and known(estimates, "mode"):
        return _(
            "Half of the deaths fall after age {median}; the most common age at death is {mode}",
            median=_value(estimates, "median"),
            mode=_value(estimates, "mode"),
        )
    if known(estimates, "median"):
        return _("Half of the deaths fall after age {median}", median=_value(estimates, "median"))
    return _("Deaths by age, as far as the table goes")


def rates(lowest: str, empty: int, groups: int, estimates: Estimates, span: tuple[int, int]) -> str:
    """`lowest` are the ages with the lowest rate; in `empty` of the groups nobody died, where a
    lowest rate says nothing."""
    first = (
        n_(
            "In one of {groups} age groups nobody died",
            "In {count} of {groups} age groups nobody died",
            empty,
            groups=groups,
        )
        if empty
        else _("Death rates were lowest at ages {lowest}", lowest=lowest)
    )
    slope = estimates["ageing_rate"]
    if not known(estimates, "ageing_rate") or not slope.low > 0:
        return first  # where they may as well not rise, no time of doubling is given
    twice, short, long = (
        number(math.log(2) / float(part), 1) for part in (slope.value, slope.high, slope.low)
    )
    return _(
        "{first}; from age {start} death rates doubled every {years} years of age ({short} to"
        " {long})",
        first=first,
        start=span[0],
        years=twice,
        short=short,
        long=long,
    )


def rise(estimates: Estimates, span: tuple[int, int]) -> str:
    unit = INDICATORS["ageing_rate"].unit
    slope = estimates["ageing_rate"]
    if not known(estimates, "ageing_rate"):
        return _("Rise of death rates from age to age")
    value = f"{shown(slope, unit)}\N{NO-BREAK SPACE}%"
    if not has_interval(slope):
        return _(
            "From {start} to {end} death rates rise at {value} per year of age",
            start=span[0],
            end=span[1],
            value=value,
        )
    return _(
        "From {start} to {end} death rates rise at {value} per year of age ({interval})",
        start=span[0],
        end=span[1],
        value=value,
        interval=limits(slope, unit),
    )


def gain(ages: str, share: float) -> str:
    """`share` of the gain from lower death rates at all ages that lies in `ages`."""
    return _(
        "Lower death rates would add most at ages {ages}: {share} of what 1 % lower rates at all"
        " ages would add",
        ages=ages,
        share=f"{whole(100 * share)}\N{NO-BREAK SPACE}%",
    )


def births(sex: str, area: str, period: str, count: float) -> Sentence:
    """How many were born alive, as handed in; no figure of the page rests on it."""
    text = {
        "f": _("Live births of girls in {area} in {year}: {count}."),
        "m": _("Live births of boys in {area} in {year}: {count}."),
        "p": _("Live births in {area} in {year}: {count}."),
    }[sex]
    return phrase(text, area=area, year=period, count=whole(count))
