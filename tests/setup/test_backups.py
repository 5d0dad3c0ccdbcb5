"""A copy that can be trusted: taken while others write, checked file by file, put only into an empty home."""

import json
import shutil
import sqlite3
import threading
from contextlib import closing

import pytest

from labdata import backups
from labdata.errors import Conflict, InvalidInput
from tests.jobs.fleet import Fleet


@pytest.fixture(scope="module")
def home(first_home, tmp_path_factory):
    """A home with an account and two files."""
    folder = shutil.copytree(first_home, tmp_path_factory.mktemp("kept") / "home")
    (folder / "files" / "ab").mkdir(parents=True)
    (folder / "files" / "ab" / "sheet").write_bytes(b"TOC\n1.2\n")
    (folder / "files" / ".half").write_bytes(b"still being written")
    return folder


def run(home, *words):
    """Exit status and JSON answer of one command on ``home``."""
    done = Fleet(home, settings="labdata.settings").manage(*words, "--json", check=False)
    return done.returncode, json.loads(done.stdout)


@pytest.fixture(scope="module")
def copy(home, tmp_path_factory):
    """A copy that the command made."""
    target = tmp_path_factory.mktemp("copies") / "copy"
    status, answer = run(home, "backup", str(target))
    assert (status, sorted(answer["files"])) == (0, ["files/ab/sheet", "kerogate.sqlite3"])
    return target


def test_a_copy_can_be_put_back_into_an_empty_home_only(copy, tmp_path):
    assert run(tmp_path, "restore", str(copy))[0] == 0
    assert (tmp_path / "files/ab/sheet").read_bytes() == b"TOC\n1.2\n"
    assert run(tmp_path, "audit")[1]["entries"] == 1
    status, answer = run(tmp_path, "restore", str(copy))
    assert (status, answer["error"]["code"]) == (1, "conflict")


def test_a_home_with_anything_in_it_is_not_empty(copy, tmp_path):
    (tmp_path / "notes.txt").write_text("mine")
    status, answer = run(tmp_path, "restore", str(copy))
    assert (status, answer["error"]["code"]) == (1, "conflict")
    assert "notes.txt" in answer["error"]["message"]
    assert not (tmp_path / "kerogate.sqlite3").exists()


def test_a_damaged_copy_leaves_the_home_empty(copy, tmp_path):
    damaged = shutil.copytree(copy, tmp_path / "copy")
    (damaged / "files/ab/sheet").unlink()
    new = tmp_path / "new"
    new.mkdir()
    status, answer = run(new, "restore", str(damaged))
    assert (status, answer["error"]["code"]) == (1, "backup_damaged")
    assert not (new / "kerogate.sqlite3").exists()


@pytest.mark.parametrize("harm", ["alter", "remove", "add", "manifest"])
def test_every_damage_is_seen(copy, tmp_path, harm):
    damaged = shutil.copytree(copy, tmp_path / "copy")
    backups.verify(damaged)
    if harm == "alter":
        (damaged / "kerogate.sqlite3").write_bytes((damaged / "kerogate.sqlite3").read_bytes()[:-1] + b"x")
    elif harm == "remove":
        (damaged / "files/ab/sheet").unlink()
    elif harm == "add":
        (damaged / "files/ab/other").write_bytes(b"")
    else:
        (damaged / "manifest.json").write_text("{")
    with pytest.raises(backups.BackupDamaged):
        backups.verify(damaged)


def test_a_full_folder_is_not_written_to(tmp_path):
    (tmp_path / "something").write_text("mine")
    with pytest.raises(InvalidInput):
        backups.back_up(tmp_path)


def test_a_database_in_use_is_copied_whole(tmp_path):
    """Every row comes in a pair, one transaction each; a copy never holds half of one."""
    source = tmp_path / "live.sqlite3"
    with closing(sqlite3.connect(source)) as made:
        made.executescript("PRAGMA journal_mode=WAL; CREATE TABLE pair (n INTEGER)")
    stop = threading.Event()

    def write():
        with closing(sqlite3.connect(source, timeout=20)) as connection:
            number = 0
            while not stop.is_set():
                with connection:
                    connection.executemany("INSERT INTO pair VALUES (?)", [(number,), (number,)])
                number += 1

    writer = threading.Thread(target=write)
    writer.start()
    try:
        for number in range(5):
            backups.copy_sqlite(source, tmp_path / f"copy{number}.sqlite3")
    finally:
        stop.set()
        writer.join()
    for number in range(5):
        with closing(sqlite3.connect(tmp_path / f"copy{number}.sqlite3")) as copy:
            assert copy.execute("SELECT COUNT(*) % 2 FROM pair").fetchone() == (0,)


def test_a_newer_database_is_not_touched(settings, db):
    from django.db.migrations.recorder import MigrationRecorder  # noqa: PLC0415

    from labdata.supervisor.setup import migrate  # noqa: PLC0415

    MigrationRecorder.Migration.objects.create(app="labdata", name="9999_from_the_future")
    with pytest.raises(Conflict, match="another version"):
        migrate(settings.HOME, print)
