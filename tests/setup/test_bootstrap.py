"""From a bare machine: which Python will do, where the home is, what is missing, and how a refusal is told."""

import json
import subprocess
import sys

import pytest

from labdata import bootstrap
from labdata.env import CHECKOUT
from labdata.management.commands.test import own_words_off


@pytest.mark.parametrize(("version", "fits"), [
    ((3, 10), False), ((3, 11), True), ((3, 12), True), ((3, 13), True), ((3, 14), False), ((4, 0), False),
])  # fmt: skip
def test_only_the_named_pythons_will_do(version, fits):
    refusal = bootstrap.refuse_python(version)
    assert (refusal == "") == fits
    assert fits or "{}.{}".format(*version) in refusal


@pytest.mark.parametrize(("words", "home"), [
    (["qc", "--home", "/data/a"], "/data/a"),
    (["--home=/data/b c", "qc"], "/data/b c"),
    (["qc", "--home=x", "--home", "y"], "y"),
    (["qc", "--project", "p"], "before"),
])  # fmt: skip
def test_home_is_taken_from_the_line(monkeypatch, words, home):
    monkeypatch.setenv("KEROGATE_HOME", "before")
    assert bootstrap.take_home(["manage.py", *words])
    assert bootstrap.os.environ["KEROGATE_HOME"] == home


@pytest.mark.parametrize("words", [["--home"], ["--home="], ["--home", "--json"]])
def test_home_without_a_folder_is_wrong_usage(monkeypatch, capsys, words):
    monkeypatch.setenv("KEROGATE_HOME", "before")
    assert bootstrap.main(["manage.py", "audit", *words]) == bootstrap.USAGE
    assert "--home needs a folder" in capsys.readouterr().err


LOCK = """
# made by a tool
amqp==5.4.2 \\
    --hash=sha256:00
numpy==2.4.6 ; python_full_version < '3.12' \\
    --hash=sha256:11
numpy==2.5.5 ; python_full_version >= '3.12' \\
    --hash=sha256:22
"""


def test_the_lock_file_is_read():
    assert bootstrap.locked_versions(LOCK) == {"amqp": ({"5.4.2"}, True), "numpy": ({"2.4.6", "2.5.5"}, False)}


def test_every_direct_dependency_is_locked():
    import tomllib  # noqa: PLC0415

    locked = bootstrap.locked_versions(bootstrap.LOCK_FILE.read_text())
    project = tomllib.loads((CHECKOUT / "pyproject.toml").read_text())["project"]
    wanted = project["dependencies"] + project["optional-dependencies"]["test"]
    names = {line.split("[")[0].split(">")[0].split("=")[0].split("<")[0].lower() for line in wanted}
    assert names - locked.keys() == set()


def test_this_environment_has_what_is_locked():
    assert bootstrap.lacking() == []


def test_a_package_in_another_version_is_lacking(monkeypatch, tmp_path):
    lock = tmp_path / "requirements.txt"
    lock.write_text("django==1.0 \\\n    --hash=sha256:00\nnot-there==1 ; sys_platform == 'win32' \\\n")
    monkeypatch.setattr(bootstrap, "LOCK_FILE", lock)
    assert bootstrap.lacking() == ["django"]


def test_a_second_run_that_still_lacks_something_does_not_loop(monkeypatch):
    monkeypatch.setattr(bootstrap, "lacking", lambda: ["django"])
    monkeypatch.setattr(bootstrap, "_stamped", lambda: False)
    monkeypatch.setenv(bootstrap.AGAIN, "1")
    with pytest.raises(bootstrap.SetUpFailed, match="lacks django"):
        bootstrap.set_up()


def test_a_machine_without_network_is_told_what_is_needed(monkeypatch, capsys):
    def no_network():
        raise bootstrap.SetUpFailed("The packages could not be installed: no route to host")

    monkeypatch.setattr(bootstrap, "set_up", no_network)
    assert bootstrap.main(["manage.py", "audit", "--json"]) == bootstrap.REFUSED
    assert json.loads(capsys.readouterr().out)["error"]["code"] == "set_up_failed"


def manage(*words):
    line = [sys.executable, "manage.py", *words]
    return subprocess.run(line, cwd=CHECKOUT, capture_output=True, text=True, check=False)


@pytest.mark.parametrize("words", [[], ["nonsense"], ["audit", "--nonsense"], ["backup"]])
def test_wrong_usage_is_2_and_stdout_holds_only_json(tmp_path, words):
    done = manage(*words, "--json", f"--home={tmp_path}")
    assert done.returncode == 2, done.stderr
    assert json.loads(done.stdout)["error"]["code"] == "usage"
    assert done.stderr


def test_a_command_on_a_new_home_makes_its_database(tmp_path):
    done = manage("audit", "--json", "--home", str(tmp_path / "new home"))
    assert done.returncode == 0, done.stderr
    assert json.loads(done.stdout)["entries"] == 0


def test_an_old_python_parses_what_refuses_it():
    """manage.py and bootstrap.py use no syntax younger than Python 3.7."""
    import ast  # noqa: PLC0415

    for name in ("manage.py", "labdata/bootstrap.py", "labdata/__init__.py"):
        ast.parse((CHECKOUT / name).read_text(), feature_version=(3, 7))


def test_only_our_own_words_are_kept_from_pytest():
    words = ["tests/qc", "--home", "/data", "-k", "home", "--home=/x", "--json"]
    assert own_words_off(words) == ["tests/qc", "-k", "home"]
