"""What the ages, and the causes of death, contribute to a difference between two populations."""

from engine.decomposition.closed import arriaga, pollard
from engine.decomposition.limits import contribution_limits
from engine.decomposition.line import (
    CauseContributions,
    Contributions,
    contributions,
    contributions_by_cause,
)
from engine.decomposition.path import Path, along, along_by_cause
from engine.decomposition.rates import RateParts, kitagawa, of_crude_rates
from engine.decomposition.simulated import Limits
from engine.decomposition.stepwise import NOT_DECOMPOSED, Stepwise, stepwise
from engine.decomposition.unevenness import UnevennessParts, unevenness_parts

__all__ = [
    "NOT_DECOMPOSED",
    "CauseContributions",
    "Contributions",
    "Limits",
    "Path",
    "RateParts",
    "Stepwise",
    "UnevennessParts",
    "along",
    "along_by_cause",
    "arriaga",
    "contribution_limits",
    "contributions",
    "contributions_by_cause",
    "kitagawa",
    "of_crude_rates",
    "pollard",
    "stepwise",
    "unevenness_parts",
]
