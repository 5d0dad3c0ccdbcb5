"""From a bare machine to a running command, with nothing but Python itself.

Imports no library and no Django, and parses on older Pythons too, so that they are refused clearly. The locked
dependencies go into ``.venv/`` beside manage.py; the command then runs again there.
"""

from __future__ import annotations

import hashlib
import json
import os
import shutil
import subprocess
import sys
from pathlib import Path

OLDEST, NEWEST = (3, 11), (3, 13)
CHECKOUT = Path(__file__).resolve().parent.parent
VENV = CHECKOUT / ".venv"
LOCK_FILE = CHECKOUT / "requirements.txt"
STAMP = "requirements.sha256"
SET_UP_LOCK = "set-up.lock"
AGAIN = "KEROGATE_SET_UP"  # set for the second run, which must not set up once more
DONE, REFUSED, USAGE = 0, 1, 2
OWN_SCHEMA = {"test", "up", "demo", "restore", "bench"}  # commands that prepare their home themselves, or need none


class SetUpFailed(Exception):
    """Why the dependencies could not be installed, and what would do."""


def main(argv: list[str]) -> int:
    """Run the command of ``argv`` with the locked dependencies. Returns the exit status."""
    refusal = refuse_python(sys.version_info[:2])
    if refusal:
        return _end(argv, "python_version", refusal, USAGE)
    if not take_home(argv):
        return _end(argv, "usage", "--home needs a folder.", USAGE)
    try:
        python = set_up()
    except SetUpFailed as failure:
        return _end(argv, "set_up_failed", str(failure), REFUSED)
    return run_again(python, argv) if python else run_command(argv)


def refuse_python(version: tuple[int, ...]) -> str:
    """Why this Python will not do, or nothing."""
    if OLDEST <= version <= NEWEST:
        return ""
    return "Python {}.{} to {}.{} is needed; this is {}.{}.".format(*OLDEST, *NEWEST, *version)


def take_home(argv: list[str]) -> bool:
    """Put ``--home DIR`` into KEROGATE_HOME: settings are read before a command sees its arguments.

    Returns False when the folder is missing from the line.
    """
    for position, word in enumerate(argv):
        given = None
        if word == "--home":
            given = argv[position + 1] if position + 1 < len(argv) else ""
        elif word.startswith("--home="):
            given = word.partition("=")[2]
        if given is not None:
            if not given or given.startswith("--"):
                return False
            os.environ["KEROGATE_HOME"] = given
    return True


def set_up() -> Path | None:
    """Make sure that the locked dependencies can be had.

    Returns the Python to run the command with, or None when this one has them. Raises SetUpFailed.
    """
    if _stamped() and Path(sys.prefix).resolve() == VENV.resolve():
        return None
    lacking_here = lacking()
    if not lacking_here:
        return None
    if os.environ.get(AGAIN):
        raise SetUpFailed(f"{VENV} lacks {', '.join(lacking_here[:5])}. Remove the folder and try again.")
    if not _stamped():
        _install()
    return venv_python()


def lacking() -> list[str]:
    """Locked dependencies that this interpreter does not have in a locked version.

    A line with a marker may not concern this machine: its package may be absent.
    """
    from importlib import metadata  # noqa: PLC0415 - after the version check

    missing = []
    for name, (versions, needed) in locked_versions(LOCK_FILE.read_text(encoding="utf-8")).items():
        try:
            if metadata.version(name) not in versions:
                missing.append(name)
        except metadata.PackageNotFoundError:
            if needed:
                missing.append(name)
    return missing


def locked_versions(text: str) -> dict[str, tuple[set[str], bool]]:
    """Of each package in a lock file: the versions named, and whether every machine needs it."""
    packages: dict[str, tuple[set[str], bool]] = {}
    for line in text.splitlines():
        requirement, _, marker = line.rstrip(" \\").partition(";")
        name, pin, version = requirement.partition("==")
        if pin and not line.startswith((" ", "#")):
            versions, needed = packages.get(name.strip(), (set(), False))
            packages[name.strip()] = (versions | {version.strip()}, needed or not marker)
    return packages


def venv_python() -> Path:
    """The interpreter inside ``.venv/``."""
    return VENV / ("Scripts/python.exe" if os.name == "nt" else "bin/python")


def run_again(python: Path, argv: list[str]) -> int:
    """Run the same line with ``python``; on POSIX this process becomes it."""
    os.environ[AGAIN] = "1"
    line = [str(python), str(CHECKOUT / "manage.py"), *argv[1:]]
    sys.stdout.flush()
    sys.stderr.flush()
    if os.name != "nt":
        os.execv(line[0], line)
    return subprocess.call(line)


def run_command(argv: list[str]) -> int:
    """Hand over to Django. Wrong usage is 2, whoever finds it."""
    os.environ.pop(AGAIN, None)
    os.environ.setdefault("DJANGO_SETTINGS_MODULE", "labdata.settings")
    import django  # noqa: PLC0415
    from django.core.management import execute_from_command_line, get_commands  # noqa: PLC0415

    django.setup()
    ours = sorted(name for name, app in get_commands().items() if app in {"labdata", "qc"})
    command = argv[1] if len(argv) > 1 else ""
    if command not in {*get_commands(), "help", "--help", "-h", "--version"}:
        found = f"There is no command «{command}»." if command else "No command is named."
        return _end(argv, "usage", f"{found} Commands: {', '.join(ours)}.", USAGE)
    try:
        if command in ours and command not in OWN_SCHEMA and not {"-h", "--help"} & set(argv):
            _prepare_schema()
        execute_from_command_line(argv)
    except SystemExit as leaving:
        if leaving.code == USAGE and "--json" in argv:
            return _end(argv, "usage", "Wrong usage; stderr says how it is used.", USAGE, told=True)
        raise
    except KeyboardInterrupt:
        return _end(argv, "interrupted", "Interrupted.", 130)
    return DONE


