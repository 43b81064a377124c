"""What a column is called: the usual names in the languages of the vocabulary.

Names are compared folded, with every run of other signs than letters and digits one blank.
"""

import re
from collections.abc import Iterable

from server.intake.folding import folded

NAMES = {
    "year": "year|period|calendar year|year of death|year of occurrence|reference year|time|yr|"
    "time period|year code|annee|an|annee de deces|periode|jahr|kalenderjahr|berichtsjahr|"
    "sterbejahr|ano|anio|ano de defuncion|ano do obito|periodo|anno|anno di decesso|jaar|perioden|"
    "ar|aar|kalenderar|tid|rok|lata|rok zgonu",
    "sex": "sex|gender|sex code|sex label|sexe|geschlecht|sexo|genero|sesso|genere|geslacht|kon|"
    "kjonn|plec",
    "age": "age|ages|age group|age groups|agegroup|age grp|agegrp|age class|age band|age range|"
    "age at death|age years|age in years|age code|tranche d age|groupe d age|groupes d age|"
    "classe d age|age au deces|age revolu|alter|altersgruppe|altersgruppen|altersjahre|"
    "alter in jahren|alter von bis|edad|grupo de edad|grupos de edad|grupo etario|"
    "grupo quinquenal|idade|faixa etaria|grupo de idade|grupo etario|eta|classe di eta|"
    "classe d eta|fascia di eta|leeftijd|leeftijdsgroep|leeftijdsklasse|alder|aldersgruppe|"
    "aldersklasse|aldersgrupp|aldersgrupper|wiek|grupa wieku|grupy wieku",
    "area": "area|area code|region|region code|district|district code|code|geography|geo|geo code|"
    "geography code|county|county code|municipality|municipality code|province|province code|"
    "state|state code|local authority|local authority code|health region|territory|zone|"
    "code region|code departement|departement|ags|regionalschluessel|kreis|bundesland|"
    "regionsnummer|codigo|codigo de region|provincia|estado|uf|municipio|codice|regione|comune|"
    "provincie|gemeente|regiocode|regio|kommune|kommunekode|fylke|lan|landsdel|regionskod|"
    "wojewodztwo|powiat|kod",
    "area_name": "area name|region name|district name|geography name|county name|"
    "municipality name|province name|state name|name|area label|label|nom|libelle|nom region|"
    "nombre|nombre de region|nome|naam|navn|namn|nazwa",
    "deaths": "deaths|death|died|number of deaths|no of deaths|death count|deaths count|"
    "count of deaths|total deaths|registered deaths|n deaths|dead|deces|nombre de deces|"
    "deces enregistres|gestorbene|sterbefalle|sterbefaelle|todesfalle|todesfaelle|verstorbene|"
    "anzahl gestorbene|anzahl der gestorbenen|defunciones|muertes|numero de defunciones|"
    "fallecidos|obitos|mortes|numero de obitos|decessi|morti|numero di decessi|numero di morti|"
    "overledenen|sterfte|aantal overledenen|overleden|dode|dodsfall|doedsfald|dodsfald|doda|"
    "antal doda|antal dode|zgony|liczba zgonow|zgony ogolem",
    "population": "population|populations|people|person years|personyears|"
    "person years at risk|pyears|"
    "pop|exposure|mid year population|midyear population|population at risk|mean population|"
    "average population|estimated population|resident population|usual residents|inhabitants|"
    "residents|personnes annees|population moyenne|habitants|bevolkerung|bevoelkerung|"
    "bevolkerungsstand|mittlere bevolkerung|durchschnittsbevolkerung|einwohner|personenjahre|"
    "poblacion|poblacion residente|poblacion media|habitantes|personas ano|populacao|"
    "populacao residente|populacao media|popolazione|popolazione residente|popolazione media|"
    "residenti|anni persona|bevolking|inwoners|gemiddelde bevolking|persoonsjaren|befolkning|"
    "folketal|folkemengde|folkmangd|middelfolketal|medelfolkmangd|personar|ludnosc|"
    "liczba ludnosci|stan ludnosci",
    "births": "births|live births|livebirths|number of births|number of live births|born alive|"
    "naissances|naissances vivantes|nes vivants|geburten|lebendgeborene|geborene|nacimientos|"
    "nacidos vivos|nascimentos|nascidos vivos|nati|nati vivi|nascite|geboorten|levendgeborenen|"
    "fodsler|levendefodte|fodte|fodda|levande fodda|urodzenia|urodzenia zywe",
    "stillbirths": "stillbirths|still births|stillborn|number of stillbirths|late fetal deaths|"
    "fetal deaths|mort nes|mortinaissances|totgeborene|totgeburten|nacidos muertos|mortinatos|"
    "nados mortos|natimortos|nati morti|doodgeborenen|dodfodte|dodfodda|urodzenia martwe",
    "neonatal_deaths": "neonatal deaths|neonatal|deaths under 28 days|deaths before 28 days|"
    "deaths 0 27 days|deces neonatals|neonatale sterbefalle|muertes neonatales|obitos neonatais",
    "status": "status|state of the figures|statut|estado de los datos|stand der daten|stato|"
    "statuscode",
    "cause": "cause|causes|cause of death|causes of death|underlying cause|"
    "underlying cause of death|underlying cause code|cause code|cause of death code|code of cause|"
    "cause no|cause number|icd|icd 10|icd10|icd code|icd 10 code|icd10 code|icd 9|icd 9 code|"
    "underlying cause icd 10|cause of death icd 10|"
    "cause de deces|causes de deces|cause initiale|cause initiale de deces|code cim|cim|cim 10|"
    "cim10|todesursache|todesursachen|todesursache icd|todesursache icd 10|grundleiden|"
    "icd schlussel|icd 10 code|causa|causas|causa de muerte|causas de muerte|causa de defuncion|"
    "causa basica|causa basica de defuncion|cie|cie 10|codigo cie|causa de morte|causa de obito|"
    "causa do obito|causa basica do obito|causa da morte|cid|cid 10|codigo cid|causa di morte|"
    "cause di morte|causa iniziale|causa iniziale di morte|doodsoorzaak|doodsoorzaken|"
    "primaire doodsoorzaak|onderliggende doodsoorzaak|dodsarsag|dodsaarsag|dodsarsager|"
    "tilgrundliggende dodsarsag|dodsarsak|dodsarsaker|underliggende dodsarsak|dodsorsak|"
    "dodsorsaker|underliggande dodsorsak|przyczyna|przyczyna zgonu|przyczyny zgonow|"
    "wyjsciowa przyczyna zgonu|kod icd",
}
COUNTS = (  # name a number without saying of what
    "count|number|n|value|total|obs value|nombre|effectif|valeur|anzahl|wert|numero|cantidad|valor|"
    "numero total|valore|aantal|waarde|antal|indhold|antall|varde|liczba|wartosc"
)
RATES = (
    "rate|rates|ratio|per 1000|per 10000|per 100000|per 1 000|per 10 000|per 100 000|per 1 million|"
    "percent|per cent|percentage|mx|qx|nmx|nqx|m x|q x|probability|taux|quotient|probabilite|"
    "rate je|ziffer|sterbeziffer|rate pro|wahrscheinlichkeit|tasa|probabilidad|taxa|tasso|"
    "quoziente|probabilita|cijfer|kans|kvotient|kvot|wskaznik|wspolczynnik"
)
_NUMBERS = ("deaths", "population", "births", "stillbirths", "neonatal_deaths")
_ALONE = (
    "area",
    "area_name",
    "status",
    "cause",
)  # too common a word to be looked for inside a heading
_NOT = re.compile(
    r"\b(?:birth|naissance|geburt|nacimiento|nascimento|nascita|geboorte|urodzenia)\b"
)


