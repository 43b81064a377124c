"""The words of the pages in plain language."""

from server.sentences.text import _


def marks() -> tuple[tuple[str, str, str], ...]:
    """The four marks that are never 0: kind of gap, its name, what it means."""
    return (
        (
            "withheld",
            _("withheld"),
            _("There is a number, and it is kept back because it could point to a person."),
        ),
        (
            "nil",
            _("nil"),
            _("Counted, and there was none: no death in this group, in this year."),
        ),
        (
            "not available",
            _("not available"),
            _("Never delivered: the edition has no counts for this area, sex, year or age."),
        ),
        (
            "undefined",
            _("undefined"),
            _(
                "The counts are there, but no number can honestly be made from them; the reason "
                "stands beside it."
            ),
        ),
    )


def counting() -> tuple[tuple[str, str], ...]:
    """Words for what is handed in and kept."""
    return (
        (
            _("collection"),
            _("A named body of mortality counts with its list of areas and its data owner."),
        ),
        (
            _("upload"),
            _(
                "Files as they were handed in, kept byte for byte, with how their columns were "
                "read. It is a draft until an edition is made of it."
            ),
        ),
        (
            _("mapping"),
            _("Which column of a file holds what, and what no column says."),
        ),
        (
            _("edition"),
            _(
                "One state of a collection, numbered. It never changes; a correction is a new "
                "edition. A link keeps showing the edition it names."
            ),
        ),
        (
            _("stands, superseded, withdrawn"),
            _(
                "The newest edition that was not taken back stands. Older ones are superseded. A "
                "withdrawn edition can still be read and says that it was withdrawn."
            ),
        ),
        (
            _("provisional, final"),
            _(
                "A provisional year may still move when late deaths come in; it is marked p. A "
                "final one is not expected to."
            ),
        ),
        (
            _("data owner"),
            _("The office that answers for the counts."),
        ),
        (
            _("residents, occurrences"),
            _(
                "Deaths of those who live in an area, wherever they died; or deaths that happened "
                "in it, whoever died."
            ),
        ),
        (
            _("date of death, date of registration"),
            _(
                "Which day decides the year a death counts in: the day it happened, or the day it "
                "was written down."
            ),
        ),
        (
            _("persons"),
            _("Women and men together."),
        ),
        (
            _("area, sex and year"),
            _("What one life table is made for, for example women of one region in 2014."),
        ),
        (
            _("age group, open group"),
            _("Ages counted together. The last one, such as 85+, has no upper end: it is open."),
        ),
        (
            _("person-years"),
            _(
                "One person living for one year. A population counted in the middle of a year is "
                "taken for the person-years lived in it."
            ),
        ),
        (
            _("settings"),
            _(
                "A named, fixed set of rules that turns counts into figures. The name stands in "
                "the address, so that a link always means the same rules."
            ),
        ),
    )


def reading() -> tuple[tuple[str, str], ...]:
    """Words for what is calculated and said."""
    return (
        (
            _("death rate"),
            _("Deaths in a group in a year, divided by its person-years."),
        ),
        (
            _("life table"),
            _(
                "What would happen to people born today if the death rates of one year held all "
                "their lives: how many reach each age, and how long they have left."
            ),
        ),
        (
            _("survivors"),
            _("Of 100,000 born, how many reach an age in the life table."),
        ),
        (
            _("years to live"),
            _("Years still to come, on average, for those who have reached an age."),
        ),
        (
            _("interval"),
            _(
                "What chance alone could have done: if deaths fell again at the same true rates, "
                "19 times out of 20 such an interval would hold the true figure. It covers no "
                "other error."
            ),
        ),
        (
            _("no clear change, no clear difference"),
            _("The interval of the difference holds 0, so chance alone could have made it."),
        ),
        (
            _("contribution"),
            _(
                "The part of a difference that is owed, in the sense of sums, to the death rates "
                "of one age. It says nothing about causes."
            ),
        ),
        (
            _("what lower death rates at each age would add"),
            _(
                "How much longer life would be on average if the death rate at one age were one "
                "per cent lower and all others stayed."
            ),
        ),
        (
            _("rise of death rates with age"),
            _(
                "How fast death rates grow with age, in per cent a year of age, growth reckoned "
                "without steps: at 10 % they double in 6.9 years of age."
            ),
        ),
        (
            _("joined with its neighbour"),
            _(
                "A group in which nobody was counted has no death rate of its own; it shares that "
                "of the group below it."
            ),
        ),
    )
