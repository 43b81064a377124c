"""What is said of the curves behind the death rates of one area, sex and year."""

import math
from collections.abc import Sequence

from server.sentences import names
from server.sentences.basis import Told, in_a_row
from server.sentences.numbers import interval, number
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_

Limits = tuple[float, float, float]  # a value and the limits of its interval


def question() -> str:
    """What the page asks, for links to it."""
    return _("Which curve lies behind the death rates?")


def answer(
    sex: str, area: str, period: str, law: str, first: int, *, misses: bool, rough: bool
) -> Sentence:
    """The page's first line: which law, and whether it holds, as far as so many deaths can tell."""
    if rough:
        text = _(
            "From age {first} the law of {law} comes nearest to the death rates of {who} in"
            " {year}; whether it misses something, so few deaths can hardly tell."
        )
    elif misses:
        text = _(
            "From age {first} the law of {law} comes nearest to the death rates of {who} in"
            " {year}, but misses more than chance would."
        )
    else:
        text = _(
            "From age {first} the law of {law} describes the death rates of {who} in {year}, within"
            " what chance can do."
        )
    return phrase(text, first=str(first), law=law, who=names.population(sex, area), year=period)


def no_answer(sex: str, area: str, period: str, why: str) -> Sentence:
    """Where no law stands: `why` may be empty."""
    text = _("No law could be fitted to the death rates of {who} in {year}.")
    said = phrase(text, who=names.population(sex, area), year=period)
    return (*said, Piece(f" {why}")) if why else said


def meaning(mode: Limits, slope: Limits, *, background: float, levels_off: bool) -> Sentence:
    """What the law's numbers say; `background` are its deaths per person-year at all ages alike, 0
    where it has none."""
    rise = _rising(slope, background=background, levels_off=levels_off)
    if not math.isfinite(mode[0]):
        return phrase(_("By it death rates {rise}."), rise=rise)
    return phrase(
        _("By it deaths gather about age {age} ({interval}), and death rates {rise}."),
        age=number(mode[0], 1),
        interval=interval(*mode[1:], 1),
        rise=rise,
    )


def _rising(slope: Limits, *, background: float, levels_off: bool) -> str:
    percent, low, high = (100 * part for part in slope)
    rise = _(
        "rise at {percent} % ({interval}) per year of age",
        percent=number(percent, 1),
        interval=interval(low, high, 1),
    )
    if background > 0:
        return _(
            "{rise}, beside {count} per 100,000 at all ages alike",
            rise=rise,
            count=number(100_000 * background, 1),
        )
    if levels_off:
        return _("{rise}, more slowly where they are high", rise=rise)
    return rise


def fitness(deviance: float, bound: float, free: int, *, misses: bool, rough: bool) -> Sentence:
    """How far the law is from the counts, against what chance does."""
    text = (
        _(
            "The counts lie farther from it than chance brings them: deviance {deviance} with"
            " {free}, where chance seldom goes above {bound}."
        )
        if misses
        else _(
            "The counts lie as near to it as chance lets them: deviance {deviance} with {free},"
            " where chance seldom goes above {bound}."
        )
    )
    groups = n_(
        "one age group more than parameters", "{count} age groups more than parameters", free
    )
    said = phrase(text, deviance=number(deviance, 1), free=groups, bound=number(bound, 1))
    if not rough:
        return said
    return (*said, Piece(" " + _("With so few deaths in many age groups this is rough.")))


def rivals(law: str, others: Sequence[tuple[str, float]]) -> Sentence:
    """Which law has the least AIC, and the laws that do hardly less well: name, and how much more
    their AIC is."""
    least = _(
        "By AIC, which sets closeness against the number of parameters, the law of {law} describes"
        " the rates best.",
        law=law,
    )
    if not others:
        return phrase(_("{least} The other laws do clearly less well."), least=least)
    listed = names.listed(
        [_("{law} ({more} more)", law=name, more=number(more, 1)) for name, more in others]
    )
    return phrase(
        _("{least} Hardly to be told from it by their fit: {others}."), least=least, others=listed
    )


def beside(law: str, outside: Sequence[int], first: int, last: int) -> str:
    """Whether the law keeps within the band of the smooth curve; `outside` are the ages at which it
    does not."""
    if not outside:
        return _(
            "The law of {law} keeps within the band of the smooth curve from age {first} to {last}",
            law=law,
            first=first,
            last=last,
        )
    return _(
        "The law of {law} leaves the band of the smooth curve at ages {ages}",
        law=law,
        ages=names.listed(_runs(outside), most=4),
    )


def _runs(ages: Sequence[int]) -> list[str]:
    """Neighbouring ages as one: 40–43.

    >>> _runs([40, 41, 42, 60])
    ['40–42', '60']
    """
    firsts = [age for age in ages if age - 1 not in ages]
    lasts = [age for age in ages if age + 1 not in ages]
    return [
        f"{first}–{last}" if last > first else f"{first}"
        for first, last in zip(firsts, lasts, strict=True)
    ]


