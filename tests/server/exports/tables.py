"""A table with every kind of cell, for the tests of the exports."""

from server.exports.table import Column, Gap, GapKind, Row, Table
from server.exports.twin import Twin

YEARS = Table(
    key="years",
    title="Life expectancy at birth",
    columns=(
        Column("year", "year"),
        Column("area", "area"),
        Column("e0", "women", unit="years", decimals=1, span="Saltmarsh"),
        Column("change", "change", unit="years", decimals=2, signed=True),
    ),
    rows=(
        Row((2011, "=1+1", 1 / 3, -0.125)),
        Row((2012, 'a "quoted", name', Gap(GapKind.WITHHELD, "few deaths"), 0.5), provisional=True),
        Row((2013, "line\nbreak", 82.0, Gap(GapKind.NIL)), second="a remark"),
    ),
    note="Invented.",
    total=Row(("sum", "", 82.5, 0.375)),
)
NAMED = Table(
    key="areas",
    title="Areas",
    columns=(Column("area", "area"), Column("e0", "years", decimals=1)),
    rows=(Row(("st.john", 80.5), shown="St John"), Row(("cape", Gap(GapKind.NOT_AVAILABLE)))),
)


def a_twin(*tables: Table) -> Twin:
    return Twin(
        title="Trend",
        address="/c/x/1/trend?of=e0",
        about=(("Edition", "x, edition 1"),),
        notices=(("Withdrawn", "It was withdrawn."),),
        cautions=(("Provisional", "2012."),),
        tables=tables or (YEARS,),
    )
