"""How the curves behind death rates are made, each with its source."""

from engine.settings import Settings
from server.sentences.numbers import whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


def computed(settings: Settings, *, grouped: bool, whole_area: str) -> tuple[Sentence, ...]:
    """How each curve is made, and its source; the parts that stand on the page."""
    level = whole(100 * settings.level)
    first = [
        (_(stage.name), _(stage.sentence))
        for stage in settings.stages
        if stage.name in ("Years", "Rates")
    ]
    steps = [*first, *_made(), *(_grouped() if grouped else ())]
    if whole_area:
        steps.append(_relation(whole_area))
    steps.append(
        (
            _("Intervals"),
            _(
                "With {level} % they cover what chance in the number of deaths can do, deaths taken"
                " as Poisson; those of the smooth curve also what smoothing bends on average.",
                level=level,
            ),
        )
    )
    return tuple(
        phrase("{name}. {sentence}", name=Piece(name, emphasis="strong"), sentence=sentence)
        for name, sentence in steps
    )


def _made() -> tuple[tuple[str, str], ...]:
    return (
        (
            _("Laws"),
            _(
                "Fitted to the closed age groups by Poisson likelihood; a group’s rate is the mean"
                " of the law over it. Of those fitted from age 40 the one with the least AIC"
                " (Akaike 1974) is taken. Its deviance is twice the log likelihood it"
                " loses against a rate of its own for each group; it misses something where that is"
                " above what chi-square with the groups less the parameters seldom exceeds."
            ),
        ),
        (
            _("Smooth curve"),
            _(
                "P-spline: cubic splines with a penalty on roughness, fitted by Poisson likelihood"
                " from age 10 (Eilers & Marx 1996), averaged over penalties by how likely each is"
                " (Hoeting, Madigan, Raftery & Volinsky 1999). In trials with known rates a 95 %"
                " band held 89 to 95 of a hundred."
            ),
        ),
        (
            _("Graduation"),
            _(
                "The logarithms of the death rates, weighted by deaths, drawn smooth with a penalty"
                " on second differences, chosen by generalised cross-validation (Whittaker 1923;"
                " Henderson 1924). Only where the age groups from 10 are equally wide."
            ),
        ),
    )


def _grouped() -> tuple[tuple[str, str], ...]:
    return (
        (
            _("Single years"),
            _(
                "By the penalised composite link: the smoothest death rates by single year whose"
                " sums the counts of the groups are likely to come from (Rizzi, Gampe & Eilers"
                " 2015). Beside it a monotone curve through the counts cumulated over age, which"
                " keeps each group’s sum (Fritsch & Carlson 1980); so are person-years spread."
            ),
        ),
    )


def _relation(area: str) -> tuple[str, str]:
    return (
        _("Level and shape"),
        _(
            "On the scale of 1/2 log((1 - l) / l), l the share who live to an age, the table is"
            " read as level plus shape times that of {area}, taken as known although this area is"
            " part of it (Brass 1971).",
            area=area,
        ),
    )
