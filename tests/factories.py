"""The only maker of test data. Each part of the system has its section; keep them small."""

import datetime as dt
from collections.abc import Callable, Collection, Iterable, Mapping
from dataclasses import replace
from typing import Any

import numpy as np
from hypothesis import strategies as st
from numpy.typing import ArrayLike, NDArray

from engine.ages import AgeGrid, Array
from engine.causes.counts import CauseCounts
from engine.chance import Chance, limits
from engine.count_limits import Interval
from engine.panel import Panel
from engine.settings import find as find_settings
from engine.standards.reference_table import reference_panel
from engine.standards.remaining_years import REFERENCES
from engine.tables import LifeTable, from_rates
from server.accounts.viewer import LOCAL
from server.actions import masking, totals
from server.actions.check_upload import check_upload
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.intake import mapping as intake
from server.results.causes import Causes
from server.results.compared import Asked, Comparison, compared
from server.results.holdings import Holdings
from server.results.loading import Loaded
from server.results.questions import ComparisonQuestion, PopulationYear
from server.results.sides import Elsewhere, Pair
from server.store import areas, collections, editions, records, schedules, uploads
from server.store.connect import Session, transaction
from server.store.heading import Heading
from server.store.records import Area, Basis, Change, Edition, Key, Selection, Vector

# ---- engine: panels -----------------------------------------------------------------------------

GRIDS = {
    "abridged": AgeGrid((0, 1, *range(5, 101, 5))),
    "single": AgeGrid(tuple(range(101))),
    "irregular": AgeGrid(
        (0, 1, 3, 5, 10, 12, 15, 25, 30, 40, 45, 50, 60, 65, 70, 75, 80, 83, 85, 90, 95, 100)
    ),
}


def gompertz_rates(
    grid: AgeGrid,
    *,
    level: ArrayLike = 2e-5,
    slope: ArrayLike = 0.1,
    infant: ArrayLike = 0.005,
    accidents: ArrayLike = 2e-4,
) -> Array:
    """Hazard at the middle of each group (of the open one 3 years in), with infant deaths.

    The parameters broadcast and are the batch: [..., age].
    """
    level, slope, infant, accidents = (
        np.asarray(part, float)[..., None] for part in (level, slope, infant, accidents)
    )
    mids = np.append(grid.mids[:-1], grid.open_age + 3.0)
    starts = np.array(grid.starts, float)
    child = infant * np.where(starts == 0, 1.0, 0.06 * (starts < 5))
    return np.asarray(level * np.exp(slope * mids) + accidents + child)


def table_of_qx(grid: AgeGrid, qx: Array, ax: Array) -> LifeTable:
    """The table of given probabilities of dying; the open group's is 1, and its rate 1 / ax."""
    qx, ax = np.broadcast_arrays(qx, ax)
    n, q, a = grid.widths[:-1], qx[..., :-1], ax[..., :-1]
    with np.errstate(all="ignore"):
        mx = np.concatenate([q / (n - (n - a) * q), 1 / ax[..., -1:]], axis=-1)
    return from_rates(grid, mx, ax)


def survivors_table(grid: AgeGrid, lx: Array, ax: Array) -> LifeTable:
    """The table of given survivors, of any radix; ax of the open group is the expectation of life
    there."""
    with np.errstate(all="ignore"):
        qx = np.where(lx[..., :-1] == 0, 1.0, 1 - lx[..., 1:] / lx[..., :-1])
    return table_of_qx(grid, np.append(qx, np.ones_like(lx[..., -1:]), axis=-1), ax)


def gompertz_panel(
    grid: AgeGrid = GRIDS["abridged"],
    *,
    people: float = 500_000,
    sex: str = "f",
    seed: int | None = None,
    **law: ArrayLike,
) -> Panel:
    """Populations under a Gompertz-Makeham law: expected deaths, or, with a seed, drawn ones."""
    mx = gompertz_rates(grid, **law)
    widths = np.append(grid.widths[:-1], 4.0)
    ends = np.cumsum(mx * widths, axis=-1)
    years = widths * np.exp(-(ends - mx * widths / 2))
    exposure = people * years / years.sum(axis=-1, keepdims=True)
    deaths = mx * exposure
    if seed is not None:
        deaths = np.random.default_rng(seed).poisson(deaths).astype(float)
    return Panel.of(grid, deaths, exposure, sex=sex)


