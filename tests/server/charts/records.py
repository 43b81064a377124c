"""Charts of every kind, small, for the tests of the figure."""

from dataclasses import replace

from server.charts.chart import At, Break, Chart, Drop, Mark, Note, Series

LINE = Series(
    "women & men",
    (0.0, 1.0, 2.0, 3.0, 4.0),
    (80.0, None, 60.0, 50.0, 40.0),
    low=(79.0, None, 59.0, 49.0, 39.0),
    high=(81.0, None, 61.0, 51.0, 41.0),
    role="s1",
    weight="this",
    at=At(3.0, 55.0, narrow_x=1.0),
    provisional=(False, False, False, False, True),
)
OTHER = Series("others", (0.0, 4.0), (70.0, 30.0), sex="m", role="s2", weight="that")


def a_chart(**changes: object) -> Chart:
    fields: dict[str, object] = {
        "key": "curves",
        "finding": "A finding",
        "unit": "Survivors",
        "source": "Source: invented",
        "x_kind": "age",
        "x_range": (0.0, 100.0),
        "y_title": "survivors",
        "y_range": (0.0, 100.0),
        "y_ticks": (0.0, 50.0, 100.0),
        "series": (LINE, OTHER),
    }
    return Chart(**fields | changes)  # type: ignore[arg-type]


BARS = a_chart(
    key="bars",
    y_range=(-1.0, 2.0),
    y_ticks=(-0.5, 0.0, 0.25),
    series=(
        Series(
            "contribution",
            (0.5, 3.0, 7.5),
            (1.5, -0.25, None),
            draw="bars",
            widths=(1.0, 4.0, 5.0),
            low=(1.0, -0.5, None),
            high=(2.0, 0.0, None),
            names=("0", "1–4", "5–9"),
        ),
    ),
    foot_row=((0.5, "+1.50"), (3.0, "−0.25")),
    foot_sum="+1.25",
)
TREND = a_chart(
    key="trend",
    x_kind="year",
    x_range=(1999.0, 2023.0),
    size="tall",
    series=(
        Series("Saltmarsh, women 82.0", (1999.0, 2023.0), (80.0, 82.0), at="end", short="S 82.0"),
        Series("Highmoor, women 81.9", (1999.0, 2022.0), (80.0, 81.9), role="s2", at="end"),
    ),
    breaks=(Break(2006.5, "boundary changed", "break"),),
)
MARKED = a_chart(
    key="marked",
    size="low",
    series=(
        Series("deaths", (0.5, 1.5), (10.0, 20.0), draw="needles", role="s3"),
        Series("rise", (10.0, 20.0), (5.0, 6.0), draw="dots", low=(4.0, 5.0), high=(6.0, 7.0)),
    ),
    marks=(Mark(82.0, "mean 82.0"), Mark(84.4, "median 84.4"), Mark(95.0, "mode")),
    marks_top=90.0,
    drops=(Drop(65.0, 80.0, "90,504 reach 65", 12.0),),
    notes=(Note("a <note>", At(50.0, 50.0, "center")),),
)
RATIO = a_chart(
    key="ratio", y_log=True, y_range=(0.01, 1000.0), y_ticks=(0.1, 10.0), series=(LINE,)
)
BETWEEN = a_chart(key="between", between=(0, 1))
RANKED = a_chart(
    key="ranked",
    x_kind="amount",
    x_range=(-0.25, 0.1),
    x_ticks=(-0.2, -0.1, 0.0, 0.1),
    y_title="change",
    y_range=(0.5, 2.5),
    y_ticks=(2.0, 1.0),
    y_text=("Northlade and the two Capes, men, 2021", "Quillmere, women, 2021"),
    series=(Series("change", (-0.22, 0.05), (2.0, 1.0), draw="reaches", names=("a", "b")),),
)
WHISKERED = replace(
    RANKED,
    key="whiskered",
    series=(replace(RANKED.series[0], low=(-0.3, None), high=(-0.1, None)),),
)
CELLS = a_chart(
    key="cells",
    size="rows",
    series=(
        Series(
            "",
            (10.0, 20.0),
            (2.0, 1.0),
            draw="squares",
            widths=(20.0, 5.0),
            provisional=(False, True),
            names=("a", "b"),
        ),
    ),
)
ALL = (a_chart(), BARS, TREND, MARKED, RATIO, BETWEEN, RANKED, WHISKERED, CELLS)
