"""Ratios of reading an upload of a million rows to a bare read of the table, side by side; then the
whole way of it, received, checked and made an edition, in a process whose memory is measured.

    OPENBLAS_NUM_THREADS=1 taskset -c 0 python -m tests.benchmarks.intake

Sides of a ratio take turns; medians are compared. Of the whole way it is processor time, so that
what else the machine does matters less. Nothing is asserted: machines differ.
"""

import datetime as dt
import gc
import io
import multiprocessing
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np
import pandas as pd

from server.accounts.viewer import LOCAL
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.create_collection import create_collection
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.intake.checks import OF_LEDGER, fields
from server.intake.layout import layout
from server.intake.mapping import Mapping
from server.intake.parsing import Handed, parse
from server.intake.sheets import load
from server.store.connect import make_engine, sessions
from server.store.migrating import migrate
from server.store.records import Basis
from server.worker import SELDOM
from tests.benchmarks.engine import side_by_side

AREAS, YEARS = 1_000, 25
AGES = ["0", "1-4", *(f"{age}-{age + 4}" for age in range(5, 90, 5)), "90+"]
COLUMNS = Mapping(
    year="year", sex="sex", age="age", area="area", deaths="deaths", population="population"
)


STARTS = np.array([0, 1, *range(5, 95, 5)])
WIDTHS = np.append(np.diff(STARTS), 8)


def million() -> bytes:
    """1,000 areas, 25 years, two sexes, 20 ages: 50,000 schedules of each measure. Areas of some
    30,000 to 100,000 people under a Gompertz law, with Poisson deaths: clean, as most files are."""
    rng = np.random.default_rng(1)
    shape = (AREAS, YEARS, 2, len(AGES))
    law = 3e-5 * np.exp(0.098 * (STARTS + WIDTHS / 2)) + 2e-4
    law[:2] = 4e-3, 3e-4
    level = np.exp(rng.normal(0, 0.08, (AREAS, 1, 1, 1))) * np.array([0.8, 1.25])[:, None]
    dying = level.mean(axis=0, keepdims=True) * law * WIDTHS
    middle = STARTS + WIDTHS / 2
    alive = np.exp(dying / 2 - np.cumsum(dying, axis=-1) - 0.004 * middle) * WIDTHS
    grown = (1 + 0.004 * np.arange(YEARS))[:, None, None]
    size = rng.uniform(15_000, 50_000, (AREAS, 1, 1, 1)) * grown
    waves = 1 + rng.normal(0, 0.015, (AREAS, 1, 2, len(AGES)))
    people = np.round(
        size * alive / alive.sum(axis=-1, keepdims=True) * waves + rng.normal(0, 4, shape)
    ).astype(int)
    deaths = rng.poisson(level * law * people)
    area, year, sex, age = (part.ravel() for part in np.indices(shape))
    table = pd.DataFrame(
        {
            "area": np.array([f"a{number:04d}" for number in range(AREAS)])[area],
            "year": 1999 + year,
            "sex": np.array(["f", "m"])[sex],
            "age": np.array(AGES)[age],
            "deaths": deaths.ravel(),
            "population": people.ravel(),
        }
    )
    return table.to_csv(index=False).encode()


def whole_way(content: bytes, name: str = "counts.csv", mapping: Mapping = COLUMNS) -> None:
    """Say what each step of an upload takes, as a worker takes it, and the memory it needs."""
    gc.set_threshold(SELDOM)
    now, before = dt.datetime.now(dt.UTC), _megabytes()
    with TemporaryDirectory() as folder:
        url = f"sqlite:///{Path(folder) / 'whole.db'}"
        migrate(url)
        session = sessions(make_engine(url))()
        create_collection(session, code="isles", name="Isles", owner="Desk", by=LOCAL, now=now)
        files = [("counts", name, content)]
        limit = len(content)
        receive = partial(
            receive_upload, session, collection="isles", files=files, by=LOCAL, now=now, limit=limit
        )
        taken = [_said("received", receive)]
        basis = Basis("residents", "death", "midyear", "1 July", "an invented register")
        map_upload(
            session, upload_id=1, mappings={"counts": mapping}, basis=basis, by=LOCAL, now=now
        )
        taken.append(_said("checked", partial(check_upload, session, upload_id=1)))
        print(f"memory beyond what the process began with: {_megabytes() - before:.0f} MB")
        commit = partial(commit_upload, session, upload_id=1, note="as it is", by=LOCAL, now=now)
        taken.append(_said("made an edition", commit))
        print(f"memory beyond what the process began with: {_megabytes() - before:.0f} MB")
        if name.endswith(".csv"):
            reads = [_seconds(lambda: pd.read_csv(io.BytesIO(content))) for _ in range(5)]
            bare = sorted(reads)[2]
            print(f"together {sum(taken):.2f} s of processor time; a bare read: {bare:.3f} s")
            print(f"read, checked and stored: ratio {sum(taken) / bare:.1f}")


def _said(what: str, step: Callable[[], object]) -> float:
    took = _seconds(step)
    print(f"{what}: {took:.2f} s of processor time")
    return took


def _seconds(step: Callable[[], object]) -> float:
    begun = time.process_time()
    step()
    return time.process_time() - begun


def _megabytes() -> float:
    """The most this process has held; what the one that began it held does not count."""
    status = Path("/proc/self/status").read_text()
    return int(status.split("VmHWM:")[1].split()[0]) / 1024


def main() -> None:
    content = million()
    child = multiprocessing.get_context("spawn").Process(target=whole_way, args=(content,))
    child.start()
    child.join()
    handed = [Handed("counts", "counts.csv", content, COLUMNS)]
    parsed = parse(handed)
    print(f"{parsed.row_count} rows, {len(content) / 1e6:.0f} MB, {len(parsed.cells)} schedules")
    checks = (*fields.CHECKS, *OF_LEDGER)
    print(f"{len(checks)} checks of rows and series; problems: {len(parsed.problems)}")
    bare, columns, whole = side_by_side(
        lambda: pd.read_csv(io.BytesIO(content)),
        lambda: load(layout(content, "counts.csv"), COLUMNS, "counts"),
        lambda: parse(handed),
    )
    print(f"bare read of the table: {bare:.3f} s")
    print(f"cut into lines and read as codes: {columns:.3f} s, ratio {columns / bare:.1f}")
    print(f"read, checked and made schedules: {whole:.3f} s, ratio {whole / bare:.1f}")


if __name__ == "__main__":
    main()
