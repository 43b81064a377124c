"""How figures are made, as the registries state it."""

from engine.causes.number import CauseNumber
from engine.decomposition import NOT_DECOMPOSED
from engine.indicator import Indicator
from engine.settings import Settings
from server.sentences.numbers import number, whole
from server.sentences.text import _

Facts = tuple[tuple[str, str], ...]  # a word, and what holds


def indicator(one: Indicator) -> Facts:
    """What an indicator is, how it is calculated and who says so."""
    return (
        (_("Definition"), _(one.definition)),
        (_("Formula"), _(one.formula)),
        (_("Unit"), _(one.unit.label)),
        (_("Interval"), interval(one)),
        (_("Needs"), needs(one)),
        (_("Source"), _(one.source)),
    )


def interval(one: Indicator) -> str:
    """Whether it is smooth, what follows from it, and why it is not where it is not."""
    kind = one.unit.limits
    if kind == "count":
        return _(
            "Exact: a count, taken as Poisson, over births taken as known. {why}",
            why=_(one.why_not_smooth),
        )
    if one.key in NOT_DECOMPOSED:
        return _(
            "Not smooth, so by simulation, deaths drawn as Poisson; a difference is not shared out "
            "over ages. {why}",
            why=_(one.why_not_smooth),
        )
    if not one.smooth:
        return _(
            "Not smooth, so by simulation, deaths drawn as Poisson; the ages' shares of a "
            "difference by replacing the rates one by one. {why}",
            why=_(one.why_not_smooth),
        )
    ways = {
        "mixed": _("by the gamma laws of the deaths that raise it and of those that lower it"),
        "part": _("by the gamma law, within 0 and the whole"),
        "gamma": _("by the gamma law, exact where every death weighs the same"),
    }
    differences = (
        _("Two of them do not compare, so no difference is given.")
        if one.needs.whole
        else _("Differences are shared out over ages.")
    )
    return _(
        "Smooth: {way}, from its slope in every death rate, deaths taken as Poisson. {differences}",
        way=ways[kind],
        differences=differences,
    )


def cause_number(one: CauseNumber) -> Facts:
    """What a number by cause is, how it is calculated and who says so."""
    return (
        (_("Definition"), _(one.definition)),
        (_("Formula"), _(one.formula)),
        (_("Unit"), _(one.unit.label)),
        (
            _("Interval"),
            _(
                "From its slopes in the death rates of the cause and of all others, deaths under"
                " each cause taken as Poisson: by the gamma laws of those that raise it and of"
                " those that lower it."
            ),
        ),
        (
            _("Sum over causes"),
            _("The number of all causes.") if one.adds_up else _("They do not add up."),
        ),
        (_("Needs"), needs(one)),
        (_("Source"), _(one.source)),
    )


def needs(one: Indicator | CauseNumber) -> str:
    """What the counts must hold before it is given."""
    wants = one.needs
    parts = [_("enough person-years")]
    parts += [_("an age group that begins at {age}", age=age) for age in wants.ages if age]
    parts += [
        {
            "live": _("live births"),
            "stillborn": _("stillbirths"),
            "neonatal_deaths": _("deaths before 28 days"),
        }[name]
        for name in wants.births
    ]
    if wants.whole:
        parts.append(_("a larger area of which the area is part"))
    if wants.least_deaths:
        parts.append(_("at least {count} deaths", count=wants.least_deaths))
    if wants.open_small:
        parts.append(_("an open age group that few reach, or that a fitted law spreads"))
    if wants.open_deaths:
        parts.append(_("deaths in the open age group, or a fitted law"))
    if wants.span_deaths:
        parts.append(_("deaths within the span of ages of the settings"))
    return "; ".join(parts)


def settings(one: Settings) -> Facts:
    """The stages of a chain in order, and its limits."""
    stages = tuple((_(stage.name), _(stage.sentence)) for stage in one.stages)
    return (*stages, (_("Limits"), limits(one)))


def limits(one: Settings) -> str:
    """From how many person-years on a figure is given, and the like."""
    return _(
        "No figure below {least} person-years, a caution below {few}. The spread of ages at death "
        "is given where at most {share} % of those born reach the open age group. Intervals hold "
        "{level} % of what chance does; where they are simulated, from {draws} draws. The rise of "
        "death rates is read from {start} to {end}.",
        least=whole(one.least_exposure),
        few=whole(one.few_exposure),
        share=number(100 * one.open_share, 0),
        level=number(100 * one.level, 0),
        draws=whole(one.draws),
        start=one.ageing_span[0],
        end=one.ageing_span[1],
    )


def severity(of_check: str) -> str:
    """What a failed check means for the upload."""
    return {
        "error": _("must be put right"),
        "warning": _("wants a second look"),
    }[of_check]
