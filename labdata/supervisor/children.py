"""One child process: started, its output passed on line by line, stopped by closing its standard input."""

import os
import signal
import subprocess
import sys
import threading
from collections.abc import Sequence
from contextlib import suppress
from typing import Any

from labdata.env import CHECKOUT


def _own_group() -> dict[str, Any]:
    """A child gets no Ctrl-C of its own: this process decides when it stops."""
    if sys.platform == "win32":
        return {"creationflags": subprocess.CREATE_NEW_PROCESS_GROUP}
    return {"start_new_session": True}


class Child:
    """A web server or worker; ``start`` it again after it ended."""

    def __init__(self, name: str, arguments: Sequence[str], environment: dict[str, str]) -> None:
        self.name = name
        self._arguments = [sys.executable, "-m", "labdata.child", *arguments]
        self._environment = environment
        self._process: subprocess.Popen[bytes] | None = None

    def start(self) -> None:
        """Start the process."""
        self._process = subprocess.Popen(
            self._arguments,
            cwd=CHECKOUT,
            env=self._environment,
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.STDOUT,
            **_own_group(),
        )
        threading.Thread(target=self._pass_on, args=(self._process,), daemon=True).start()

    @property
    def pid(self) -> int:
        """Process number. Raises RuntimeError before the first start."""
        if self._process is None:
            raise RuntimeError(f"{self.name} was not started")
        return self._process.pid

    def ended(self) -> int | None:
        """Its exit status, or None while it runs."""
        return self._process.poll() if self._process else None

    def ask_to_stop(self) -> None:
        """Close its standard input."""
        if self._process and self._process.stdin:
            with suppress(OSError):
                self._process.stdin.close()

    def kill(self) -> None:
        """End it and whatever it started, at once."""
        if self._process is None or self._process.poll() is not None:
            return
        with suppress(ProcessLookupError):
            if sys.platform == "win32":
                self._process.kill()
            else:
                os.killpg(self._process.pid, signal.SIGKILL)
        self._process.wait()

    def _pass_on(self, process: subprocess.Popen[bytes]) -> None:
        """Write the child's lines to stderr with its name in front."""
        if process.stdout is None:
            return
        with process.stdout as lines:
            for line in lines:
                sys.stderr.write(f"[{self.name}] {line.decode(errors='replace')}")
                sys.stderr.flush()
