"""`ebbline serve`: the pages, on this computer."""

import argparse
import socket
from functools import partial

import uvicorn

from server import worker
from server.actions.works import KINDS
from server.app import create_app
from server.cli.opened import require_head
from server.cli.options import Commands, add_command, add_port
from server.cli.refusals import Declined
from server.config import Config
from server.jobs.executor import Executor
from server.jobs.processes import Limits, Processes
from server.sentences.text import _
from server.store.jobs import JobBook

# what an address names where the host is one of these
LINKED = {"0.0.0.0": "127.0.0.1", "::": "[::1]", "::1": "[::1]"}


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "serve",
        run,
        summary=_("serve the pages on this computer"),
        text=_(
            "Serves the pages until it is stopped with Ctrl-C. It refuses to start on a database "
            "that is not up to date."
        ),
        examples=("ebbline serve", "ebbline serve --data /srv/ebbline --port 8010"),
    )
    add_port(command)


def run(asked: argparse.Namespace, config: Config) -> int:
    require_head(config)
    return serve(config)


def serve(config: Config) -> int:
    """Serve until stopped."""
    require_port(config)
    print(
        _(
            "Ebbline is at http://{host}:{port}/ (stop it with Ctrl-C).",
            host=LINKED.get(config.host, config.host),
            port=config.port,
        ),
        flush=True,
    )
    uvicorn.run(
        create_app(config, partial(processes, config)),
        host=config.host,
        port=config.port,
        log_level="warning",
        server_header=False,
        proxy_headers=False,  # who asks is who is connected
        timeout_graceful_shutdown=10,
    )
    return 0


def processes(config: Config, book: JobBook, _new_session: object) -> Executor:
    """Long work is done in processes of its own, within the limits of the settings."""
    return Processes(
        book,
        KINDS,
        partial(worker.begin, config.url, config.language),
        Limits(config.work_seconds, config.work_megabytes),
        preload=worker.__name__,
    )


def require_port(config: Config) -> None:
    """Refuse a port that another program holds."""
    with socket.socket(socket.AF_INET6 if ":" in config.host else socket.AF_INET) as trial:
        trial.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        try:
            trial.bind((config.host, config.port))
        except (OSError, OverflowError) as error:  # ports end at 65535
            raise Declined(
                _(
                    "Port {port} on {host} cannot be had: another program holds it, or it is not "
                    "allowed. Stop that program, or choose another port: --port {other}",
                    port=config.port,
                    host=config.host,
                    other=config.port + 1 if 0 < config.port < 65_535 else 8010,
                ),
                exit_code=1,
            ) from error
