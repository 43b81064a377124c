"""How figures were computed, what cautions they carry and where to go on: said on several pages.

A caution is (word, text), or None where there is nothing to warn of.
"""

from collections.abc import Sequence

from engine.indicators import Indicator
from engine.settings import Settings
from engine.standardisation import FEW_DEATHS, Used
from server.sentences.names import listed
from server.sentences.numbers import whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reasons import caution
from server.sentences.text import _, n_

Told = tuple[str, str] | None


def stages(settings: Settings) -> tuple[Sentence, ...]:
    """The chain that turns counts into figures."""
    return tuple(
        phrase(
            "{name} {sentence}",
            name=Piece(f"{_(stage.name)}.", emphasis="strong"),
            sentence=_(stage.sentence),
        )
        for stage in settings.stages
    )


def computed(settings: Settings) -> tuple[Sentence, ...]:
    """The chain of stages, and how the intervals come about."""
    level = whole(100 * settings.level)
    intervals = phrase(
        "{name}. {sentence} {methods}.",
        name=Piece(_("Intervals"), emphasis="strong"),
        sentence=_(
            "With {level} % they cover what chance in the number of deaths can do, deaths taken as"
            " Poisson: by the delta method, and by {draws} simulated tables for figures that jump,"
            " such as the most common age.",
            level=level,
            draws=settings.draws,
        ),
        methods=Piece(_("All methods and sources"), "/methods"),
    )
    return (*stages(settings), intervals)


def provisional(periods: Sequence[str]) -> Told:
    if not periods:
        return None
    return _("Provisional"), n_(
        "{years} is provisional in this edition: deaths reported late may still move its figures.",
        "{years} are provisional in this edition: deaths reported late may still move their"
        " figures.",
        len(periods),
        years=listed(sorted(periods)),
    )


def standard(of: Used | None) -> Sentence:
    """Whose ages weigh a standardised rate, and on what groups."""
    if of is None:
        return ()
    return phrase(
        _(
            "Weighted by the ages of the {standard}, in {groups} age groups, the last {top}, so"
            " that older and younger populations compare."
        ),
        standard=_(of.standard),
        groups=str(of.groups),
        top=of.top,
    )


def few_deaths(deaths: float, who: str) -> Told:
    """A flag on standardised rates that rest on few deaths."""
    return _("Few deaths"), _(
        "The standardised death rates of {who} rest on {deaths} deaths; below {bound} chance moves"
        " them a good deal.",
        who=who,
        deaths=whole(deaths),
        bound=FEW_DEATHS,
    )


def estimated(who: Sequence[str]) -> Told:
    """That counts were not counted so, but shared out or worked out."""
    if not who:
        return None
    return _("Estimated"), _(
        "The counts of {who} are estimated: shared out from larger areas by stated shares, or"
        " worked out from rates. Their intervals cover chance in the deaths as they were counted,"
        " and no error of the shares.",
        who=listed(who, most=8),
    )


def few_person_years(lived: float, settings: Settings, who: str = "") -> Told:
    """A flag, below the settings' bound, on figures that chance moves a good deal; `who` they are
    of, where a page has several."""
    if not lived < settings.few_exposure:
        return None
    rest = (
        _("The figures of {who} rest on {years} person-years.", who=who, years=whole(lived))
        if who
        else _("These figures rest on {years} person-years.", years=whole(lived))
    )
    return _("Few people"), _(
        "{rest} Below {bound} they jump from year to year by chance; read the intervals, not the"
        " figures alone.",
        rest=rest,
        bound=whole(settings.few_exposure),
    )


def pooled(settings: Settings) -> Told:
    """Of points in time: that each stands for several years."""
    if settings.years == 1:
        return None
    return _("Years added up"), _(
        "A figure stands for the year named and the {count} before it, whose deaths and"
        " person-years are added up: what happens in one year is spread over {all}.",
        count=settings.years - 1,
        all=settings.years,
    )


