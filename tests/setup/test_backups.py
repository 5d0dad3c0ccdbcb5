"""A copy that can be trusted: taken while others write, checked file by file, put only into an empty home."""

import json
import sqlite3
import threading
from contextlib import closing

import pytest

from labdata import backups
from labdata.errors import Conflict, InvalidInput
from tests.jobs.fleet import Fleet


@pytest.fixture(scope="module")
def home(tmp_path_factory):
    """A home with an account and two files."""
    folder = tmp_path_factory.mktemp("home")
    with Fleet(folder, settings="labdata.settings") as fleet:
        fleet.manage("migrate", "--verbosity=0")
        fleet.manage(
            "shell", "--no-imports", "--command=from labdata.accounts import first_administrator as f; f()",
        )  # fmt: skip
    (folder / "files" / "ab").mkdir(parents=True)
    (folder / "files" / "ab" / "sheet").write_bytes(b"TOC\n1.2\n")
    (folder / "files" / ".half").write_bytes(b"still being written")
    return folder


@pytest.fixture
def run(home):
    def manage(command, target, *, other_home=home):
        fleet = Fleet(other_home, settings="labdata.settings")
        done = fleet.manage(command, str(target), "--json", check=False)
        return done.returncode, json.loads(done.stdout)

    return manage


def test_a_copy_can_be_put_back(run, home, tmp_path):
    status, answer = run("backup", tmp_path / "copy")
    assert (status, sorted(answer["files"])) == (0, ["files/ab/sheet", "kerogate.sqlite3"])
    new = tmp_path / "new"
    new.mkdir()
    assert run("restore", tmp_path / "copy", other_home=new)[0] == 0
    assert (new / "files/ab/sheet").read_bytes() == b"TOC\n1.2\n"
    assert run("audit", "--verbosity=1", other_home=new)[1]["entries"] == 1
    status, answer = run("restore", tmp_path / "copy", other_home=new)
    assert (status, answer["error"]["code"]) == (1, "conflict")


@pytest.mark.parametrize("harm", ["alter", "remove", "add", "manifest"])
def test_a_damaged_copy_is_refused(run, tmp_path, harm):
    copy = tmp_path / "copy"
    run("backup", copy)
    if harm == "alter":
        (copy / "kerogate.sqlite3").write_bytes((copy / "kerogate.sqlite3").read_bytes()[:-1] + b"x")
    elif harm == "remove":
        (copy / "files/ab/sheet").unlink()
    elif harm == "add":
        (copy / "files/ab/other").write_bytes(b"")
    else:
        (copy / "manifest.json").write_text("{")
    new = tmp_path / "new"
    new.mkdir()
    status, answer = run("restore", copy, other_home=new)
    assert (status, answer["error"]["code"]) == (1, "backup_damaged")
    assert not (new / "kerogate.sqlite3").exists()


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
