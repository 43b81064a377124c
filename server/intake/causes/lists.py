"""Cause lists that come with the program, by ranges of ICD-10; the short labels are our own.

Of two ranges that hold a code the one that names more digits has it: Y87.0 is suicide, the rest of
Y87 is not.
Source: World Health Organization (2016), ICD-10, 5th edition, Volume 1, for codes and chapters.
"""

from server.store.records import Cause


def _cause(
    code: str,
    label: str,
    ranges: str = "",
    *,
    parent: str = "",
    kind: str = "natural",
    care: str = "",
    sex: str = "",
) -> Cause:
    return Cause(code, label, parent, tuple(ranges.split()), kind, care, sex)


_APART = (  # what is kept apart in both lists
    _cause("undetermined", "Undetermined intent", "Y10-Y34 Y87.2", kind="undetermined"),
    _cause("ill-defined", "Ill-defined", "R00-R94 R96-R98", kind="ill_defined"),
    _cause("pending", "Unknown or not yet known", "R99", kind="pending"),
    _cause(
        "not-underlying",
        "Codes that are no underlying cause",
        "S00-T98 U50-U99 Y90-Y98 Z00-Z99",
        kind="not_underlying",
    ),
)

CHAPTERS = (
    _cause("infections", "Infections", "A00-B99"),
    _cause("tumours", "Cancers and other tumours", "C00-D48"),
    _cause("blood", "Blood and immunity", "D50-D89"),
    _cause("metabolism", "Hormones, nutrition and metabolism", "E00-E90"),
    _cause("mind", "Mind and behaviour", "F00-F99"),
    _cause("nerves", "Nervous system", "G00-G99"),
    _cause("eyes", "Eyes", "H00-H59"),
    _cause("ears", "Ears", "H60-H95"),
    _cause("circulation", "Heart and circulation", "I00-I99"),
    _cause("breathing", "Lungs and breathing", "J00-J99"),
    _cause("digestion", "Digestion and liver", "K00-K93"),
    _cause("skin", "Skin", "L00-L99"),
    _cause("muscles", "Muscles, bones and joints", "M00-M99"),
    _cause("kidneys", "Kidneys, urinary and genital organs", "N00-N99"),
    _cause("pregnancy", "Pregnancy and childbirth", "O00-O99", sex="f"),
    _cause("perinatal", "Around birth", "P00-P96"),
    _cause("congenital", "Congenital conditions", "Q00-Q99"),
    _cause("sudden-infant", "Sudden infant death", "R95"),
    _cause("special", "COVID-19 and other new diseases", "U00-U49"),
    _cause("external", "External causes", "V01-Y09 Y35-Y89", kind="external"),
    *_APART,
)

SHORT = (
    _cause("infections", "Infections"),
    _cause("covid", "COVID-19", "U07-U10", parent="infections"),
    _cause("hiv-tuberculosis", "HIV and tuberculosis", "A15-A19 B20-B24", parent="infections"),
    _cause("infections-other", "Other infections", "A00-A14 A20-B19 B25-B99", parent="infections"),
    _cause("cancers", "Cancers and other tumours"),
    _cause("cancer-lung", "Lung cancer", "C33-C34", parent="cancers"),
    _cause("cancer-breast", "Breast cancer", "C50", parent="cancers"),
    _cause("cancer-bowel", "Bowel cancer", "C18-C21", parent="cancers"),
    _cause("cancer-prostate", "Prostate cancer", "C61", parent="cancers", sex="m"),
    _cause(
        "cancer-other",
        "Other cancers",
        "C00-C17 C22-C32 C35-C49 C51-C60 C62-C97",
        parent="cancers",
    ),
    _cause("tumours-other", "Benign and uncertain tumours", "D00-D48", parent="cancers"),
    _cause("circulatory", "Heart and circulation"),
    _cause("heart-attack", "Heart attack and ischaemic heart", "I20-I25", parent="circulatory"),
    _cause("stroke", "Stroke", "I60-I69", parent="circulatory"),
    _cause(
        "circulatory-other", "Other circulatory", "I00-I19 I26-I59 I70-I99", parent="circulatory"
    ),
    _cause("respiratory", "Lungs and breathing"),
    _cause("pneumonia", "Influenza and pneumonia", "J09-J18", parent="respiratory"),
    _cause("lungs-chronic", "Chronic lung disease", "J40-J47", parent="respiratory"),
    _cause(
        "respiratory-other", "Other chronic respiratory", "J30-J39 J48-J98", parent="respiratory"
    ),
    _cause(
        "respiratory-acute", "Other acute respiratory", "J00-J08 J19-J29 J99", parent="respiratory"
    ),
    _cause("digestive", "Digestion and liver"),
    _cause("liver-alcohol", "Alcoholic liver disease", "K70", parent="digestive"),
    _cause("digestive-other", "Other digestive", "K00-K69 K71-K93", parent="digestive"),
    _cause("mind-nerves", "Dementia, mind and nerves"),
    _cause("dementia", "Dementia and Alzheimer’s disease", "F00-F03 G30", parent="mind-nerves"),
    _cause("mind-nerves-other", "Other mind and nerves", "F04-G29 G31-G99", parent="mind-nerves"),
    _cause("other-diseases", "Diabetes, kidneys and other diseases"),
    _cause("diabetes", "Diabetes", "E10-E14", parent="other-diseases"),
    _cause("kidney", "Kidney disease", "N00-N29", parent="other-diseases"),
    _cause(
        "diseases-other",
        "Other diseases",
        "D50-D89 E00-E09 E15-E90 H00-H95 L00-M99 N30-N99 U00-U06 U11-U49",
        parent="other-diseases",
    ),
    _cause("early-life", "Pregnancy, birth and early life"),
    _cause("pregnancy", "Pregnancy and childbirth", "O00-O99", parent="early-life", sex="f"),
    _cause("perinatal", "Around birth", "P00-P96", parent="early-life"),
    _cause("congenital", "Congenital conditions", "Q00-Q99", parent="early-life"),
    _cause("sudden-infant", "Sudden infant death", "R95", parent="early-life"),
    _cause("external", "External causes", kind="external"),
    _cause(
        "road-traffic",
        "Road traffic",
        "V01-V04 V06 V09-V80 V87 V89 V99",
        parent="external",
        kind="external",
    ),
    _cause(
        "suicide", "Suicide", "X60-X84 Y87.0", parent="external", kind="external", care="suicide"
    ),
    _cause(
        "overdose",
        "Accidental poisoning and overdose",
        "X40-X49",
        parent="external",
        kind="external",
        care="overdose",
    ),
    _cause(
        "violence", "Violence", "X85-Y09 Y87.1", parent="external", kind="external", care="violence"
    ),
    _cause("falls", "Falls", "W00-W19", parent="external", kind="external"),
    _cause(
        "external-other",
        "Other external causes",
        "V05 V07-V08 V81-V86 V88 V90-V98 W20-X39 X50-X59 Y35-Y89",
        parent="external",
        kind="external",
    ),
    *_APART,
)

BUILT_IN: dict[str, tuple[Cause, ...]] = {"chapters": CHAPTERS, "short": SHORT}
OWN = "own"  # the user's own list, a table of the upload
CAUSE_LISTS = (*BUILT_IN, OWN)
