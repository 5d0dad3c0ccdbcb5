"""Starting, watching and stopping the children."""

import http.client
import json
import os
import signal
import socket
import sys
import threading
import time
from collections import deque
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from types import FrameType

from django.db import connections

from labdata.env import read_environment
from labdata.errors import Conflict, KerogateError
from labdata.jobs.sweeper import republish_all
from labdata.jobs.transport import wipe
from labdata.models import SweeperBeat
from labdata.supervisor.children import Child
from labdata.supervisor.lock import home_lock

HOST = "127.0.0.1"
WORKERS = 2
READY_WITHIN_SECONDS = 90.0
STOP_WITHIN_SECONDS = 4.0
CRASHES, CRASH_SECONDS = 5, 30.0
LOOK_SECONDS = 0.1
SIGNALS = (signal.SIGINT, signal.SIGTERM)


class PortTaken(Conflict):
    """Another program listens on the port."""

    code = "port_taken"


class ServiceFailed(KerogateError):
    """The children do not stay up or do not answer."""

    code = "service_failed"


def announce(url: str) -> None:
    """The line that scripts wait for."""
    print(f"Ready: {url}", flush=True)


def serve(port: int, home: Path, on_ready: Callable[[str], None] = announce) -> None:
    """Run web server and workers on ``home`` until SIGINT or SIGTERM; ``port`` 0 takes a free one.

    ``on_ready`` gets the address once database, web server and worker answer. The schema must be migrated
    (``setup.prepare_home``). Raises PortTaken, Conflict when the home is in use, ServiceFailed when the
    children crash again and again.
    """
    with _stop_signals() as stop, home_lock(home):
        port = _free_port(port)
        _begin_afresh(home)
        children = _children(port, home)
        try:
            for child in children:
                child.start()
            _watch(children, port, stop, on_ready)
        finally:
            _stop(children)


def _begin_afresh(home: Path) -> None:
    """Nothing runs yet: forget messages and signs of life from before, and make every waiting job due."""
    if read_environment().embedded:
        wipe(home / "broker.sqlite3")
        SweeperBeat.objects.all().delete()
        republish_all()
    connections.close_all()


def _children(port: int, home: Path) -> list[Child]:
    environment = {**os.environ, "KEROGATE_HOME": str(home), "DJANGO_SETTINGS_MODULE": _settings_module()}
    web = Child("web", ["web", str(port)], environment)
    return [web, *(Child(f"worker {n}", ["worker", str(n)], environment) for n in range(1, WORKERS + 1))]


def _settings_module() -> str:
    return os.environ.get("DJANGO_SETTINGS_MODULE", "labdata.settings")


@contextmanager
def _stop_signals() -> Iterator[threading.Event]:
    """An event that SIGINT and SIGTERM set, instead of ending this process somewhere."""
    stop = threading.Event()

    def ask(_number: int, _frame: FrameType | None) -> None:
        stop.set()

    before = {number: signal.signal(number, ask) for number in SIGNALS}
    try:
        yield stop
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)


def _free_port(port: int) -> int:
    """``port`` if nobody listens there, or any free one for 0. Raises PortTaken."""
    with socket.socket() as probe:
        if sys.platform != "win32":
            probe.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        try:
            probe.bind((HOST, port))
            probe.listen(1)
        except OSError as error:
            raise PortTaken(
                f"Port {port} cannot be used: {error.strerror}.", remedy="Choose another with --port.", port=port
            ) from None
        return int(probe.getsockname()[1])


def _watch(children: list[Child], port: int, stop: threading.Event, on_ready: Callable[[str], None]) -> None:
    """Restart what crashes, announce once all answer, return when told to stop."""
    crashes: deque[float] = deque(maxlen=CRASHES)
    latest = time.monotonic() + READY_WITHIN_SECONDS
    ready = False
    while not stop.wait(LOOK_SECONDS):
        for child in children:
            _revive(child, crashes)
        if ready:
            continue
        wrong = health(port)
        if not wrong:
            ready = True
            on_ready(f"http://{HOST}:{port}/")
        elif time.monotonic() > latest:
            raise ServiceFailed(f"The service does not answer: {wrong}.", remedy="Its messages stand above.")


def _revive(child: Child, crashes: deque[float]) -> None:
    """Start ``child`` again if it ended. Raises ServiceFailed when that happens too often."""
    status = child.ended()
    if status is None:
        return
    now = time.monotonic()
    crashes.append(now)
    print(f"[{child.name}] ended with status {status}", file=sys.stderr)
    if len(crashes) == CRASHES and now - crashes[0] < CRASH_SECONDS:
        raise ServiceFailed(
            f"{CRASHES} crashes in {now - crashes[0]:.0f} s, the last of the {child.name}.",
            remedy="Its messages stand above.",
        )
    child.start()


def health(port: int) -> str:
    """What /healthz on this machine finds wrong; nothing when all answer."""
    connection = http.client.HTTPConnection(HOST, port, timeout=5)
    try:
        connection.request("GET", "/healthz")
        response = connection.getresponse()
        body = response.read()
        if response.status == http.HTTPStatus.OK:
            return ""
        with suppress(ValueError):
            answer = json.loads(body)
            return "; ".join(f"{part}: {answer[part]}" for part in ("database", "worker") if answer[part] != "ok")
        return f"/healthz answers {response.status}"
    except OSError as error:
        return f"web: {error}"
    finally:
        connection.close()


def _stop(children: list[Child]) -> None:
    """Ask all to stop, and end those that have not after the grace time."""
    for child in children:
        child.ask_to_stop()
    latest = time.monotonic() + STOP_WITHIN_SECONDS
    while any(child.ended() is None for child in children) and time.monotonic() < latest:
        time.sleep(0.05)
    for child in children:
        child.kill()