def rate_limits(rates: str) -> Callable[[Array, Array, float], Interval]:
    """Limits of a rate, sum w D, of weights and deaths [..., age] at a level, as settings name
    them."""

    def limits_of(weights: Array, deaths: Array, level: float) -> Interval:
        chance = Chance(weights, deaths, np.zeros(()))
        value = (weights * deaths).sum(axis=-1)
        return limits("gamma", value, chance, level, rates=rates)

    return limits_of


LIMITS = {name: rate_limits(name) for name in ("gamma", "dobson")}


def persons_panel(grid: AgeGrid = GRIDS["abridged"], *, seed: int | None = None) -> Panel:
    """Women and men together, men with the higher rates."""
    women = gompertz_panel(grid, sex="f", seed=seed, level=1.5e-5, infant=0.004)
    men = gompertz_panel(grid, sex="m", seed=None if seed is None else seed + 1, infant=0.006)
    return Panel.persons(women, men)


def complete(panel: Panel) -> Panel:
    """The same populations with births, and with a whole and a standard of other ages and rates
    beside them, so that every indicator can be read."""
    live = np.ceil(panel.exposure[..., 0] + 50)
    neonatal = np.floor(0.6 * panel.deaths[..., 0])
    older = np.linspace(1.0, 1.5, len(panel.grid))
    whole = replace(panel, deaths=4 * panel.deaths + 1, exposure=4.1 * older * panel.exposure)
    births = np.stack([live, np.ceil(live / 200), neonatal], axis=-1)
    return replace(panel, births=births, whole=whole, standard=whole)


def parted(panel: Panel, causes: int = 3, *, seed: int = 1) -> CauseCounts:
    """The deaths of a panel by cause: shares that differ from age to age, whole where the deaths
    are; of the last cause hardly any die young, of the first hardly any die old."""
    rng, ages = np.random.default_rng(seed), len(panel.grid)
    lean = np.linspace(2.0, -2.0, causes)[:, None] * np.linspace(-1.0, 1.0, ages)
    drawn = rng.gamma(2.0, size=(*panel.batch_shape, causes, ages)) * np.exp(-lean)
    ends = np.floor(
        np.cumsum(drawn, axis=-2) / drawn.sum(axis=-2, keepdims=True) * panel.deaths[..., None, :]
        + 1e-9
    )
    ends[..., -1, :] = panel.deaths
    return CauseCounts(np.diff(ends, axis=-2, prepend=0.0))


def codes(panel: Panel, name: str = "isle") -> NDArray[np.str_]:
    """A code for each population of a batch."""
    numbers = np.arange(int(np.prod(panel.batch_shape))).reshape(panel.batch_shape)
    return np.char.add(f"{name}.", numbers.astype(str))


@st.composite
def panels(draw: st.DrawFn, batch: int = 4) -> Panel:
    """A batch of drawn populations on one of the grids, small or large, short-lived or long."""
    shares = st.lists(st.floats(0, 1), min_size=batch, max_size=batch).map(np.array)
    slope = 0.08 + 0.04 * draw(shares)
    return complete(
        gompertz_panel(
            draw(st.sampled_from(list(GRIDS.values()))),
            people=draw(st.floats(30_000, 3_000_000)),
            sex=draw(st.sampled_from(("f", "m", "p"))),
            seed=draw(st.integers(0, 2**31)),
            slope=slope,
            level=0.1 / np.exp(86 * slope),
            infant=0.002 + 0.15 * draw(shares),
        )
    )


# ---- server: editions ---------------------------------------------------------------------------

NOON = dt.datetime(2026, 12, 1, 12, tzinfo=dt.UTC)
BASIS = Basis("residents", "death", "midyear", "1 July of each year", "Statistics desk of the isle")


