"""What is said of causes of death: of which people die, at which ages, and how that is counted.

No sentence says that a cause did or would do anything, and none ranks people or places by it.
"""

import math
from collections.abc import Iterable, Sequence
from dataclasses import replace

from engine.estimates import Estimate
from engine.indicator import Unit
from engine.indicators import INDICATORS
from server.sentences import names
from server.sentences.movements import bracketed, has_interval, limits, shown
from server.sentences.numbers import NO_BREAK, number, whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_

YEARS = INDICATORS["e0"].unit
FINER = replace(YEARS, decimals=2)  # where causes are many and each is small
PERCENT = Unit("percent", "%", 100, 0)


Part = tuple[str, Estimate]  # a cause in words, and its number


def answer(
    sex: str,
    area: str,
    period: str,
    total: Estimate,
    parts: Sequence[Part],
    deaths: float,
    *,
    unit: Unit = YEARS,
) -> Sentence:
    """The page's first line. `total` are the years lost per death, of which `parts` are those of
    the causes that cost most; where it has no value, the parts are shares of all deaths."""
    if not parts:
        return phrase(
            _("{who} in {year}: no death has a stated cause."),
            who=names.population_first(sex, area),
            year=period,
        )
    if not math.isfinite(float(total.value)):
        start = phrase(
            _("Of the {deaths} deaths of {who} in {year}, "),
            deaths=whole(deaths),
            who=names.population(sex, area),
            year=period,
        )
        texts = _("{amount} were of {cause}"), _("{amount} of {cause}")
        return start + _parts(parts, PERCENT, f"{NO_BREAK}%", texts)
    start = phrase(
        _("Of the {years} years lost per death of {who} in {year}, "),
        years=shown(total, unit),
        who=names.population(sex, area),
        year=period,
    )
    texts = _("{amount} go with {cause}"), _("{amount} with {cause}")
    return start + _parts(parts, unit, "", texts)


def _parts(parts: Sequence[Part], unit: Unit, sign: str, texts: tuple[str, str]) -> Sentence:
    """The amounts of the causes in a row, the first in a text of its own."""
    said: list[Piece] = []
    for at, (name, part) in enumerate(parts):
        joined = "" if at == 0 else _(" and ") if at == len(parts) - 1 else ", "
        amount: list[Piece] = [Piece(shown(part, unit) + sign)]
        if has_interval(part):
            amount += [Piece(" "), bracketed(limits(part, unit))]
        said.append(Piece(joined))
        for piece in phrase(texts[at > 0], amount="\0", cause=names.inside(name)):
            said += amount if piece.text == "\0" else [piece]
    return tuple(piece for piece in (*said, Piece(".")) if piece.text)


def meaning(e0: Estimate) -> Sentence:
    """What years lost per death are, in plain words."""
    return phrase(
        _(
            "Years lost per death are those that people who die at each age would have had left on"
            " average at the death rates of the year, at which life expectancy at birth is {e0}."
            " Causes and ages add up to them."
        ),
        e0=f"{shown(e0, YEARS)}{NO_BREAK}{_('years')}",
    )


def external(labels: Iterable[str]) -> Sentence:
    """What external causes are, where these labels name them: not a word of every day."""
    if _("External causes") not in labels:
        return ()
    return phrase(_("External causes are injuries and poisonings, by accident or by intent."))


def not_read(why: str, law: Piece) -> Sentence:
    """Why years lost per death are not known, and with which settings a law spreads them."""
    return phrase(
        _(
            "Years lost per death are not given: {why} With the settings {law} a law fitted to the"
            " ages below spreads the deaths of the highest ages."
        ),
        why=why,
        law=law,
    )


def most_deaths(name: str, share: Estimate, deaths: float) -> Sentence:
    """Which cause has most deaths, which need not cost most years."""
    return phrase(
        _("By deaths alone, those of {cause} are the most: {share} of {deaths} {interval}."),
        cause=names.inside(name),
        share=f"{shown(share, PERCENT)}{NO_BREAK}%",
        deaths=whole(deaths),
        interval=bracketed(limits(share, PERCENT) + f"{NO_BREAK}%") if has_interval(share) else "",
    )


def gain(name: str, gained: Estimate, unit: Unit = YEARS) -> Sentence:
    """How much longer life would be without a cause: arithmetic, not a promise."""
    return phrase(
        _(
            "Were nobody to die of {cause}, and all else as it is, life expectancy would read"
            " {years} longer {interval}. Such gains of several causes do not add up."
        ),
        cause=names.inside(name),
        years=f"{shown(gained, unit)}{NO_BREAK}{_('years')}",
        interval=bracketed(limits(gained, unit)) if has_interval(gained) else "",
    )


