"""How the counts of files handed in on the command line were made."""

import argparse
from dataclasses import fields

from server.cli.refusals import Declined
from server.sentences.text import _
from server.store.records import Basis


def basis(asked: argparse.Namespace, before: Basis | None) -> Basis:
    """As stated, else as before. Declined where neither says it."""
    given = {
        "people": asked.people,
        "dated_by": asked.dated_by,
        "population": asked.population_is,
        "population_date": asked.population_date,
        "source": asked.source,
        "vintage": asked.vintage,
    }
    options = {
        "people": "--people",
        "dated_by": "--dated-by",
        "population": "--population-is",
        "population_date": "--population-date",
        "source": "--source",
    }
    stated = {
        field.name: given[field.name] or (getattr(before, field.name) if before else "")
        for field in fields(Basis)
    }
    missing = [options[name] for name, text in stated.items() if not text and name in options]
    if missing:
        raise Declined(
            _(
                "The basis of the counts is not stated. Give {missing}: whoever reads the figures "
                "must know it. See ebbline hand-in --help.",
                missing=", ".join(missing),
            )
        )
    return Basis(**stated)