def plain(heading: str) -> str:
    """As names are compared.

    >>> plain("Bevölkerung (in Tsd.)"), plain("D’âge")
    ('bevolkerung in tsd', 'd age')
    """
    return " ".join(re.split(r"[^0-9a-z]+", folded(heading))).strip()


_LISTED = {field: {plain(name) for name in names.split("|")} for field, names in NAMES.items()}
_RATES = re.compile(rf"\b(?:{'|'.join(sorted(RATES.split('|'), key=len, reverse=True))})\b")
_COUNT = {plain(name) for name in COUNTS.split("|")}


def named(heading: str, fields: Iterable[str]) -> str:
    """The field that a heading is the usual name of; empty where there is none."""
    said = plain(heading)
    return next((field for field in fields if said in _LISTED.get(field, ())), "")


def suggests(heading: str, fields: Iterable[str]) -> str:
    """The field whose name a heading holds among other words, the longest name first.

    >>> suggests("Deaths, all causes", ("age", "deaths")), suggests("Year of birth", ("year",))
    ('deaths', '')
    """
    said = f" {plain(heading)} "
    best = ("", 0)
    for field in fields:
        if field in _ALONE or (field == "year" and _NOT.search(said)):
            continue
        found = max(
            (len(name) for name in _LISTED.get(field, ()) if f" {name} " in said), default=0
        )
        best = (field, found) if found > max(best[1], 2) else best
    return best[0]


def number_named(text: str) -> str:
    """The count that a piece of a heading, a sheet or a title names; empty where none is."""
    return named(text, _NUMBERS) or suggests(text, _NUMBERS)


def is_count(heading: str) -> bool:
    """Whether a heading names a number without saying of what."""
    return plain(heading) in _COUNT


def is_rate(heading: str) -> bool:
    """Whether a heading speaks of a rate, a ratio or a probability."""
    return _RATES.search(plain(heading)) is not None
