"""What is said of gaps to a benchmark: only of those that chance alone would hardly show."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from engine.estimates import Estimate
from server.sentences import names
from server.sentences.movements import bracketed, has_interval, years
from server.sentences.numbers import NO_BREAK, interval, number, whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_

NAMED = 3  # gaps named in the answer
DAYS = 365.25


@dataclass(frozen=True, slots=True)
class Gap:
    """One clear gap, in words."""

    ages: str
    cause: str  # label; empty: all causes
    gain: Estimate  # of life expectancy, years


def days(value: float) -> str:
    """A gain in days.

    >>> days(0.1).replace(NO_BREAK, " "), days(1 / 365.25).replace(NO_BREAK, " ")
    ('37 days', '1 day')
    """
    count = round(DAYS * value)
    return n_("{count}\N{NO-BREAK SPACE}day", "{count}\N{NO-BREAK SPACE}days", count)


def place(ages: str, cause: str) -> str:
    """Ages and cause, inside a sentence.

    >>> place("45–49", ""), place("45–49", "Heart disease")
    ('ages 45–49', 'ages 45–49, heart disease')
    """
    if not cause:
        return _("ages {ages}", ages=ages)
    return _("ages {ages}, {cause}", ages=ages, cause=names.inside(cause))


@dataclass(frozen=True, slots=True)
class Together:
    """All gaps at once, and what chance alone shows of them among areas that are alike, years."""

    total: float
    alike: float
    most: float  # below which it stays in 95 of 100

    @property
    def clear(self) -> bool:
        """Whether chance alone would hardly show so much."""
        return self.total > self.most


def answer(who: str, period: str, clear: Sequence[Gap], of: Together) -> Sentence:
    """The page's first line: where closing the gap adds most, if any gap is clear."""
    if not clear:
        text = (
            _(
                "No single gap between {who} in {year} and the benchmark is clear, but together"
                " they are: closing all would add {total}, where chance alone shows {alike} among"
                " areas that are alike, and seldom more than {most}."
            )
            if of.clear
            else _(
                "No gap between {who} in {year} and the benchmark is clear: closing all there are"
                " would add {total}, where chance alone shows {alike} among areas that are alike."
            )
        )
        return phrase(
            text,
            who=who,
            year=period,
            total=years(of.total, 2),
            alike=years(of.alike, 2),
            most=years(of.most, 2),
        )
    first = clear[0]
    parts: dict[str, Piece | str] = {
        "who": who,
        "year": period,
        "place": place(first.ages, first.cause),
        "gain": days(float(first.gain.value)),
        "interval": _limits(first.gain),
    }
    if len(clear) == 1:
        return phrase(
            _(
                "Closing the gap to the benchmark adds most for {who} in {year} at {place}: {gain}"
                " of life expectancy {interval}. No other gap is clear."
            ),
            **parts,
        )
    others = [
        _("{place} ({gain})", place=place(one.ages, one.cause), gain=days(float(one.gain.value)))
        for one in clear[1:NAMED]
    ]
    return phrase(
        _(
            "Closing the gap to the benchmark adds most for {who} in {year} at {place}: {gain} of"
            " life expectancy {interval}, then at {others}."
        ),
        **parts,
        others=names.listed(others),
    )


def _limits(gain: Estimate) -> Piece:
    if not has_interval(gain):
        return bracketed(_("chance not known"))
    low, high = (DAYS * float(end) for end in (gain.low, gain.high))
    return bracketed(interval(low, high, 0))


def no_answer(who: str, period: str, why: str) -> Sentence:
    return phrase(
        _("{who} in {year}: no gap to a benchmark can be given. {why}"),
        who=names.first_capital(who),
        year=period,
        why=why,
    )


def no_benchmark(least: str) -> str:
    return _(
        "No area without parts has {least} person-years in the years around it, from which a"
        " benchmark could be made; choose a smaller size.",
        least=whole(float(least)),
    )


def all_together(of: Together, largest: float) -> Sentence:
    """What closing every gap would add, beside what chance alone would show."""
    if not math.isfinite(of.total):
        return ()
    return phrase(
        _(
            "All gaps together, clear or not, come to {total}; among areas that are alike chance"
            " alone would show {alike}, and the largest single gap stays below {largest} in 95 of"
            " 100 cases."
        ),
        total=years(of.total, 2),
        alike=years(of.alike, 2),
        largest=days(largest),
    )


