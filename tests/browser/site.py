"""A running Ebbline for the browser: its own process, its own data folder, a free port."""

import os
import signal
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from dataclasses import dataclass, field
from pathlib import Path

from tests.house.tree import ROOT


def free_port() -> int:
    with socket.socket() as held:
        held.bind(("127.0.0.1", 0))
        return int(held.getsockname()[1])


@dataclass(slots=True)
class Site:
    """Start with `start()`, stop with `stop()`; the data folder outlives both."""

    data: Path
    language: str = "en"
    port: int = field(default_factory=free_port)
    _running: "subprocess.Popen[bytes] | None" = None

    @property
    def address(self) -> str:
        return f"http://127.0.0.1:{self.port}"

    @property
    def environment(self) -> dict[str, str]:
        mine = {name: text for name, text in os.environ.items() if not name.startswith("EBBLINE_")}
        return mine | {
            "EBBLINE_DATA": str(self.data),
            "EBBLINE_PORT": str(self.port),
            "EBBLINE_LANGUAGE": self.language,
        }

    def command(self, *words: str) -> "subprocess.CompletedProcess[str]":
        """One run of the command line on this site's data."""
        return subprocess.run(
            [sys.executable, "-m", "server", *words],
            cwd=ROOT,
            env=self.environment,
            capture_output=True,
            text=True,
            timeout=120,
        )

    def start(self, *words: str) -> "Site":
        """`ebbline serve`, or the command given; returns once the site answers."""
        log = (self.data / "served.txt").open("ab")
        self._running = subprocess.Popen(
            [sys.executable, "-m", "server", *(words or ("serve",))],
            cwd=ROOT,
            env=self.environment,
            stdout=log,
            stderr=subprocess.STDOUT,
        )
        log.close()
        for _ in range(600):
            if self._running.poll() is not None:
                break
            try:
                with urllib.request.urlopen(f"{self.address}/readyz", timeout=5) as answer:
                    if answer.status == 200:
                        return self
            except (urllib.error.URLError, ConnectionError, TimeoutError):
                time.sleep(0.1)
        self.stop()
        raise RuntimeError(f"the site did not come up:\n{self.said()}")

    def said(self) -> str:
        """The end of what the server has logged."""
        return (self.data / "served.txt").read_text(encoding="utf-8")[-3000:]

    def stop(self) -> None:
        if self._running is not None:
            self._running.send_signal(signal.SIGTERM)
            self._running.wait(timeout=30)
            self._running = None
