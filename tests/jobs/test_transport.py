"""The message file itself: order, one receiver each, nothing kept, no file name that breaks it."""

import sqlite3
import threading

import kombu
import pytest

from labdata.celery import EMBEDDED_SCHEME, broker
from labdata.env import read_environment
from labdata.jobs import transport


def connect(path):
    return kombu.Connection(f"{EMBEDDED_SCHEME}://", transport_options={"path": str(path)})


def take_all(path, into):
    with connect(path) as connection, connection.SimpleQueue("jobs") as queue:
        while True:
            try:
                message = queue.get(timeout=0.3)
            except queue.Empty:
                return
            into.append(message.payload["n"])
            message.ack()


def put(path, count):
    with connect(path) as connection, connection.SimpleQueue("jobs") as queue:
        for number in range(count):
            queue.put({"n": number})


@pytest.mark.parametrize("name", ["plain", "a b", "100% #1?x=y", 'it\'s "so"', "a;b", "größe+☃", "sqlite:///x@y:z"])
def test_messages_arrive_in_order_whatever_the_folder_is_called(tmp_path, name):
    path = tmp_path / name.replace("/", "_") / "broker.sqlite3"
    path.parent.mkdir()
    put(path, 5)
    got = []
    take_all(path, got)
    assert got == [0, 1, 2, 3, 4]


def test_each_message_goes_to_one_receiver_and_is_deleted(tmp_path):
    path = tmp_path / "broker.sqlite3"
    put(path, 60)
    got = [[], [], []]
    threads = [threading.Thread(target=take_all, args=(path, mine)) for mine in got]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert sorted(number for mine in got for number in mine) == list(range(60))
    assert sqlite3.connect(path).execute("SELECT COUNT(*) FROM message").fetchone() == (0,)


def test_an_unreadable_message_is_dropped_and_the_next_delivered(tmp_path):
    path = tmp_path / "broker.sqlite3"
    put(path, 1)
    with sqlite3.connect(path) as file:
        file.execute("INSERT INTO message (id, queue, payload) VALUES (-1, 'jobs', '{')")
    got = []
    take_all(path, got)
    assert got == [0]


def test_purge_counts(tmp_path):
    path = tmp_path / "broker.sqlite3"
    put(path, 3)
    with connect(path) as connection:
        channel = connection.default_channel
        assert (channel._size("jobs"), channel._purge("jobs"), channel._size("jobs")) == (3, 3, 0)


def test_wipe_forgets_the_file_and_its_companions(tmp_path):
    path = tmp_path / "broker.sqlite3"
    put(path, 1)
    transport.wipe(path)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(("url", "options"), [
    ("", {"path"}), ("redis://h/0", {"global_keyprefix", "visibility_timeout"}), ("amqp://h//", {"confirm_publish"}),
])  # fmt: skip
def test_every_broker_has_its_options(monkeypatch, url, options):
    monkeypatch.setenv("CELERY_BROKER_URL", url)
    monkeypatch.setenv("KEROGATE_INSTALLATION", "north")
    settings = broker(read_environment())
    assert set(settings["broker_transport_options"]) == options
    assert settings["task_default_queue"] == "north.jobs"
