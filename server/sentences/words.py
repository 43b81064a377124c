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


def comparing() -> tuple[tuple[str, str], ...]:
    """Words for what makes populations, areas and years comparable."""
    return (
        (
            _("years added up"),
            _(
                "Deaths and person-years of neighbouring years taken together as if they were one. "
                "Small areas become steadier, and what happened in one year is spread over all."
            ),
        ),
        (
            _("standard population, standardised rate"),
            _(
                "Where more old people live, more people die. A standardised rate takes the death "
                "rates of each age as they are, but on both sides the ages of one fixed "
                "population, the standard: so a difference is not owed to older or younger people. "
                "It may be compared only with rates by the same standard."
            ),
        ),
        (
            _("expected deaths, standardised mortality ratio (SMR)"),
            _(
                "Expected are the deaths there would have been if people of each age had died as "
                "often as in the larger area. The ratio sets the deaths there were against them: "
                "1.10 is a tenth more than expected. Two such ratios do not compare with one "
                "another."
            ),
        ),
        (
            _("older or younger people"),
            _(
                "The part of a difference between crude death rates that is owed to the ages of "
                "the people, and not to how often people of one age die."
            ),
        ),
        (
            _("years of life lost"),
            _(
                "Each death counted by the years still ahead at its age, up to an age such as 75 "
                "or by a reference life table: early deaths weigh more."
            ),
        ),
        (
            _("infant, neonatal and post-neonatal deaths, stillbirths"),
            _(
                "Infant deaths come before the first birthday: neonatal ones in the first 28 days, "
                "post-neonatal ones after them. A stillborn child was born without life and is no "
                "infant death. All are set over births, not over person-years."
            ),
        ),
        (
            _("unevenness of length of life"),
            _(
                "How far lengths of life differ between people, measured in years (e-dagger, "
                "standard deviation) or as a share of life expectancy (H, Gini, Theil). All are 0 "
                "if everybody dies at one age, and none says which ages are to blame."
            ),
        ),
        (
            _("early and late deaths, threshold age"),
            _(
                "A life saved at a young age makes lengths of life more alike; one saved at a very "
                "old age makes them less alike. The threshold age parts the two: deaths below it "
                "are called early, those above late."
            ),
        ),
        (
            _("shift and squeeze"),
            _(
                "Two ways in which deaths of old age change: all of them come some years later or "
                "earlier (shift), or they crowd closer around one age or spread out (squeeze)."
            ),
        ),
        (
            _("smallest difference that could have been seen"),
            _(
                "With few deaths a true difference may stay hidden. This is the size that one must "
                "have to show, beyond chance, in four of five such counts. A “no clear difference” "
                "rules out no smaller one."
            ),
        ),
        (
            _("deaths fewer for a month of life expectancy"),
            _(
                "How many deaths of one age would have to be avoided in the year for life "
                "expectancy at birth to be a month longer. It is arithmetic and ranks no lives."
            ),
        ),
    )


def modelling() -> tuple[tuple[str, str], ...]:
    """Words for laws, smoothing and what stands in where counts are too few."""
    return (
        (
            _("law of mortality"),
            _(
                "A short formula for how death rates go with age, fitted to the counts. What is "
                "read off it is marked as a model."
            ),
        ),
        (
            _("Gompertz"),
            _("From middle age on death rates grow by the same per cent with each year of age."),
        ),
        (
            _("Gompertz-Makeham"),
            _("The same, and a part that is equal at all ages is added, as of accidents."),
        ),
        (
            _("Kannisto"),
            _(
                "As Gompertz, but the rise slows down at the highest ages and death rates level "
                "off towards 1 a year."
            ),
        ),
        (
            _("Siler"),
            _(
                "For all ages: death rates that fall through childhood, a part equal at all ages, "
                "and a part that rises as Gompertz says."
            ),
        ),
        (
            _("smoothed rates"),
            _(
                "Death rates drawn through the counts as an even curve over age, so that chance at "
                "single ages shows less. A true bend may be smoothed away with it."
            ),
        ),
        (
            _("borrowed rate"),
            _(
                "Where nobody died in the last, open age group, the death rate of the larger area "
                "stands there. Chance in it is not part of the interval."
            ),
        ),
        (
            _("people that the deaths imply"),
            _(
                "How many very old people there ought to be for the deaths there were, if they "
                "died as often as in the larger area. A large gap to those counted hints at a "
                "miscount of deaths or of people."
            ),
        ),
    )