def edition(
    session: Session,
    panels: Mapping[str, Panel],
    *,
    code: str = "isle",
    parents: Mapping[str, str] | None = None,
    delivered: Collection[str] = (),
    provisional: Collection[str] = (),
    breaks: tuple[records.Break, ...] = (),
    causes: tuple[records.Cause, ...] = (),
    by_cause: Mapping[str, Mapping[str, ArrayLike]] | None = None,
    note: str = "",
) -> Edition:
    """A further edition of a collection, made anew where there is none. `panels` are named by their
    population-years ("north.f.2014"), `provisional` names years; totals are summed as at a commit.
    `causes` are a cause list, `by_cause` deaths by its codes, of some of the population-years.
    """
    parents = parents or {}
    with transaction(session):
        if code not in [one.code for one in collections.all_collections(session)]:
            collections.create(session, code=code, name="The isle", owner="Desk", at=NOON)
    standing = editions.newest_standing(session, code)
    base = standing.number if standing else 0
    cells = {}
    for name, panel in panels.items():
        area, sex, period = name.rsplit(".", 2)
        status = "provisional" if period in provisional else "final"
        for measure, counts in (("deaths", panel.deaths), ("person_years", panel.exposure)):
            cells[Key(area, sex, period, measure)] = Vector(status, panel.grid, counts)
        for cause, deaths in (by_cause or {}).get(name, {}).items():
            counted = Vector(status, panel.grid, np.asarray(deaths, float))
            cells[Key(area, sex, period, "deaths", cause)] = counted
        for measure, count in zip(records.MEASURES[2:5], panel.births, strict=True):
            if np.isfinite(count):
                all_ages = Vector(status, AgeGrid((0,)), np.array([count]))
                cells[Key(area, sex, period, measure)] = all_ages
    named = {key.area for key in cells} | {*parents, *parents.values()}
    stood = areas.listing(session, code, base) if base else ()
    listed = totals.merged(
        [Area(one, one.title(), parents.get(one, ""), one in delivered) for one in named], stood
    )
    held = schedules.load(session, code, base, Selection(cause=None)) if base else {}
    summed = totals.totalled(cells, listed, base=held, base_areas=stood)
    change = Change(
        code,
        base,
        summed.cells,
        listed,
        BASIS,
        ended=summed.ended,
        breaks=breaks,
        causes=causes,
    )
    prepared, masked = editions.prepare(session, change), masking.mask_of(session, change)
    with transaction(session):
        made = editions.write(session, prepared, by="the desk", note=note, at=NOON)
        masking.keep(session, change, made.number, masked, at=NOON)
    return made


# ---- store: schedules as they are ----------------------------------------------------------------


def cells(
    areas: Iterable[str] = "a",
    *,
    sexes: Iterable[str] = "fm",
    years: Iterable[int] = (2001,),
    measures: Iterable[str] = ("deaths", "person_years"),
    grid: AgeGrid | None = None,
    status: str = "final",
    times: float = 1.0,
) -> dict[Key, Vector]:
    """Schedules with numbers of their own: no two keys hold the same."""
    grid = grid or AgeGrid((0, 1, 5, 10))
    keys = [Key(a, s, str(y), m) for a in areas for s in sexes for y in years for m in measures]
    return {
        key: Vector(status, grid, times * (100.0 * number + np.arange(1.0, len(grid) + 1)))
        for number, key in enumerate(keys, start=1)
    }


def stored_collection(session: Session, code: str = "saltmarsh") -> records.Collection:
    with transaction(session):
        return collections.create(session, code=code, name="All deaths", owner="office", at=NOON)


def stored_edition(
    session: Session,
    handed: Mapping[Key, Vector],
    *,
    collection: str = "saltmarsh",
    areas: Iterable[Area] | None = None,
    basis: Basis = BASIS,
    upload: int | None = None,
    replace: bool = False,
) -> Edition:
    """An edition on top of the newest standing one, with these schedules as they are: nothing is
    read from a file and nothing is summed."""
    standing = editions.newest_standing(session, collection)
    change = Change(
        collection=collection,
        base=standing.number if standing else 0,
        cells=handed,
        areas=tuple(areas or (Area(code, "") for code in sorted({key.area for key in handed}))),
        basis=basis,
        upload=upload,
        replace=replace,
    )
    prepared = editions.prepare(session, change)
    with transaction(session):
        return editions.write(session, prepared, by="a tester", note="", at=NOON)


