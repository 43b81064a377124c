"""The usual words of such tables, as `folded` writes them: lower case and without accents.

English, French, German, Spanish, Portuguese, Italian, Dutch, Danish, Norwegian, Swedish, Polish.
"""

# a sex; not here: signs that mean one sex in one language and the other in the next (h, v, 1, 2)
SEXES = {
    "f": "f|female|females|woman|women|w|k|girls|femme|femmes|feminin|frau|frauen|weiblich|"
    "mujer|mujeres|femenino|mulher|mulheres|feminino|femmina|femmine|donna|donne|femminile|"
    "vrouw|vrouwen|vrouwelijk|kvinde|kvinder|kvinne|kvinner|kvinna|kvinnor|kobieta|kobiety|"
    "kobiet|sex female|sex f",
    "m": "m|male|males|man|men|boys|homme|hommes|masculin|mann|manner|maenner|mannlich|maennlich|"
    "hombre|hombres|varon|varones|masculino|homem|homens|maschio|maschi|uomo|uomini|maschile|"
    "mannen|mannelijk|mand|maend|menn|manna|mezczyzna|mezczyzni|mezczyzn|sex male|sex m",
    "p": "p|person|persons|people|both|both sexes|all persons|m+f|f+m|m & f|t|_t|"
    "les deux sexes|deux sexes|beide geschlechter|personen|ambos sexos|ambos os sexos|"
    "maschi e femmine|mannen en vrouwen|begge kon|begge kjonn|bada konen|bada kon|obie plcie",
}

# a total over whatever the column holds
TOTALS = (
    "total|totals|all|sum|overall|ensemble|tous|toutes|somme|insgesamt|gesamt|zusammen|alle|summe|"
    "todos|todas|total general|total geral|suma|totale|tutti|tutte|totaal|allen|i alt|ialt|totalt|"
    "samtliga|alla|ogolem|razem|grand total|_t|tot"
)
ALL_AGES = (
    "all ages|total all ages|all age groups|every age|tous ages|tous les ages|toutes ages|"
    "tous ages confondus|ages total|alle altersgruppen|alle alter|jedes alter|todas las edades|"
    "todas edades|"
    "todas as idades|tutte le eta|alle leeftijden|alle aldre|alle aldersgrupper|alder i alt|"
    "alla aldrar|samtliga aldrar|wszystkie grupy wieku|wiek ogolem"
)

# a count that does not say its sex, age or area
NOT_STATED = (
    "not stated|not known|unknown|unknowns|unspecified|not specified|not reported|not recorded|"
    "not given|undeclared|undetermined|unassigned|not assigned|missing|unk|_u|"
    "inconnu|inconnue|inconnus|inconnues|non declare|non declaree|non precise|non precisee|"
    "non renseigne|non renseignee|indetermine|indeterminee|non reparti|non repartis|non repartie|"
    "unbekannt|ohne angabe|ohne angaben|keine angabe|keine angaben|nicht angegeben|"
    "nicht bekannt|unbestimmt|nicht zuordenbar|desconocido|desconocida|desconocidos|"
    "no especificado|no especificada|sin especificar|no declarado|no declarada|no consta|"
    "no conocido|ignorado|"
    "ignorada|ignorados|no indicado|sin datos|desconhecido|desconhecida|nao especificado|"
    "nao especificada|nao declarado|nao declarada|sem declaracao|sem especificacao|nao informado|"
    "sconosciuto|sconosciuta|ignoto|ignota|non indicato|non indicata|non specificato|"
    "non specificata|non noto|non nota|onbekend|niet bekend|niet vermeld|niet opgegeven|"
    "ukendt|uoplyst|ukjent|uoppgitt|ikke oppgitt|ikke oplyst|okand|okant|uppgift saknas|ej angivet|"
    "ej uppgivet|nieznany|nieznana|nieznane|nieznani|nieustalony|nieustalona|nieustalone|"
    "nie ustalono|brak danych|niewiadomy|niewiadoma"
)
# the same in signs that are a name or a code where areas are meant: NA, NS, 9999
NOT_STATED_SIGNS = "ns|n.s.|n. s.|na|n.a.|n/a|nd|n.d.|n/d|nk|n/k|o.a.|o. a.|k.a.|k. a.|..|...|?|??"
AGE_NOT_STATED = "999|9999|999.0|9999.0"

