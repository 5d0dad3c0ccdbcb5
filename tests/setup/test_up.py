"""``manage.py up``: ready when all answer, mended when a part dies, gone without a trace within five seconds."""

import http.client
import json
import os
import re
import signal
import socket
import subprocess
import sys
import time
from contextlib import suppress
from pathlib import Path

import pytest

from labdata.env import CHECKOUT

STOP_SECONDS = 5


class Service:
    """One running ``manage.py up``."""

    def __init__(self, home: Path, *words: str):
        environment = {name: value for name, value in os.environ.items() if not name.startswith(("PYTEST", "DATABASE"))}
        environment |= {"KEROGATE_SWEEP": "1", "KEROGATE_ADMIN_PASSWORD": "a long enough phrase"}
        self.log = (home.parent / f"{home.name}.log").open("w+")
        line = [sys.executable, "manage.py", "up", "--home", str(home), "--port", "0", *words]
        self.process = subprocess.Popen(
            line, cwd=CHECKOUT, env=environment, stdout=subprocess.PIPE, stderr=self.log, text=True
        )
        self.said = self.process.stdout.readline()
        assert self.said, Path(self.log.name).read_text()
        self.port = int(re.search(r":(\d+)/", self.said)[1])

    def get(self, path: str) -> tuple[int, bytes]:
        connection = http.client.HTTPConnection("127.0.0.1", self.port, timeout=10)
        with suppress(ConnectionError):
            connection.request("GET", path)
            response = connection.getresponse()
            return response.status, response.read()
        return 0, b""

    def children(self) -> dict[int, str]:
        """Process number -> command line of every child, and of those that outlived their parent."""
        found = {}
        for folder in Path("/proc").glob("[0-9]*"):
            with suppress(OSError):
                line = (folder / "cmdline").read_bytes().decode().split("\0")
                home = f"KEROGATE_HOME={self.home}".encode()
                if "labdata.child" in line and home in (folder / "environ").read_bytes().split(b"\0"):
                    found[int(folder.name)] = " ".join(line[3:]).strip()
        return found

    @property
    def home(self) -> str:
        return self.process.args[self.process.args.index("--home") + 1]


@pytest.fixture
def service(ready_home):
    started = Service(ready_home)
    yield started
    started.process.kill()
    started.process.wait()
    for child in started.children():
        os.kill(child, signal.SIGKILL)


def wait_until(condition, seconds):
    latest = time.monotonic() + seconds
    while not condition():
        assert time.monotonic() < latest, f"still not so after {seconds} s"
        time.sleep(0.05)


def test_up_serves_mends_itself_and_stops(service):
    assert re.fullmatch(r"Ready: http://127\.0\.0\.1:\d+/\n", service.said)
    status, body = service.get("/healthz")
    assert (status, json.loads(body)["status"]) == (200, "ok")
    children = service.children()
    assert sorted(line.split()[0] for line in children.values()) == ["web", "worker", "worker"]
    refuse_a_second_one(service)
    for killed in children:
        os.kill(killed, signal.SIGKILL)
    wait_until(lambda: len(service.children().keys() - children.keys()) == len(children), 10)
    wait_until(lambda: service.get("/healthz")[0] == 200, 20)
    began = time.monotonic()
    service.process.send_signal(signal.SIGTERM)
    assert service.process.wait(STOP_SECONDS) == 0
    assert time.monotonic() - began < STOP_SECONDS
    assert service.children() == {}


def refuse_a_second_one(service):
    line = [sys.executable, "manage.py", "up", "--home", service.home, "--json"]
    second = subprocess.run(line, cwd=CHECKOUT, capture_output=True, text=True, check=False)
    assert second.returncode == 1
    assert "already runs" in json.loads(second.stdout)["error"]["message"]


def test_children_end_with_a_supervisor_that_was_killed(service):
    service.process.kill()
    service.process.wait()
    wait_until(lambda: service.children() == {}, STOP_SECONDS)


def test_a_taken_port_is_told(ready_home):
    with socket.socket() as other:
        other.bind(("127.0.0.1", 0))
        other.listen()
        line = [sys.executable, "manage.py", "up", "--home", str(ready_home), "--port", str(other.getsockname()[1])]
        done = subprocess.run(line, cwd=CHECKOUT, capture_output=True, text=True, check=False)
    assert done.returncode == 1
    assert "cannot be used" in done.stderr
    assert "Choose another with --port" in done.stderr
    assert done.stdout == ""
