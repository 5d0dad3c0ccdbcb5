"""Asking for work: with the change or not at all, once per key, and never lost for want of a broker."""

import pytest
from django.db import transaction

from labdata.errors import Conflict
from labdata.jobs import enqueue, outbox
from labdata.models import Job, JobState
from tests.factories import ProjectFactory

pytestmark = [pytest.mark.both, pytest.mark.django_db, pytest.mark.usefixtures("probe_kinds")]


@pytest.fixture
def published(monkeypatch):
    ids = []
    monkeypatch.setattr(outbox.run_job, "apply_async", lambda args, retry: ids.append(args[0]))
    return ids


def test_a_job_is_published_when_its_transaction_commits(published, django_capture_on_commit_callbacks):
    with django_capture_on_commit_callbacks(execute=True):
        job = enqueue("probe", {"n": 1}, project=None, user=None)
        assert published == []
    assert published == [str(job.pk)]
    assert [(e.from_state, e.to_state) for e in job.events.all()] == [("", "queued")]


def test_a_change_rolled_back_takes_its_job_along(published, transactional_db):
    with pytest.raises(ZeroDivisionError), transaction.atomic():
        enqueue("probe", {}, project=None, user=None)
        raise ZeroDivisionError
    assert published == []
    assert not Job.objects.exists()


def test_a_dead_broker_does_not_lose_the_job(monkeypatch, django_capture_on_commit_callbacks):
    def refuse(*_, **__):
        raise ConnectionRefusedError("no broker")

    monkeypatch.setattr(outbox.run_job, "apply_async", refuse)
    with django_capture_on_commit_callbacks(execute=True):
        job = enqueue("probe", {}, project=None, user=None)
    assert Job.objects.get(pk=job.pk).state == JobState.QUEUED


def test_the_same_request_twice_is_one_job_even_after_it_ended():
    first = enqueue("probe", {}, project=None, user=None, idem_key="file-1")
    Job.objects.filter(pk=first.pk).update(state=JobState.SUCCEEDED)
    assert enqueue("probe", {}, project=None, user=None, idem_key="file-1").pk == first.pk


def test_a_dedupe_key_holds_only_while_the_job_lives():
    first = enqueue("probe", {}, project=None, user=None, dedupe_key="well 7")
    assert enqueue("probe", {}, project=None, user=None, dedupe_key="well 7").pk == first.pk
    Job.objects.filter(pk=first.pk).update(state=JobState.SUCCEEDED)
    assert enqueue("probe", {}, project=None, user=None, dedupe_key="well 7").pk != first.pk


def test_a_key_of_another_project_is_refused_not_answered():
    enqueue("probe", {}, project=ProjectFactory(), user=None, idem_key="k")
    with pytest.raises(Conflict):
        enqueue("probe", {}, project=ProjectFactory(), user=None, idem_key="k")


def test_an_unknown_kind_is_named():
    with pytest.raises(ValueError, match="no kind of job «sorting»"):
        enqueue("sorting", {}, project=None, user=None)