def rates_alone() -> str:
    return _("Death rates by age")


def smooth_alone() -> str:
    return _("Death rates by age and the smooth curve through them")


def farthest(ages: str, deaths: float, *, clear: bool) -> str:
    """The age group farthest from the law: how many more deaths it has (below 0: fewer); `clear`
    where it lies beyond what chance does in any of so many groups."""
    if not clear:
        return _("No age group lies farther from the law than chance brings one of so many")
    count = number(abs(deaths), 0)
    if deaths > 0:
        return _(
            "Farthest from the law: age {ages}, with {count} deaths more than it expects",
            ages=ages,
            count=count,
        )
    return _(
        "Farthest from the law: age {ages}, with {count} deaths fewer than it expects",
        ages=ages,
        count=count,
    )


def related(area: str, median: float, level: Limits, shape: Limits) -> Sentence:
    """Level and shape against the table of a larger area, as far as they are clear."""
    values: dict[str, Piece | str] = {
        "area": area,
        "level": number(level[0], 3, signed=True),
        "by": Piece(interval(*level[1:], 3, signed=True), emphasis="interval"),
        "shape": number(shape[0], 3),
        "within": Piece(interval(*shape[1:], 3), emphasis="interval"),
        "age": _about(median),
    }
    return phrase(_relation_text(_side(level, 0.0), _side(shape, 1.0)), **values)


def _about(median: float) -> str:
    if not math.isfinite(median):
        return _("the age that half would reach there")
    return _("age {age}, which half would reach there", age=number(median, 0))


def _side(limits: Limits, middle: float) -> int:
    """Below, above, or 0 where the interval holds the middle."""
    return -1 if limits[2] < middle else 1 if limits[1] > middle else 0


def _relation_text(level: int, shape: int) -> str:
    """By the sides of level and shape on which their intervals lie."""
    return {
        (-1, 0): _(
            "Against {area} death rates are lower at all ages alike (level {level}, {by}); that"
            " they rise faster or slower with age is not clear (shape {shape}, {within})."
        ),
        (1, 0): _(
            "Against {area} death rates are higher at all ages alike (level {level}, {by}); that"
            " they rise faster or slower with age is not clear (shape {shape}, {within})."
        ),
        (0, 0): _(
            "Against {area} no clear difference: neither in level ({level}, {by}) nor in shape"
            " ({shape}, {within})."
        ),
        (-1, 1): _(
            "Against {area} more live to {age} (level {level}, {by}), and death rates rise"
            " faster with age (shape {shape}, {within}): the advantage is largest at young ages."
        ),
        (-1, -1): _(
            "Against {area} more live to {age} (level {level}, {by}), but death rates rise more"
            " slowly with age (shape {shape}, {within}): the advantage is largest at old ages."
        ),
        (1, 1): _(
            "Against {area} fewer live to {age} (level {level}, {by}), and death rates rise"
            " faster with age (shape {shape}, {within}): the disadvantage is largest at old"
            " ages."
        ),
        (1, -1): _(
            "Against {area} fewer live to {age} (level {level}, {by}), and death rates rise more"
            " slowly with age (shape {shape}, {within}): the disadvantage is largest at young"
            " ages."
        ),
        (0, 1): _(
            "Against {area} about as many live to {age} (level {level}, {by}), but death rates"
            " rise faster with age (shape {shape}, {within}): lower before it and higher after"
            " it."
        ),
        (0, -1): _(
            "Against {area} about as many live to {age} (level {level}, {by}), but death rates"
            " rise more slowly with age (shape {shape}, {within}): higher before it and lower"
            " after it."
        ),
    }[level, shape]


def poorly_related(area: str) -> Sentence:
    """Level and shape do not make the one table into the other."""
    return phrase(
        _(
            "Level and shape do not say all: even so bent, the table of {area} misses these deaths"
            " by more than chance would."
        ),
        area=area,
    )


def single(groups: str) -> Sentence:
    return phrase(
        _(
            "The counts come in age groups ({groups}). What single years they may hold is worked"
            " out two ways; neither is a count."
        ),
        groups=groups,
    )


def description() -> Told:
    """What a law is not."""
    return _("Law"), _(
        "A law describes the rates in few numbers. It says neither why they are so nor how they"
        " will change, and beyond the ages it was fitted to it is a guess."
    )


def further(life: Piece, others: Sequence[Piece], whole_area: Piece | None) -> tuple[Sentence, ...]:
    """Back to the life table, and to the curves of others."""
    links = [phrase(_("How long do people live here? {life}."), life=life)]
    if others:
        links.append((*phrase(_("The same curves for ")), *in_a_row(others), Piece(".")))
    if whole_area:
        links.append(phrase(_("What makes the difference? {compared}."), compared=whole_area))
    return tuple(links)
