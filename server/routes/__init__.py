"""All address families; the application takes each of ROUTERS."""

from server.routes import (
    account,
    changes,
    comparison,
    contents,
    curves,
    methods,
    policy,
    population_year,
    quality,
    receiving,
    reproduce,
    start,
    trend,
    upload_reading,
    uploads,
)

ROUTERS = (
    start.router,
    contents.router,
    population_year.router,
    curves.router,
    comparison.router,
    quality.router,
    changes.router,
    account.router,
    trend.router,
    uploads.router,
    reproduce.router,
    receiving.router,
    upload_reading.router,
    methods.router,
    policy.router,
)
