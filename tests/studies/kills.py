"""What a commit leaves behind that is killed at a random moment.

    python -m tests.studies.kills --kills 500

A collection holds one edition; a second is committed in a process that is killed with SIGKILL,
which nothing can catch, after a random part of the time that a commit takes. Afterwards either the
old state stands or the new one, every edition's hash is that of its content, the database is
whole, and the same upload becomes an edition if it did not.
"""

import argparse
import os
import random
import shutil
import signal
import sys
import time
from collections import Counter
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from tempfile import TemporaryDirectory
from unittest import mock

from sqlalchemy import text

from server.accounts.viewer import LOCAL
from server.actions import commit_upload as action
from server.actions.create_collection import create_collection
from server.actions.rebuild_editions import rebuild_editions
from server.store import editions, uploads
from server.store.connect import Session, make_engine, sessions
from server.store.migrating import migrate
from tests.factories import NOON, checked_upload, counts_csv

AREAS = tuple(f"a{number}" for number in range(12))
BEFORE, AFTER = range(2000, 2004), range(2002, 2010)
STAGES = ("beginning", "reading", "comparing", "writing", "written")


@dataclass(frozen=True, slots=True)
class Killed:
    """What one kill found: how far the commit was, and which state stood afterwards."""

    stage: str
    state: str  # old, new


def prepare(folder: Path) -> tuple[Path, str, str]:
    """A database with one edition and a sound draft; the hashes before and after its commit."""
    file = folder / "before.db"
    migrate(_url(file))
    with _session(file) as session:
        create_collection(
            session, code="saltmarsh", name="Saltmarsh", owner="Desk", by=LOCAL, now=NOON
        )
        first = _commit(session, checked_upload(session, counts_csv(AREAS, years=BEFORE)).id)
        checked_upload(session, counts_csv(AREAS, years=AFTER, times=2))
    copy = Path(shutil.copy(file, folder / "whole.db"))
    with _session(copy) as session:
        second = _commit(session, 2)
    return file, first, second


def duration(file: Path, folder: Path) -> float:
    """Seconds a commit takes here when nobody ends it; the median of five."""
    took = []
    for number in range(5):
        copy = Path(shutil.copy(file, folder / f"timed-{number}.db"))
        begun = time.perf_counter()
        child, _ = _begin(copy)
        os.waitpid(child, 0)
        took.append(time.perf_counter() - begun)
    return sorted(took)[2]


def kill(file: Path, folder: Path, after: float, hashes: tuple[str, str]) -> Killed:
    """Kill one commit and judge what it left. Raises: AssertionError where that is neither."""
    copy = Path(shutil.copy(file, folder / "killed.db"))
    child, said = _begin(copy)
    time.sleep(after)
    os.kill(child, signal.SIGKILL)
    os.waitpid(child, 0)
    with os.fdopen(said, "rb") as pipe:
        stage = STAGES[max(pipe.read(), default=0)]
    with _session(copy) as session:
        assert session.execute(text("PRAGMA integrity_check")).scalar() == "ok"
        assert not session.execute(text("PRAGMA foreign_key_check")).all()
        found = [edition.digest for edition in editions.listing(session, "saltmarsh")][::-1]
        assert found in (list(hashes[:1]), list(hashes)), found
        rebuilt = rebuild_editions(session, collection="saltmarsh", by=LOCAL)
        assert all(one.same for one in rebuilt), rebuilt
        if len(found) == 1:
            assert uploads.find(session, 2).edition is None
            assert _commit(session, 2) == hashes[1]
    for rest in folder.glob("killed.db*"):
        rest.unlink()
    return Killed(stage, "old" if len(found) == 1 else "new")


def study(kills: int, seed: int) -> Counter[Killed]:
    """How often a kill met which stage and left which state."""
    chance = random.Random(seed)
    with TemporaryDirectory() as made:
        folder = Path(made)
        file, *hashes = prepare(folder)
        most = 1.1 * duration(file, folder)
        return Counter(
            kill(file, folder, chance.uniform(0, most), (hashes[0], hashes[1]))
            for _ in range(kills)
        )


def _begin(file: Path) -> tuple[int, int]:
    """A process that commits the draft; its number, and where it says how far it is."""
    reads, writes = os.pipe()
    if child := os.fork():
        os.close(writes)
        return child, reads
    try:
        with _session(file) as session, _telling(lambda stage: os.write(writes, bytes([stage]))):
            _commit(session, 2)
    finally:
        os._exit(0)


@contextmanager
def _telling(tell: Callable[[int], object]) -> Iterator[None]:
    """Say a stage's number as it begins."""

    def before(stage: int, call: Callable[..., object]) -> Callable[..., object]:
        def told(*args: object, **named: object) -> object:
            tell(stage)
            return call(*args, **named)

        return told

    with (
        mock.patch.object(action, "parse", before(1, action.parse)),
        mock.patch.object(editions, "prepare", before(2, editions.prepare)),
        mock.patch.object(editions, "write", before(3, editions.write)),
    ):
        yield
        tell(4)


def _commit(session: Session, upload: int) -> str:
    made = action.commit_upload(session, upload_id=upload, note="for the study", by=LOCAL, now=NOON)
    return made.digest


@contextmanager
def _session(file: Path) -> Iterator[Session]:
    engine = make_engine(_url(file))
    with sessions(engine)() as session:
        yield session
    engine.dispose()


def _url(file: Path) -> str:
    return f"sqlite:///{file}"


def main() -> None:
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--kills", type=int, default=500)
    asked.add_argument("--seed", type=int, default=1)
    chosen = asked.parse_args()
    found = study(chosen.kills, chosen.seed)
    print(f"{chosen.kills} kills; every state was the old or the new one")
    for stage in STAGES:
        old, new = (found[Killed(stage, state)] for state in ("old", "new"))
        print(f"{stage:10} {old:4} old {new:4} new {'#' * ((old + new) * 40 // chosen.kills)}")


if __name__ == "__main__":
    sys.exit(main())