# the deaths of all causes, and deaths of which the cause is not known
ALL_CAUSES = (
    "all causes|all causes of death|total all causes|all deaths|total deaths|toutes causes|"
    "toutes les causes|toutes causes confondues|ensemble des causes|alle todesursachen|"
    "alle ursachen|todesursachen insgesamt|todas las causas|todas las causas de muerte|"
    "total de causas|todas as causas|todas as causas de morte|tutte le cause|"
    "tutte le cause di morte|alle doodsoorzaken|totaal alle doodsoorzaken|totaal doodsoorzaken|"
    "alle dodsarsager|dodsarsager i alt|alle dodsarsaker|totalt alle dodsarsaker|"
    "alla dodsorsaker|samtliga dodsorsaker|wszystkie przyczyny|wszystkie przyczyny zgonow|"
    "przyczyny ogolem"
)
CAUSE_NOT_STATED = (
    "cause not stated|cause unknown|unknown cause|cause not known|cause not specified|"
    "cause non precisee|cause inconnue|cause non declaree|ursache unbekannt|"
    "todesursache unbekannt|ohne angabe der todesursache|causa no especificada|"
    "causa desconocida|causa nao especificada|causa desconhecida|causa ignorada|"
    "causa non specificata|causa sconosciuta|doodsoorzaak onbekend|ukendt dodsarsag|"
    "uoplyst dodsarsag|ukjent dodsarsak|okand dodsorsak|nieznana przyczyna|"
    "przyczyna nieznana"
)

STATUSES = {
    "final": "final|finals|f|definitive|definitif|definitifs|endgultig|endgueltig|definitivo|"
    "definitivos|definitivas|definitief|endelig|endelige|slutlig|slutliga|ostateczne|ostateczny",
    "provisional": "provisional|p|prov|preliminary|prelim|provisoire|provisoires|vorlaufig|"
    "vorlaeufig|provisorisch|provisionales|preliminar|preliminares|provisorio|provisorios|"
    "provvisorio|provvisori|voorlopig|forelobig|forelobige|preliminara|preliminar|wstepne|wstepny",
}

# words that say what a label is about and not which
ABOUT = (
    "age|ages|aged|sex|sexes|gender|area|areas|region|regions|district|districts|provinces|counties|"
    "residence|place|alter|altersgruppe|"
    "geschlecht|gebiet|wohnort|sexe|lieu|zone|edad|sexo|lugar|idade|eta|sesso|leeftijd|geslacht|"
    "alder|kon|kjonn|bopael|bosted|wiek|plec|miejsce|group|groups|grupo|gruppe|groupe"
)

# in ages
YEARS = (
    "year|years|yr|yrs|y|yo|years old|years of age|of age|old|an|ans|annee|annees|jahr|jahre|"
    "jahren|ano|anos|anno|anni|jaar|jaren|ar|aar|arige|aring|aringer|rok|roku|lat|lata|letni|age|"
    "ages|aged|alter|edad|idade|eta|leeftijd|alder|wiek|vuotta"
)
MONTHS = "month|months|mo|mos|mois|monat|monate|monaten|mes|meses|mese|mesi|maand|maanden|maned|"
MONTHS += "maneder|manad|manader|miesiac|miesiace|miesiecy"
DAYS = "day|days|jour|jours|tag|tage|tagen|dia|dias|giorno|giorni|dag|dagen|dage|dager|dagar|"
DAYS += "dzien|dni"
ONE = "one|un|une|uno|una|um|uma|ein|eine|einem|einen|einer|een|en|et|ett|jeden|jednego"
FROM = "from|de|desde|da|dai|dal|von|van|fra|fran|od|d'"
TO = "to|till|til|through|thru|until|a|au|bis|ate|hasta|al|tot en met|t/m|do"
BELOW_END = (
    "- <|to <|to under|to less than|to below|bis unter|tot|a menos de|a moins de|a menos|til under|"
)
BELOW_END += "till under"
UNDER = (
    "under|less than|below|younger than|up to but not including|unter|weniger als|moins de|"
    "moins d'|- de|menos de|menor de|menores de|meno di|sotto|sotto i|jonger dan|onder|minder dan|"
    "yngre enn|"
    "yngre end|yngre an|ponizej"
)
OVER = (
    "+|plus|and over|and above|and older|and more|and up|and upwards|or over|or above|or older|"
    "or more|& over|& above|& older|et plus|ou plus|et au-dela|et plus age|und alter|und aelter|"
    "u. alter|u.alter|und mehr|u. m.|u.m.|u. mehr|und daruber|und darueber|oder alter|oder mehr|"
    "y mas|o mas|y mayores|y mayor|y +|e mais|ou mais|e +|e piu|o piu|e oltre|ed oltre|"
    "en ouder|of ouder|en meer|of meer|og over|og eldre|og aeldre|og derover|og mer|eller eldre|"
    "eller aeldre|eller mer|eller derover|eller mere|og mere|och over|och aldre|och mer|och daover|"
    "eller aldre|i wiecej|lub wiecej|i starsi|i starsze|i powyzej|wzwyz|et +|ou +|o +|or +"
)
FIRST_YEAR = (
    "ponizej roku|infants|infant|in the first year|first year|im ersten lebensjahr|ondernul|"
    "menores de un ano|moins d'un an|under one|0 an|<01"
)
FROM_OPEN = (
    ">=|≥|from age|ab|vanaf|a partir de|a partir des|a partire da|fra og med|fran och med|powyzej i"
)
