"""What is said of an indicator through the years."""

from dataclasses import dataclass

from engine.estimates import Estimate
from engine.indicators import Indicator
from engine.standardisation import FEW_DEATHS
from server.sentences import names
from server.sentences.basis import in_a_row
from server.sentences.movements import (
    Movement,
    bracketed,
    has_interval,
    limits,
    movement,
    shown,
    size_limits,
    with_unit,
    years,
)
from server.sentences.numbers import number
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _

CLEAR = (Movement.MORE, Movement.LESS, Movement.BARELY_MORE, Movement.BARELY_LESS)


@dataclass(frozen=True, slots=True)
class Course:
    """One line: who, between which years, and by how much it changed."""

    indicator: Indicator
    sex: str
    area: str  # its name
    first: str
    last: str
    at_first: Estimate
    at_last: Estimate
    change: Estimate
    middle: str  # "" where the run is too short to be parted
    earlier: Estimate
    later: Estimate

    @property
    def kind(self) -> Movement:
        return movement(self.change, self.indicator.unit)

    @property
    def who(self) -> str:
        return names.population(self.sex, self.area)

    def size(self, change: Estimate) -> str:
        """How large a change was, with its unit and without its sign."""
        unit = self.indicator.unit
        if unit.key == "years":
            return years(float(change.value), unit.decimals)
        return with_unit(number(abs(unit.scale * float(change.value)), unit.decimals), unit)

    def signed(self, change: Estimate) -> str:
        """A change with its sign and its unit."""
        unit = self.indicator.unit
        return with_unit(shown(change, unit, signed=True), unit)


def answer(course: Course | None, label: str, who: str) -> Sentence:
    """The first line of the page, on its first series; None where it has fewer than two values."""
    if course is None:
        return phrase(
            _(
                "{label} among {who} cannot be followed through these years: fewer than two of them"
                " have a figure."
            ),
            label=label,
            who=who,
        )
    unit = course.indicator.unit
    if course.indicator.needs.whole:
        return _beside_the_whole(course)
    parts: dict[str, Piece | str] = {
        "first": course.first,
        "last": course.last,
        "who": names.population_first(course.sex, course.area),
        "label": names.inside(label),
    }
    if course.kind is Movement.WITHOUT_INTERVAL:
        return phrase(
            _(
                "{Label} among {who}: {here} in {last}, {there} in {first}; how much of that is"
                " chance is not known."
            ),
            Label=label,
            here=shown(course.at_last, unit),
            there=shown(course.at_first, unit),
            **{**parts, "who": course.who},
        )
    if course.kind not in CLEAR:
        return phrase(
            _(
                "No clear change in {label} among {who} between {first} and {last}:"
                " {value} {interval}."
            ),
            value=course.signed(course.change),
            interval=bracketed(limits(course.change, unit, signed=True)),
            **{**parts, "who": course.who},
        )
    interval = size_limits(course.change, unit)
    if course.kind in (Movement.BARELY_MORE, Movement.BARELY_LESS):
        interval = _("{interval}, hardly more than chance alone could do", interval=interval)
    parts |= {"amount": course.size(course.change), "interval": bracketed(interval)}
    if course.indicator.label.startswith("Life expectancy"):
        text = (
            _("{who} gained {amount} of {label} between {first} and {last} {interval}.")
            if course.change.value > 0
            else _("{who} lost {amount} of {label} between {first} and {last} {interval}.")
        )
        return phrase(text, **parts)
    text = (
        _("{Label} among {who} rose by {amount} between {first} and {last} {interval}.")
        if course.change.value > 0
        else _("{Label} among {who} fell by {amount} between {first} and {last} {interval}.")
    )
    return phrase(text, Label=label, **{**parts, "who": course.who})


def _beside_the_whole(course: Course) -> Sentence:
    """Of an indicator of which no two compare: the last one only."""
    unit, last = course.indicator.unit, course.at_last
    return phrase(
        _("{label} among {who} in {year}: {value} {interval}."),
        label=_(names.brief(course.indicator.label)),
        who=course.who,
        year=course.last,
        value=shown(last, unit),
        interval=bracketed(limits(last, unit)) if has_interval(last) else "",
    )


def halves(course: Course) -> Sentence:
    """How the change was spread over the two halves of the years."""
    if not course.middle or course.kind not in CLEAR:
        return ()
    unit = course.indicator.unit
    said = []
    for change, first, last in (
        (course.earlier, course.first, course.middle),
        (course.later, course.middle, course.last),
    ):
        kind = movement(change, unit)
        if kind is Movement.UNKNOWN or kind is Movement.WITHOUT_INTERVAL:
            return ()
        clear = _("no clear change") if kind not in CLEAR else course.signed(change)
        said.append(
            _(
                "{clear} from {first} to {last} ({interval})",
                clear=clear,
                first=first,
                last=last,
                interval=limits(change, unit, signed=True),
            )
        )
    return phrase(
        _("In the two halves of these years: {earlier}; {later}."), earlier=said[0], later=said[1]
    )


