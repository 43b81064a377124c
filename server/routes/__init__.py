"""All address families; the application takes each of ROUTERS."""

from server.routes import comparison, population_year, trend

ROUTERS = (population_year.router, comparison.router, trend.router)
