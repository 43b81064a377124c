"""How fast death rates rise with age."""

from engine.ageing import Slope, slope
from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs, Unit


def _slope(chain: Chain) -> Slope:
    rates = chain.rates
    return slope(chain.panel.grid, rates.mx, rates.exposure, chain.settings.ageing_span)


def _value(chain: Chain) -> Array:
    return _slope(chain).value


def _gradient(chain: Chain) -> Array:
    return _slope(chain).gradient


FAMILY = (
    Indicator(
        key="ageing_rate",
        symbol="b",
        label="Rise of death rates with age",
        unit=Unit("percent_per_year", "% per year of age", 100, 1),
        definition=(
            "How fast death rates rise with age, on average over the span of ages that the settings"
            " name (life-table ageing rate), growth reckoned without steps: at 10 % a year of age"
            " they double in 6.9. It compares people of different ages in one year and says nothing"
            " of how fast a person ages."
        ),
        formula=(
            "the slope b of log m(x) = a + b x, x the middle of each closed age group inside the"
            " span, by maximum likelihood with deaths Poisson given the person-years"
        ),
        source=(
            "Horiuchi & Coale (1990), Mathematical Population Studies 2, 245-267 (the rate);"
            " Brillinger (1986), Biometrics 42, 693-734 (deaths Poisson given the person-years)"
        ),
        why_not_smooth="",
        needs=Needs(span_deaths=True),
        value=_value,
        partials=_gradient,
    ),
)
