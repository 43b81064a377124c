"""Small valid files that show the form of an upload."""

from collections.abc import Iterable

_AGES = ("0", "1-4", *(f"{age}-{age + 4}" for age in range(5, 100, 5)), "100+")
_PEOPLE = {
    "f": "1180 4790 6040 6120 6010 6230 6560 6890 6970 7120 7290 7010 6480 5860 5210 4430 3420 "
    "2390 1410 620 170 30",
    "m": "1240 5030 6340 6420 6300 6390 6610 6880 6950 7060 7180 6850 6240 5530 4760 3840 2750 "
    "1720 860 300 60 8",
}
_DEATHS = {
    "f": "4 1 1 1 2 2 2 4 5 9 15 22 33 47 70 103 139 182 196 151 68 17",
    "m": "5 1 1 1 3 5 5 6 8 14 23 35 52 74 106 142 172 192 166 97 32 6",
}
_BIRTHS = {"f": (1190, 5, 3), "m": (1250, 6, 4)}
_YEARS = {2014: ("final", 1.0, 1.0), 2015: ("provisional", 1.01, 0.98)}


def _csv(heading: str, rows: Iterable[tuple[object, ...]]) -> str:
    return "\n".join([heading, *(",".join(map(str, row)) for row in rows)]) + "\n"


def _deaths() -> str:
    return _csv(
        "area,area_name,year,sex,age,deaths,status",
        (
            ("fenwold", "Fenwold", year, sex, age, round(int(count) * factor), status)
            for year, (status, _, factor) in _YEARS.items()
            for sex, counts in _DEATHS.items()
            for age, count in zip(_AGES, counts.split(), strict=True)
        ),
    )


def _population() -> str:
    return _csv(
        "area,year,sex,age,population",
        (
            ("fenwold", year, sex, age, round(int(count) * factor))
            for year, (_, factor, _) in _YEARS.items()
            for sex, counts in _PEOPLE.items()
            for age, count in zip(_AGES, counts.split(), strict=True)
        ),
    )


def _births() -> str:
    return _csv(
        "area,year,sex,births,stillbirths,neonatal_deaths",
        (
            ("fenwold", year, sex, *(round(count * factor) for count in counts))
            for year, (_, factor, _) in _YEARS.items()
            for sex, counts in _BIRTHS.items()
        ),
    )


_AREAS = _csv(
    "code,becomes,from,to,share,counts,sex,age,name,parent",
    [
        ("fenwold", "lowland", "", "", "", "", "", "", "Lowland", ""),
        ("marsh", "lowland", "", "", "", "", "", "", "", ""),
        ("moor", "upland", "", "2013", 0.25, "", "", "", "Upland", ""),
        ("moor", "vale", "", "2013", 0.75, "", "", "", "Vale", ""),
        ("isle", "north-isle", "2014", "", "", "", "", "", "North Isle", ""),
        ("isle", "south-isle", "2014", "", "", "", "", "", "South Isle", ""),
    ],
)
_BREAKS = _csv(
    "area,year,kind,cause,note,ratio,ratio_error",
    [
        ("", 2012, "population", "", "after the census of 2011", "", ""),
        ("fenwold", 2014, "boundary", "", "parish of Reed joined", "", ""),
        ("", 2015, "coding", "", "new revision of the list of causes", 1.02, 0.004),
        ("", 2015, "shock", "", "hard winter", "", ""),
    ],
)


_CAUSES = _csv(
    "code,name,part of,codes,kind,care,sex",
    [
        ("heart", "Heart and circulation", "", "", "", "", ""),
        ("coronary", "Coronary heart disease", "heart", "I20-I25", "", "", ""),
        ("heart-other", "Other heart and circulation", "heart", "I00-I15 I26-I99", "", "", ""),
        ("prostate", "Prostate cancer", "", "C61", "", "", "m"),
        ("suicide", "Suicide", "", "X60-X84 Y87.0", "external", "suicide", ""),
        ("vague", "Ill-defined", "", "R00-R94 R96-R98", "ill-defined", "", ""),
        ("waiting", "Not yet known", "", "R99", "pending", "", ""),
    ],
)


# role of the file and its text; the name is the role with .csv
TEMPLATES: dict[str, str] = {
    "deaths": _deaths(),
    "population": _population(),
    "births": _births(),
    "areas": _AREAS,
    "breaks": _BREAKS,
    "causes": _CAUSES,
}
