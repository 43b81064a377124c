"""What is dear to make is made once for all workers of a run, in a folder of its own that tests
copy or only read."""

import fcntl
import shutil
from collections.abc import Callable
from pathlib import Path


def once(shared: Path, name: str, fill: Callable[[Path], None]) -> Path:
    """The folder of this name below the shared one, filled by whoever asks first; the others
    wait. What fails half-way is begun anew by the next."""
    made, part = shared / name, shared / f"{name}.part"
    with (shared / f"{name}.lock").open("w") as lock:
        fcntl.flock(lock, fcntl.LOCK_EX)
        if not made.exists():
            shutil.rmtree(part, ignore_errors=True)
            part.mkdir()
            fill(part)
            part.rename(made)
    return made