def others(courses: list[Course]) -> Sentence:
    """The other lines, in one sentence."""
    said = []
    for course in courses:
        unit = course.indicator.unit
        if course.kind in (Movement.UNKNOWN, Movement.WITHOUT_INTERVAL):
            continue
        if course.kind not in CLEAR:
            said.append(
                _(
                    "{who}, no clear change ({interval})",
                    who=course.who,
                    interval=limits(course.change, unit, signed=True),
                )
            )
        else:
            said.append(
                _(
                    "{who} {value} ({interval})",
                    who=course.who,
                    value=course.signed(course.change),
                    interval=limits(course.change, unit, signed=True),
                )
            )
    if not said:
        return ()
    return phrase("{said}.", said=_("Over the same years: {list}", list="; ".join(said)))


def moved(course: Course) -> str:
    """A change with its interval, after the name of a line."""
    if course.kind in (Movement.UNKNOWN, Movement.WITHOUT_INTERVAL):
        return course.signed(course.change)
    interval = limits(course.change, course.indicator.unit, signed=True)
    if course.kind not in CLEAR:
        return _("no clear change ({interval})", interval=interval)
    return _("{value} ({interval})", value=course.signed(course.change), interval=interval)


def finding(label: str, courses: list[Course]) -> str:
    """The chart's title: where the lines end, as far as words can hold it."""
    if not courses:
        return label
    if len(courses) > 2:
        return _range(label, courses)
    first, *others = courses
    value, who = shown(first.at_last, first.indicator.unit), first.who
    ends = [_("{value} for {who}", value=value, who=who)]
    for other in others:
        value, who = shown(other.at_last, other.indicator.unit), other.who
        ends.append(
            _("{value} for {who}", value=value, who=who)
            if other.last == first.last
            else _("in {year} {value} for {who}", year=other.last, value=value, who=who)
        )
    return _("{label} in {year}: {ends}", label=label, year=first.last, ends=names.listed(ends))


def _range(label: str, courses: list[Course]) -> str:
    """Of many lines the lowest and the highest end, among those that end last."""
    last = max(course.last for course in courses)
    ends = [course for course in courses if course.last == last]
    low, high = (end(ends, key=lambda one: float(one.at_last.value)) for end in (min, max))
    return _(
        "{label} in {year}: from {low} for {these} to {high} for {those}",
        label=label,
        year=last,
        low=shown(low.at_last, low.indicator.unit),
        these=low.who,
        high=shown(high.at_last, high.indicator.unit),
        those=high.who,
    )


def meaning(key: str) -> Sentence:
    """How a figure that is not met every day is to be read."""
    texts = {
        "median": _("It is the age that half of those born would live past."),
        "edagger": _("The lower it is, the more alike are lengths of life."),
        "H": _(
            "The lower it is, the more alike are lengths of life: at 0 all would reach the same"
            " age, at 1 the risk of dying would be the same at every age."
        ),
        "smr": _(
            "1 is as many deaths as the death rates of the larger area would bring, 1.10 a tenth"
            " more."
        ),
        "gini": _("The lower it is, the more alike are lengths of life: at 0 all would be alike."),
        "ageing_rate": _(
            "It sets people of different ages beside each other in one year, and does not say how"
            " fast anyone ages."
        ),
    }
    return phrase(texts[key]) if key in texts else ()


def further(changes: list[Piece], tables: list[Piece]) -> tuple[Sentence, ...]:
    """Where to go from the lines: what the change is made of, and the year they end in."""
    if not changes:
        return ()
    return (
        (*phrase(_("At which ages did the change come about? ")), *in_a_row(changes), Piece(".")),
        (*phrase(_("How long do people live there? ")), *in_a_row(tables), Piece(".")),
    )


def small(lines: list[str]) -> tuple[str, str] | None:
    """Lines whose interval in a single year is wider than all they changed by."""
    if not lines:
        return None
    return _("Small numbers"), _(
        "For {lines} a single year’s interval is wider than the change over all years drawn: no"
        " single turn of these lines means much.",
        lines=names.listed(lines, most=8),
    )


def no_two(indicator: Indicator) -> tuple[str, str] | None:
    """Of a ratio to a larger area: that its values do not compare with one another."""
    if not indicator.needs.whole:
        return None
    return _("Not comparable"), _(
        "Each value sets an area against the larger one it is part of, weighted by its own people"
        " of that year. Two of them, of areas or of years, do not compare with one another; a"
        " standardised death rate does."
    )


def few_deaths(lines: list[str]) -> tuple[str, str] | None:
    """Lines of a standardised rate of which some year rests on few deaths."""
    if not lines:
        return None
    return _("Few deaths"), _(
        "For {lines} the rate of some years rests on fewer than {bound} deaths: chance moves it a"
        " good deal.",
        lines=names.listed(lines, most=8),
        bound=FEW_DEATHS,
    )


def missing(lines: list[str], why: str) -> tuple[str, str]:
    who = names.first_capital(names.listed(lines, most=8))
    return _("Not drawn"), _("{lines}: {why}", lines=who, why=why)
