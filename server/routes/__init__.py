"""All address families; the application takes each of ROUTERS."""

from server.routes import (
    comparison,
    contents,
    curves,
    methods,
    population_year,
    start,
    trend,
    uploads,
)

ROUTERS = (
    start.router,
    contents.router,
    population_year.router,
    curves.router,
    comparison.router,
    trend.router,
    uploads.router,
    methods.router,
)
