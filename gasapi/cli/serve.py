"""``gasapi serve``: run the service under gunicorn, on loopback unless told otherwise.

The master process imports the program and reads its data once, so that a worker that takes the place of another is ready in
a fraction of a second. SIGHUP makes it read the site file and the token file again and lets new workers take over.
"""

from __future__ import annotations

import argparse
import atexit
import ipaddress
import logging
import os
import shutil
import signal
import sys
import tempfile
from dataclasses import replace
from pathlib import Path
from typing import Any

from gasapi.cli.holdings import Holdings
from gasapi.errors import GasapiError
from gasapi.settings import Settings

__all__ = ["add_parser", "is_loopback"]

_MOST_WORKERS = 8
_CONNECTIONS = 2000  # of each worker
_KEEP_ALIVE = 65  # s; longer than the 60 s for which proxies commonly keep connections to what is behind them
_GRACE = 30  # s that requests have to finish when the service is stopped
_SILENCE = 120  # s after which a worker that does not answer is replaced
_REQUEST_LINE = 8190  # bytes, the most that gunicorn takes; a mixture in a query is long
_COLLECT_AFTER = (20_000, 20, 20)  # objects and turns; answers hold no cycles, so that there is little to collect
_MEMORY_FOLDER = Path("/dev/shm")

# numbers are computed in one thread for each request; threads of the linear algebra library would only cost
_ONE_THREAD = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")


def add_parser(commands: Any) -> None:
    """Add the subcommand."""
    parser: argparse.ArgumentParser = commands.add_parser(
        "serve",
        help="run the service",
        description="Run the service. On any address but loopback it asks for tokens (GASAPI_TOKEN_FILE), or for --open.",
    )
    parser.add_argument("--host", help="address to listen on (GASAPI_HOST; default 127.0.0.1)")
    parser.add_argument("--port", type=int, help="port to listen on (GASAPI_PORT or PORT; default 8080)")
    parser.add_argument(
        "--workers", type=int, help=f"processes (GASAPI_WORKERS; default one for each core, at most {_MOST_WORKERS})"
    )
    parser.add_argument(
        "--connections", type=int, default=_CONNECTIONS, help=f"open connections of each worker (default {_CONNECTIONS})"
    )
    parser.add_argument(
        "--keep-alive",
        type=int,
        default=_KEEP_ALIVE,
        help=f"seconds for which an idle connection is kept (default {_KEEP_ALIVE})",
    )
    parser.add_argument("--open", action="store_true", help="answer other machines without tokens (GASAPI_OPEN=1)")
    parser.add_argument(
        "--request-log",
        action="store_true",
        help="write a line of JSON for each request to standard output (GASAPI_REQUEST_LOG=1)",
    )
    parser.add_argument("--certificate", type=Path, help="TLS certificate, a file in PEM form; needs --key")
    parser.add_argument("--key", type=Path, help="private key of the certificate")
    parser.set_defaults(run=_run)


def is_loopback(host: str) -> bool:
    """Return whether an address can be reached from this machine alone; of names only ``localhost`` counts."""
    try:
        return ipaddress.ip_address(host).is_loopback
    except ValueError:
        return host == "localhost"


def _run(options: argparse.Namespace) -> int:
    for name in _ONE_THREAD:
        os.environ.setdefault(name, "1")
    try:
        folder = _own_metrics_folder()
        settings = Settings.from_environment()
        if options.request_log:
            settings = replace(settings, request_log=True)
        _check_access(options.host or settings.host, options.open or settings.open_access, settings)
        holdings = Holdings(settings)
    except GasapiError as error:
        print(f"gasapi serve: {error}", file=sys.stderr)
        return 2
    _serve(_gunicorn_settings(options, settings), holdings, settings, folder)
    return 0


class _Refused(GasapiError):
    """The service may not start like this."""


def _check_access(host: str, open_access: bool, settings: Settings) -> None:
    if settings.token_file is None and not open_access and not is_loopback(host):
        raise _Refused(
            f"{host} can be reached from other machines: name a file of tokens in GASAPI_TOKEN_FILE (gasapi token makes one), "
            "or say --open to answer everyone"
        )