def _prepare_schema() -> None:
    """A command on a new home makes its database first."""
    from labdata.errors import KerogateError  # noqa: PLC0415
    from labdata.supervisor.setup import prepare_schema  # noqa: PLC0415

    try:
        prepare_schema(_say)
    except KerogateError as refusal:
        sys.exit(_end(sys.argv, refusal.code, str(refusal), REFUSED))


def _end(argv: list[str], code: str, message: str, status: int, *, told: bool = False) -> int:
    """Say why nothing was done, and the same as JSON where that was asked for."""
    if not told:
        _say(message)
    if "--json" in argv:
        print(json.dumps({"error": {"code": code, "message": message}}, ensure_ascii=False))
    return status


def _say(text: str) -> None:
    print(text, file=sys.stderr, flush=True)


def _fingerprint() -> str:
    """What ``.venv/`` was made for: this lock and this minor version of Python."""
    version = "{}.{}".format(*sys.version_info[:2])
    return hashlib.sha256(LOCK_FILE.read_bytes() + version.encode()).hexdigest()


def _stamped() -> bool:
    try:
        return (VENV / STAMP).read_text(encoding="ascii") == _fingerprint() and venv_python().exists()
    except OSError:
        return False


def _install() -> None:
    """Fill ``.venv/``; runs at the same time wait for the first one. Raises SetUpFailed."""
    from labdata.locks import locked  # noqa: PLC0415 - after the version check

    with locked(VENV / SET_UP_LOCK, wait=True):
        if _stamped():
            return
        _make_venv()
        if _lacks_packages():
            count = len(locked_versions(LOCK_FILE.read_text(encoding="utf-8")))
            _say(f"Installing {count} packages of requirements.txt into {VENV}; this takes a minute or two.")
            _pip("install", "--require-hashes", "--quiet", "-r", str(LOCK_FILE))
        (VENV / STAMP).write_text(_fingerprint(), encoding="ascii")
        _say("The dependencies are installed.")


def _make_venv() -> None:
    """Make ``.venv/`` unless it is there and of this Python."""
    version = "{}.{}".format(*sys.version_info[:2])
    if (
        venv_python().exists()
        and _output(venv_python(), "import sys; print('%d.%d' % sys.version_info[:2])") == version
    ):
        return
    _need_ensurepip(version)
    _say(f"Making {VENV} with Python {version}.")
    _forget_other_python()
    done = subprocess.run([sys.executable, "-m", "venv", str(VENV)], capture_output=True, text=True, check=False)
    if done.returncode:
        raise SetUpFailed(f"{VENV} could not be made: {(done.stderr or done.stdout).strip()}")


def _forget_other_python() -> None:
    """Empty ``.venv/`` of another Python's packages; the lock file in it stays."""
    for entry in VENV.iterdir():
        if entry.name != SET_UP_LOCK:
            shutil.rmtree(entry) if entry.is_dir() and not entry.is_symlink() else entry.unlink()


def _need_ensurepip(version: str) -> None:
    """Debian ships Python without it. As root it is installed, else the command is named. Raises SetUpFailed."""
    from importlib.util import find_spec  # noqa: PLC0415

    if find_spec("ensurepip"):
        return
    package = f"python{version}-venv"
    advice = f"This Python cannot make virtual environments. Install it: apt-get install {package}"
    if not (Path("/etc/debian_version").exists() and hasattr(os, "geteuid") and os.geteuid() == 0):
        raise SetUpFailed(advice)
    _say(f"Installing the Debian package {package}.")
    environment = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
    for line in (["apt-get", "update", "-q"], ["apt-get", "install", "-q", "-y", package]):
        done = subprocess.run(line, env=environment, capture_output=True, text=True, check=False)
    if done.returncode:
        raise SetUpFailed(f"{advice}\n{done.stderr.strip()}")


def _lacks_packages() -> bool:
    """Ask the environment itself."""
    code = "from labdata.bootstrap import lacking; print(len(lacking()))"
    return _output(venv_python(), code) != "0"


def _output(python: Path, code: str) -> str:
    done = subprocess.run([str(python), "-c", code], cwd=CHECKOUT, capture_output=True, text=True, check=False)
    return done.stdout.strip()


def _pip(*arguments: str) -> None:
    """Run pip inside ``.venv/``, keeping nothing outside the checkout. Raises SetUpFailed with what pip said."""
    line = [str(venv_python()), "-m", "pip", "--no-cache-dir", "--disable-pip-version-check", "--no-input", *arguments]
    done = subprocess.run(line, cwd=CHECKOUT, capture_output=True, text=True, check=False)
    if done.returncode:
        raise SetUpFailed(
            f"The packages could not be installed: {(done.stderr or done.stdout).strip()[-2000:]}\n"
            "A network connection to a package index is needed the first time."
        )