def unevenness(value: float, low: float, high: float) -> Sentence:
    """What closing the clear gaps makes of H, in thousandths."""
    if not all(math.isfinite(one) for one in (value, low, high)):
        return ()
    least, most = sorted((abs(low), abs(high)))
    parts: dict[str, Piece | str] = {
        "value": number(abs(value), 1),
        "interval": bracketed(interval(least, most, 1)),
    }
    if low <= 0 <= high:
        return phrase(_("What this would make of relative unevenness (H) is not clear."))
    text = (
        _(
            "With that gap closed length of life would be more even: H lower by {value}"
            " thousandths {interval}."
        )
        if value < 0
        else _(
            "With that gap closed length of life would be less even: H higher by {value}"
            " thousandths {interval}."
        )
    )
    return phrase(text, **parts)


def benchmark(areas: Sequence[str], years_: Sequence[str], least: str, candidates: int) -> Sentence:
    """What the area is set against, and how that was chosen."""
    return phrase(
        _(
            "The benchmark is {areas} in the same year: of {count} areas with at least {least}"
            " person-years and ages as fine, the longest-lived third in {years}, years other"
            " than this one, so that chance in the year itself had no part in the choice."
        ),
        areas=_("{areas} together", areas=names.listed(list(areas), most=8))
        if len(areas) > 1
        else names.listed(list(areas)),
        count=str(candidates),
        least=whole(float(least)),
        years=_span(years_),
    )


def _span(years_: Sequence[str]) -> str:
    if not years_:
        return _("no year")
    return _("{first} to {last}", first=years_[0], last=years_[-1])


def member() -> tuple[str, str]:
    return _("Own benchmark"), _(
        "The area is one of those the benchmark is made of, so that its gaps to it are small; what"
        " is clear is judged against the others."
    )


def finding(clear: int) -> str:
    """Over the picture of gaps."""
    if not clear:
        return _("No gap is clear: bars in grey may be chance alone")
    return n_(
        "One gap is clear; bars in grey may be chance alone",
        "{count} gaps are clear; bars in grey may be chance alone",
        clear,
    )


def clear_word(clear: bool) -> str:
    return _("clear") if clear else _("not clear")


def arithmetic() -> tuple[str, str]:
    return _("Arithmetic"), _(
        "A gap says where death rates lie above those of areas that live longest, not why, and not"
        " that it could be closed: people and places differ in more than their death rates."
    )


def chance() -> tuple[str, str]:
    return _("Many gaps"), _(
        "Among many gaps some are large by chance. A gap is called clear where it would be so large"
        " by chance in one of the areas’ gaps together in fewer than 5 of 100 years; one that is"
        " not may still be real."
    )


def computed(compared: int, cells: int) -> tuple[Sentence, ...]:
    def named(name: str, sentence: str) -> Sentence:
        return phrase("{name} {sentence}", name=Piece(name, emphasis="strong"), sentence=sentence)

    return (
        named(
            _("Gains."),
            _(
                "Each rate above the benchmark’s is brought down to it, all others as they are, and"
                " the whole table made anew; a rate that lies below stays. Ages are in groups of at"
                " least five years."
            ),
        ),
        named(
            _("Clear."),
            _(
                "The chance of so many deaths, were the rates those of the benchmark, is that of a"
                " binomial count (Przyborowski and Wilenski, 1940); of the {tests} gaps of {areas}"
                " areas those are named that hold with {level} % for all together (Holm, 1979).",
                tests=whole(compared * cells),
                areas=compared,
                level=95,
            ),
        ),
        named(
            _("If all were alike."),
            _(
                "With the death rates of all areas together in place of everybody’s own, deaths are"
                " drawn 400 times and gaps to the benchmark taken, to first order: their mean is"
                " what chance alone shows."
            ),
        ),
        named(
            _("Among the first five."),
            _(
                "The share of 400 draws about the deaths there were in which the gap is one of the"
                " five that add most."
            ),
        ),
    )


def percent(share: float) -> str:
    return f"{whole(100 * share)}{NO_BREAK}%"
