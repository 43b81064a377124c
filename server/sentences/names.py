"""What populations and lists are called in words."""

from collections.abc import Sequence

from server.sentences.text import _, n_


def sex(code: str) -> str:
    """Women, men or persons, inside a sentence."""
    return {"f": _("women"), "m": _("men"), "p": _("persons")}[code]


def population(code: str, area: str) -> str:
    """Inside a sentence: women of Northlade.

    >>> population("f", "Northlade")
    'women of Northlade'
    """
    return {
        "f": _("women of {area}", area=area),
        "m": _("men of {area}", area=area),
        "p": _("persons of {area}", area=area),
    }[code]


def population_first(code: str, area: str) -> str:
    """At the head of a sentence: Women of Northlade."""
    return {
        "f": _("Women of {area}", area=area),
        "m": _("Men of {area}", area=area),
        "p": _("Persons of {area}", area=area),
    }[code]


def years(periods: Sequence[str]) -> str:
    """The years whose counts are added up, as one.

    >>> years(("2014",)), years(("2012", "2013", "2014"))
    ('2014', '2012–2014')
    """
    return periods[0] if len(periods) == 1 else f"{periods[0]}–{periods[-1]}"


def sex_and_year(code: str, period: str) -> str:
    """As a label: women 2012."""
    return _("{sex} {year}", sex=sex(code), year=period)


PEOPLE = ("Gini", "Theil")  # names of measures begin with them: the letter stays large


def inside(label: str) -> str:
    """A label inside a sentence: its first letter small, unless it stands for itself or is a name.

    >>> inside("Life expectancy at 65"), inside("H, unevenness"), inside("Gini coefficient")
    ('life expectancy at 65', 'H, unevenness', 'Gini coefficient')
    """
    if label.startswith(PEOPLE) or not label[1:2].islower():
        return label
    return label[:1].lower() + label[1:]


def brief(label: str) -> str:
    """A label, not yet translated, without what it says in brackets: a fuller one stands near.

    >>> brief("Age-standardised death rate (Segi world standard population)")
    'Age-standardised death rate'
    """
    return label.partition(" (")[0]


def first_capital(text: str) -> str:
    """At the head of a sentence."""
    return text[:1].upper() + text[1:]


def listed(parts: Sequence[str], *, most: int = 40) -> str:
    """Names in a row; beyond `most` only how many more there are.

    >>> listed(["a", "b", "c"]), listed(["a", "b", "c", "d"], most=2)
    ('a, b and c', 'a, b and 2 more')
    """
    if not parts:
        return _("none")
    if len(parts) > most:
        rest = len(parts) - most
        return _(
            "{names} and {more}",
            names=", ".join(parts[:most]),
            more=n_("{count} more", "{count} more", rest),
        )
    if len(parts) == 1:
        return parts[0]
    return _("{names} and {last}", names=", ".join(parts[:-1]), last=parts[-1])