def safe_side(indicator: Indicator, lived: float) -> Told:
    """That intervals of a population so small are wider than their level asks for."""
    said = caution(indicator, lived)
    return (_("Wide intervals"), said) if said else None


def smoothed(settings: Settings) -> Told:
    if settings.smoothing == "none":
        return None
    return _("Smoothed"), _(
        "The death rates are those of an even curve drawn through the counts; a true bend may be"
        " smoothed away."
    )


def no_deaths(ages: Sequence[str], *, drawn: bool = False, rounded: bool = False) -> Told:
    """That nobody died at some ages; `drawn`: a smooth curve gives rates there all the same;
    `rounded`: some may have, since counts are rounded."""
    if not ages:
        return None
    if rounded:
        return _("No deaths"), _(
            "Counts at ages {ages} are rounded to nil, so that few or none died there: their rates"
            " are given as nil, which a ratio scale cannot show.",
            ages=listed(ages, most=12),
        )
    if drawn:
        return _("No deaths"), _(
            "Nobody died at ages {ages}: a rate above 0 there is the smooth curve’s.",
            ages=listed(ages, most=12),
        )
    return _("No deaths"), _(
        "Nobody died at ages {ages}: the rates there are nil, which a ratio scale cannot show.",
        ages=listed(ages, most=12),
    )


def joined(ages: Sequence[str]) -> Told:
    if not ages:
        return None
    return _("Joined ages"), _(
        "Nobody was counted at some of the ages {ages}: neighbours among them share one rate.",
        ages=listed(ages, most=12),
    )


def regrouped(period: str) -> Told:
    return _("Age groups"), _(
        "{year} was counted in other age groups; the change is taken on those that both have.",
        year=period,
    )


def borrowed(age: int, whole: str) -> Told:
    """That nobody died in the open age group, and another area's rate stands there."""
    return _("Borrowed rate"), _(
        "Nobody died at {age} and over: the death rate there is that of {whole}, taken as known.",
        age=age,
        whole=whole,
    )


def early_end(age: int) -> Told:
    """That the open age group begins at an age where closing it is a coarse guess."""
    return _("Early end"), _(
        "The ages end at {age} and over, and how long those who reach it live on is read off their"
        " death rate alone: life expectancy may be out by more than its interval says.",
        age=age,
    )


def law(settings: Settings, open_age: int) -> Told:
    return _("Model"), _(
        "Above {age} a law fitted from age {first} stands in for the counts; what is read there is"
        " the law’s.",
        age=open_age,
        first=settings.fit_from,
    )


def reading(settings: Settings) -> tuple[Told, ...]:
    """What every figure read off a life table is, and is not."""
    return (
        (
            _("Reading"),
            _(
                "Life expectancy sums up one year’s death rates. It is no forecast of how long"
                " anyone will live."
            )
            if settings.years == 1
            else _(
                "Life expectancy sums up the death rates of {count} years taken together. It is no"
                " forecast of how long anyone will live.",
                count=settings.years,
            ),
        ),
        chance(),
    )


def chance() -> Told:
    """What intervals leave out."""
    return (
        _("Chance"),
        _(
            "The intervals cover chance in the number of deaths only, not errors in counting"
            " deaths or people."
        ),
    )


def further(comparisons: Sequence[Piece], years: Piece) -> tuple[Sentence, ...]:
    """Links to comparisons and to the trend."""
    trend = phrase(_("Which way is it going? {years}."), years=years)
    if not comparisons:
        return (trend,)
    return (
        (*phrase(_("What makes the difference? Compare it ")), *in_a_row(comparisons), Piece(".")),
        trend,
    )


def in_a_row(links: Sequence[Piece]) -> Sentence:
    """Links with commas between them."""
    parts: list[Piece] = []
    for at, link in enumerate(links):
        parts += [Piece(", ")] if at else []
        parts.append(link)
    return tuple(parts)
