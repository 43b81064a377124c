"""The engine's goals as ratios, each with both sides measured in turn in this process.

    OPENBLAS_NUM_THREADS=1 python -m tests.benchmarks [folder]

Prints ratio, spread and goal, writes results/engine.json with commit and machine, and prints the
table for DEVELOPERS.md. A ratio whose spread stayed above 1.3 is written as void.
"""

import json
import os

os.environ["OPENBLAS_NUM_THREADS"] = "1"  # before numpy is loaded

import platform
import subprocess
from dataclasses import asdict
from pathlib import Path

import numba
import numpy as np

from tests.benchmarks.goals import GOALS, Result
from tests.benchmarks.sides import pin

RESULTS = Path(__file__).parent / "results" / "engine.json"


def markdown(record: dict[str, object]) -> str:
    """The table of a record, as DEVELOPERS.md has it."""
    lines = [
        "| what | over | ratio | must | stretch | spread |",
        "| --- | --- | --- | --- | --- | --- |",
    ]
    results = record["results"]
    assert isinstance(results, list)
    for one in results:
        ratio = f"{one['ratio']:.3g}" + (" (void)" if one["void"] else "")
        lines.append(
            f"| {one['what']} | {one['over']} | {ratio} | {one['must']} | {one['stretch']} "
            f"| {one['spread']:.2f} |"
        )
    return "\n".join(lines)


def main() -> None:
    pin()
    results: list[Result] = []
    for goal in GOALS:
        for one in goal():
            print(
                f"{one.what} / {one.over}: {one.ratio:.4g}, spread {one.spread:.2f}",
                one.note,
                flush=True,
            )
            results.append(one)
    commit = subprocess.run(["git", "rev-parse", "--short", "HEAD"], capture_output=True, text=True)
    record: dict[str, object] = {
        "commit": commit.stdout.strip(),
        "machine": f"{_processor()}, {os.cpu_count()} shared cores, one used",
        "versions": f"Python {platform.python_version()}, numpy {np.__version__}, "
        f"numba {numba.__version__}",
        "results": [asdict(one) for one in results],
    }
    RESULTS.write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
    print("\n" + markdown(record))


def _processor() -> str:
    lines = Path("/proc/cpuinfo").read_text(encoding="utf-8").splitlines()
    return next(line.split(":")[1].strip() for line in lines if line.startswith("model name"))


if __name__ == "__main__":
    main()
