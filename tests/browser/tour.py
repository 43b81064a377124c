"""Addresses of the demonstration collection at which every page and state can be seen."""

_CHOICES = "&figures=released&settings=almanac-1"

READ = {
    "collections": "/collections",
    "editions": "/c/quillmere/editions",
    "contents": "/c/quillmere/2/contents",
    "population-year": f"/c/quillmere/2/population-year?of=tollbay.m.2017{_CHOICES}",
    "population-year-open": f"/c/quillmere/2/population-year?of=stonereach.f.2022{_CHOICES}",
    "population-year-small": "/c/quillmere/2/population-year"
    "?of=little-auk.p.2023&figures=released&settings=almanac-2",
    "curves": f"/c/quillmere/2/curves?of=northlade.m.2019{_CHOICES}",
    "curves-small": f"/c/quillmere/2/curves?of=little-auk.f.2020{_CHOICES}",
    "population-year-pooled": "/c/quillmere/2/population-year"
    "?of=northlade.f.2020&figures=released&settings=almanac-1-3-years",
    "comparison": "/c/quillmere/2/comparison"
    f"?this=northlade.m.2017&that=tollbay.m.2017&of=e0{_CHOICES}",
    "comparison-years": "/c/quillmere/2/comparison"
    f"?this=harrowfen.f.2016&that=harrowfen.f.2002&of=e0{_CHOICES}",
    "comparison-same-chance": "/c/quillmere/2/comparison"
    f"?this=little-auk.f.2019&that=little-auk.f.2018&of=e0{_CHOICES}",
    "comparison-asked": "/c/quillmere/2/comparison"
    f"?this=northlade.f.2021&that=northlade.f.2011&of=edagger{_CHOICES}",
    "comparison-no-ages": "/c/quillmere/2/comparison"
    f"?this=northlade.f.2021&that=tollbay.f.2021&of=mode{_CHOICES}",
    "comparison-superseded": "/c/quillmere/1/comparison"
    f"?this=northlade.f.2021&that=northlade.f.2011&of=e0{_CHOICES}",
    "comparison-rest": "/c/quillmere/2/comparison"
    f"?this=tollbay.m.2017&that=quillmere.m.2017&of=e0&overlap=rest{_CHOICES}",
    "comparison-revision": "/c/quillmere/2/comparison"
    f"?this=northlade.m.2021&that=northlade.m.2021&that_edition=1&of=e0{_CHOICES}",
    "comparison-standard": "/c/quillmere/2/comparison"
    f"?this=tollbay.m.2017&standard=gbd2010&of=e0{_CHOICES}",
    "comparison-causes": "/c/quillmere-causes/1/comparison"
    "?this=tollbay.m.2017&that=mainland.m.2017&of=e0&overlap=rest"
    f"&causes=groups&ill_defined=kept&undetermined=kept&ratios=kept{_CHOICES}",
    "trend": "/c/quillmere/2/trend"
    f"?of=e0&area=northlade&area=tollbay&sex=m&from=1999&to=2023{_CHOICES}",
    "trend-sexes": "/c/quillmere/2/trend"
    f"?of=e65&area=elderwick&area=quillmere&sex=f&sex=m&from=2010&to=2023{_CHOICES}",
    "trend-rates": "/c/quillmere/2/trend"
    f"?of=asr_esp2013&area=quillmere&sex=f&sex=m&from=2001&to=2023{_CHOICES}",
    "trend-undefined": "/c/quillmere/2/trend"
    f"?of=H&area=quillmere&area=stonereach&sex=f&from=1999&to=2023{_CHOICES}",
    "quality": "/c/quillmere/2/quality?figures=released&settings=almanac-1",
    "trend-broken": "/c/quillmere/3/trend"
    f"?of=e0&area=quillmere&sex=f&sex=m&from=1999&to=2023{_CHOICES}",
    "comparison-broken": "/c/quillmere/3/comparison"
    f"?this=quillmere.f.2020&that=quillmere.f.2005&of=e0{_CHOICES}",
    "changes": "/c/quillmere/2/changes?since=1&figures=released&settings=almanac-1",
    "account": "/c/quillmere/2/account?of=e0&at=northlade.m.2021&since=1&figures=released"
    "&settings=almanac-2&settings_then=almanac-1",
    "reproduce": "/reproduce",
    "population-year-withheld": "/c/quillmere/3/population-year"
    "?of=little-auk.f.2021&figures=released&settings=almanac-1",
    "causes": "/c/quillmere-causes/1/causes?of=tollbay.m.2017"
    f"&causes=groups&ill_defined=kept&undetermined=kept&ratios=kept{_CHOICES}",
    "causes-each": "/c/quillmere-causes/1/causes?of=mainland.p.2018&cause=dementia"
    "&avoidable=cancer-lung&causes=causes&ill_defined=spread&undetermined=spread&ratios=applied"
    "&figures=released&settings=almanac-1-kannisto",
    "policy": "/c/quillmere/policy",
    "what-if": "/c/quillmere/2/what-if?at=tollbay.m.2017&of=e0"
    f"&by=-20&from=30&to=59&sex=p&cause=&target=78{_CHOICES}",
    "what-if-benchmark": "/c/quillmere/2/what-if?at=tollbay.p.2017&of=H"
    "&by=-20&from=30&to=59&sex=m&cause=&by=10&from=0&to=4&sex=f&cause="
    f"&toward=northlade.p.2017&toward_from=60&toward_to=79&toward_cause={_CHOICES}",
    "what-if-nothing": f"/c/quillmere/2/what-if?at=little-auk.f.2020&of=e0{_CHOICES}",
    "gaps": f"/c/quillmere/2/gaps?of=tollbay.m.2017&least=100000{_CHOICES}",
    "gaps-withheld": f"/c/quillmere/3/gaps?of=little-auk.f.2021&least=100000{_CHOICES}",
    "exchange": f"/c/quillmere/2/exchange?of=tollbay.m.2017{_CHOICES}",
    "methods": "/methods",
    "checks": "/checks",
    "words": "/words",
    "uploads": "/uploads",
    "upload-new": "/uploads/new",
}
REFUSED = {
    "unknown-key": "/c/quillmere/2/trend?of=e0&colour=red",
    "unknown-area": "/c/quillmere/2/population-year?of=atlantis.f.2014" + _CHOICES,
    "no-such-page": "/nothing-here",
}