def _own_metrics_folder() -> Path | None:
    """Return a folder made for the counters, None where the environment names one; the client library looks when imported."""
    if os.environ.get("PROMETHEUS_MULTIPROC_DIR"):
        return None
    folder = Path(tempfile.mkdtemp(prefix="gasapi-metrics-"))
    os.environ["PROMETHEUS_MULTIPROC_DIR"] = str(folder)
    atexit.register(_remove, folder, os.getpid())
    return folder


def _remove(folder: Path, owner: int) -> None:
    if os.getpid() == owner:
        shutil.rmtree(folder, ignore_errors=True)


def _cores() -> int:
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _gunicorn_settings(options: argparse.Namespace, settings: Settings) -> dict[str, Any]:
    host = options.host or settings.host
    port = settings.port if options.port is None else options.port
    return {
        "bind": f"[{host}]:{port}" if ":" in host else f"{host}:{port}",
        "workers": options.workers or settings.workers or min(_cores(), _MOST_WORKERS),
        "worker_class": "gasapi.cli.worker.CooperativeWorker",
        "worker_connections": options.connections,
        "worker_tmp_dir": str(_MEMORY_FOLDER) if os.access(_MEMORY_FOLDER, os.W_OK) else None,
        "keepalive": options.keep_alive,
        "timeout": _SILENCE,
        "graceful_timeout": _GRACE,
        "limit_request_line": _REQUEST_LINE,
        "control_socket_disable": True,
        "proc_name": "gasapi",
        "certfile": str(options.certificate) if options.certificate else None,
        "keyfile": str(options.key) if options.key else None,
    }


def _serve(server_settings: dict[str, Any], holdings: Holdings, settings: Settings, metrics_folder: Path | None) -> None:
    """Run gunicorn in this process until it is told to stop."""
    import gunicorn.http.wsgi
    from gunicorn.app.base import BaseApplication
    from prometheus_client.multiprocess import mark_process_dead

    gunicorn.http.wsgi.SERVER = "gasapi"
    told: list[str] = []

    def post_fork(server: Any, worker: Any) -> None:
        # until a worker has handlers of its own, it would take a signal with those of its master, and stay
        for number in (signal.SIGTERM, signal.SIGINT, signal.SIGQUIT):
            signal.signal(number, signal.SIG_DFL)
        while not server.SIG_QUEUE.empty():
            if server.SIG_QUEUE.get_nowait() in (signal.SIGTERM, signal.SIGINT, signal.SIGQUIT):
                os._exit(0)

    def child_exit(server: Any, worker: Any) -> None:
        mark_process_dead(worker.pid)

    def worker_exit(server: Any, worker: Any) -> None:
        # the interpreter would take locks apart that the event loop has put in place of its own, and complain of it
        if worker.booted:
            logging.shutdown()
            sys.stdout.flush()
            sys.stderr.flush()
            os._exit(0)

    def on_reload(server: Any) -> None:
        for words in told:
            server.log.error("the site file or the token file is not taken, all stays as it was: %s", words)
        told.clear()

    def on_exit(server: Any) -> None:
        if metrics_folder is not None:
            shutil.rmtree(metrics_folder, ignore_errors=True)

    class Server(BaseApplication):
        """gunicorn with settings in place of a command line."""

        started = False

        def load_config(self) -> None:
            """Take the settings; on SIGHUP this is called again."""
            if self.started:
                words = holdings.read_again()
                told.extend([] if words is None else [words])
            self.started = True
            hooks = {
                "post_fork": post_fork,
                "child_exit": child_exit,
                "worker_exit": worker_exit,
                "on_exit": on_exit,
                "on_reload": on_reload,
            }
            for name, value in {**server_settings, **hooks}.items():
                self.cfg.set(name, value)

        def load(self) -> Any:
            """Build the application, in the worker."""
            import gc

            from gasapi.app import create_app

            app = create_app(settings, holdings.context, holdings.tokens)
            # what was built now stays; the collector need not look through it again and again
            gc.collect()
            gc.freeze()
            gc.set_threshold(*_COLLECT_AFTER)
            return app

    Server().run()
