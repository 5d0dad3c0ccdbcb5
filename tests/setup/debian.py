"""The Debian packages that the tests need. Installed as root on Debian; elsewhere only named."""

import os
import shutil
import subprocess
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from tests.setup import servers
from tests.setup.services import find_chromium

POLICY = Path("/usr/sbin/policy-rc.d")
PACKAGES: dict[str, Callable[[], object]] = {
    "chromium": find_chromium,
    "fonts-dejavu-core": lambda: list(Path("/usr/share/fonts").rglob("DejaVuSans.ttf")),
    "postgresql": servers.find_postgresql,
    "redis-server": servers.find_redis,
    "rabbitmq-server": servers.find_rabbitmq,
}


def missing() -> list[str]:
    """Packages whose programs are not on this machine."""
    return [package for package, find in PACKAGES.items() if not find()]


def may_install() -> bool:
    """True as root on Debian and its kin."""
    return bool(shutil.which("apt-get")) and hasattr(os, "geteuid") and os.geteuid() == 0


def install(packages: list[str], say: Callable[[str], None]) -> None:
    """Install ``packages`` without starting their services. What fails is told; the tests that need it are left out."""
    environment = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
    with _no_services():
        for what, line in (
            ("Reading the list of Debian packages", ["apt-get", "update", "-q"]),
            (
                f"Installing {', '.join(packages)}",
                ["apt-get", "install", "-q", "-y", "--no-install-recommends", *packages],
            ),
        ):
            say(f"{what}.")
            done = subprocess.run(line, env=environment, capture_output=True, text=True, check=False)
            if done.returncode:
                say(f"{' '.join(line[:2])} failed: {(done.stderr or done.stdout).strip()[-1500:]}")


@contextmanager
def _no_services() -> Iterator[None]:
    """Debian asks this file before it starts a service; ours says no, and goes away again."""
    if POLICY.exists():
        yield
        return
    POLICY.write_text("#!/bin/sh\nexit 101\n")
    POLICY.chmod(0o755)
    try:
        yield
    finally:
        POLICY.unlink(missing_ok=True)
