"""How long do people live here? /c/{collection}/{edition}/population-year and its twins."""

from server.pages import population_year
from server.results.questions import PopulationYearQuestion
from server.routes.asking import pinned

router = pinned(PopulationYearQuestion, population_year.build)