def withdrawn(session: Session, number: int, collection: str = "saltmarsh") -> Edition:
    with transaction(session):
        return editions.record_event(
            session, collection, number, "withdrawn", by="a tester", note="wrong", at=NOON
        )


# ---- intake: a file as somebody would hand it in -------------------------------------------------

COLUMNS = intake.Mapping(
    year="year", sex="sex", age="age", area="area", deaths="deaths", population="population"
)


def counts_csv(
    areas: Iterable[str] = ("north", "south"),
    *,
    years: Iterable[int] = (2001, 2002),
    sexes: Iterable[str] = "fm",
    times: int = 1,
) -> bytes:
    """Deaths and population in long form; no two rows have the same counts."""
    lines = ["year,sex,age,area,deaths,population"]
    for area in areas:
        for year in years:
            for sex in sexes:
                for age in ("0", "1-4", "5-9", "10+"):
                    row = len(lines)
                    lines.append(f"{year},{sex},{age},{area},{times * (20 + row)},{9000 + 7 * row}")
    return "\n".join(lines).encode()


def checked_upload(
    session: Session,
    content: bytes = b"",
    *,
    mapping: intake.Mapping = COLUMNS,
    collection: str = "saltmarsh",
    basis: Basis = BASIS,
    role: str = "counts",
    **lists: str,
) -> records.Upload:
    """A draft that was received, mapped and checked; `lists` are its small tables by role."""
    files = [(role, f"{role}.csv", content)] if content else []
    files += [(name, f"{name}.csv", table.encode()) for name, table in lists.items()]
    upload = receive_upload(session, collection=collection, files=files, by=LOCAL, now=NOON)
    mappings = {role: mapping} if content else {}
    mappings |= dict.fromkeys(lists, intake.Mapping())
    map_upload(session, upload_id=upload.id, mappings=mappings, basis=basis, by=LOCAL, now=NOON)
    check_upload(session, upload_id=upload.id)
    return uploads.find(session, upload.id)


# ---- results: a comparison without a database ----------------------------------------------------


def comparison_of(
    this: Panel,
    that: Panel,
    *,
    of: str = "e0",
    settings: str = "almanac-1",
    causes: tuple[CauseCounts, CauseCounts] | None = None,
    provisional: bool = False,
    sides: tuple[str, str] = ("north.f.2014", "north.f.2004"),
    **asked: Any,
) -> Comparison:
    """The explained difference of two panels, as a page has it. `asked` are further fields of the
    question: a `standard` takes the place of that panel."""
    codes = tuple(PopulationYear.parse(one) for one in sides)
    question = ComparisonQuestion(codes[0], codes[1], of, settings=settings, **asked)
    areas_ = tuple(Area(code, code.title()) for code in dict.fromkeys(one.area for one in codes))
    known = Heading(
        records.Collection(1, "isle", "The isle", "Desk", 1, NOON),
        Edition(1, 0, NOON, "the desk", "", "0" * 64, None, BASIS),
        1,
    )
    periods = tuple(sorted({one.period for one in codes}))
    held = Holdings(areas_, ("f", "m"), periods, dict.fromkeys(codes, "final"))
    chosen = find_settings(settings)
    status = "provisional" if provisional else "final"
    listed = () if causes is None else cause_list(causes[0].deaths.shape[-2])
    loaded = [
        Loaded(
            panel,
            status if at == 0 else "final",
            causes=None if causes is None else Causes(listed, causes[at]),
        )
        for at, panel in enumerate((this, that))
    ]
    if question.standard:
        standard = reference_panel(REFERENCES[question.standard], chosen)
        loaded[1] = Loaded(standard, "final")
    other = Elsewhere(known, held) if question.that_edition else None
    pair = Pair(loaded[0], loaded[1], None, None, None, None)
    return compared(Asked(known, held, other, question, chosen), pair, (), None)


def cause_list(count: int) -> tuple[records.Cause, ...]:
    """Causes of death named by letters."""
    names = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"
    return tuple(
        records.Cause(f"cause-{name.lower()}", f"Cause {name}", ranges=(f"{name}00-{name}99",))
        for name in names[:count]
    )