def ranked(total: Estimate, first: Part | None, unit: Unit = YEARS) -> str:
    """The finding of the picture of causes."""
    if first is None or not math.isfinite(float(total.value)):
        return _("Deaths by cause")
    name, part = first
    return _(
        "{cause}: {part} of {total} years lost per death",
        cause=name,
        part=shown(part, unit),
        total=shown(total, unit),
    )


def ages(name: str, low: str, high: str, share: float) -> str:
    """The finding of the picture by age: the ages between which most of a cause's years lie."""
    return _(
        "{cause}: {share} of its years lost go with deaths at ages {low} to {high}",
        cause=name,
        share=f"{whole(100 * share)}{NO_BREAK}%",
        low=low,
        high=high,
    )


def course(name: str, first: str, then: float, last: str, now: float, *, parted: bool) -> str:
    """The finding of the picture through the years; nothing is measured across a break."""
    if parted:
        return _(
            "{cause}: {now} per 100,000 in {last}; a break parts its years",
            cause=name,
            now=number(now, 1),
            last=last,
        )
    return _(
        "{cause}: {then} per 100,000 in {first}, {now} in {last}",
        cause=name,
        then=number(then, 1),
        first=first,
        now=number(now, 1),
        last=last,
    )


def coding(breaks: Sequence[str], bridged: Sequence[tuple[str, float]]) -> Sentence:
    """What the years of the picture can and cannot be compared over."""
    said = []
    if breaks:
        said.append(
            n_(
                "From {years} on counts are made otherwise: the line begins anew, and no change"
                " is measured across.",
                "From {years} on counts are made otherwise: the line begins anew each time, and"
                " no change is measured across.",
                len(breaks),
                years=names.listed(list(breaks)),
            )
        )
    said += [
        _(
            "Years before {year} are counted as the coding from then on would have them, by the"
            " comparability ratio {ratio}.",
            year=year,
            ratio=number(ratio, 3),
        )
        for year, ratio in bridged
    ]
    return phrase("{said}", said=" ".join(said)) if said else ()


def premature(deaths: float, of: float, chance: Estimate) -> Sentence:
    """How many of the deaths fell before 75, and what that is as a chance."""
    unit = INDICATORS["l65"].unit
    said = phrase(
        _("Of {of} deaths {deaths} fell before age 75, {share}"),
        of=whole(of),
        deaths=whole(deaths),
        share=f"{whole(100 * deaths / of) if of else '0'}{NO_BREAK}%",
    )
    if not math.isfinite(float(chance.value)):
        return (*said, Piece("."))
    if not has_interval(chance):
        return said + phrase(
            _("; of a hundred born {chance} would die before 75 at the death rates of the year."),
            chance=shown(chance, unit),
        )
    return said + phrase(
        _(
            "; of a hundred born {chance} {interval} would die before 75 at the death rates of the"
            " year."
        ),
        chance=shown(chance, unit),
        interval=bracketed(limits(chance, unit)),
    )


def avoidable(causes: Sequence[str], deaths: float, rate: Estimate) -> Sentence:
    """Deaths before 75 of the causes that the reader counts as avoidable."""
    unit = INDICATORS["asr_esp2013"].unit
    text = phrase(
        _("Counted as avoidable by this address: {causes}. Before 75 they have {deaths} deaths"),
        causes=names.listed([names.inside(one) for one in causes]),
        deaths=whole(deaths),
    )
    if not math.isfinite(float(rate.value)):
        return (*text, Piece("."))
    return text + phrase(
        _(", {rate} per 100,000 at the ages of the European Standard Population {interval}."),
        rate=shown(rate, unit),
        interval=bracketed(limits(rate, unit)),
    )


def no_avoidable() -> Sentence:
    """Why no list of avoidable causes is built in."""
    return phrase(
        _(
            "Which deaths could be avoided is a matter of a list. Published ones (such as that of"
            " the OECD and Eurostat) go by codes that a short cause list does not keep apart, so"
            " none is built in: choose the causes to be counted, and the address says which."
        )
    )


def official() -> Sentence:
    """What the figures of targets are not."""
    return phrase(
        _(
            "Computed here from the counts of this edition, not the official series: those go by"
            " estimates of their own, with deaths of unknown cause shared out."
        )
    )


def mixed(causes: Sequence[str]) -> str:
    """Why a target has no figure."""
    if not causes:
        return _("The cause list has no cause of these codes.")
    return _(
        "The cause list does not keep these codes apart: {causes} hold others besides.",
        causes=names.listed(list(causes), most=4),
    )


def question() -> str:
    """The page as a link names it."""
    return _("Of what people die here")
