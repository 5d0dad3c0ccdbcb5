"""/healthz says which part does not answer, to anybody."""

from datetime import timedelta

import pytest
from django.db import OperationalError
from django.utils import timezone

from labdata import health
from labdata.jobs import enqueue, sweeper
from labdata.models import SweeperBeat

pytestmark = [pytest.mark.both, pytest.mark.django_db]


def test_all_well(client):
    sweeper.sweep()
    enqueue("qc", {}, project=None, user=None)
    response = client.get("/healthz")
    assert response.status_code == 200
    assert {"status": "ok", "database": "ok", "worker": "ok", "queued": 1}.items() <= response.json().items()


def test_no_worker_yet(client):
    response = client.get("/healthz")
    assert (response.status_code, response.json()["worker"]) == (503, "none has started yet")


def test_a_worker_that_fell_silent(client):
    SweeperBeat.objects.create(worker="vm:1", at=timezone.now() - timedelta(seconds=100))
    response = client.get("/healthz")
    assert response.status_code == 503
    assert response.json()["worker"] == "none has reported for 100 s"
    assert response.json()["database"] == "ok"


def test_a_database_that_does_not_answer(client, monkeypatch):
    def away():
        raise OperationalError("connection refused")

    monkeypatch.setattr(health, "worker_state", away)
    response = client.get("/healthz")
    assert (response.status_code, response.json()["database"]) == (503, "does not answer: connection refused")


def test_only_read(client):
    assert client.post("/healthz").status_code == 405
