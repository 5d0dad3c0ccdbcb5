"""Nothing is left lying: the sweeper finds what dead workers and lost messages leave behind."""

import pytest
from django.utils import timezone

from labdata.jobs import enqueue, sweeper
from labdata.jobs.clock import after
from labdata.jobs.lease import claim
from labdata.models import Job, JobState, SweeperBeat

pytestmark = [pytest.mark.both, pytest.mark.django_db, pytest.mark.usefixtures("probe_kinds")]


@pytest.fixture(autouse=True)
def published(monkeypatch):
    ids = []
    monkeypatch.setattr(sweeper, "publish", lambda job_id: ids.append(job_id) or True)
    return ids


def dead_worker(kind="call", **fields):
    """A running job whose worker no longer answers."""
    job = enqueue(kind, {}, project=None, user=None)
    claim(job.pk)
    Job.objects.filter(pk=job.pk).update(
        lease_until=after(-1), worker="vm:6055", progress_note="reading sheet 3", **fields
    )
    return Job.objects.get(pk=job.pk)


def test_the_job_of_a_dead_worker_is_queued_and_published_again(published):
    job = dead_worker()
    sweeper.sweep()
    job.refresh_from_db()
    assert (job.state, job.attempt, published) == (JobState.QUEUED, 1, [job.pk])
    assert job.events.last().note == "Queued again: the worker (vm:6055) died at step «reading sheet 3»."


def test_a_job_that_kills_its_workers_fails_in_the_end():
    job = dead_worker(attempt=3)
    sweeper.sweep()
    job.refresh_from_db()
    assert (job.state, job.error_code) == (JobState.FAILED, "worker_died")
    assert job.error_message == "Tried 3 times; the last time the worker (vm:6055) died at step «reading sheet 3»."
    assert job.finished_at is not None


def test_a_stuck_job_says_where_it_stuck():
    job = dead_worker(attempt=3, error_code="stalled", error_message="no progress for 4 s at step «before the hang»")
    sweeper.sweep()
    job.refresh_from_db()
    assert job.error_message == "Tried 3 times; the last time no progress for 4 s at step «before the hang»."


def test_a_job_called_off_while_its_worker_died_is_not_begun_again():
    job = dead_worker(cancel_requested=True)
    sweeper.sweep()
    job.refresh_from_db()
    assert job.state == JobState.CANCELLED


def test_a_healthy_worker_is_left_alone():
    job = enqueue("probe", {}, project=None, user=None)
    claim(job.pk)
    sweeper.sweep()
    assert Job.objects.get(pk=job.pk).state == JobState.RUNNING


def test_two_sweepers_act_once(published):
    seen_by_both = dead_worker()
    assert [sweeper.reclaim(seen_by_both), sweeper.reclaim(seen_by_both)] == [True, False]
    queued = Job.objects.get(pk=seen_by_both.pk)
    assert [sweeper.republish(queued), sweeper.republish(queued)] == [True, False]
    assert published == [queued.pk]


def test_a_worker_that_renews_in_time_keeps_its_job():
    job = dead_worker()
    Job.objects.filter(pk=job.pk).update(lease_until=after(60))
    assert not sweeper.reclaim(job)


def test_a_job_never_published_is_published_late_and_then_ever_less_often(published):
    job = enqueue("probe", {}, project=None, user=None)
    sweeper.sweep()
    assert published == []
    waits = []
    for _ in range(3):
        Job.objects.filter(pk=job.pk).update(next_dispatch_at=after(-1))
        sweeper.sweep()
        job.refresh_from_db()
        waits.append(round((job.next_dispatch_at - timezone.now()).total_seconds()))
    assert len(published) == 3
    assert waits == pytest.approx([30, 60, 120], abs=2)


def test_a_sweep_leaves_a_sign_of_life():
    sweeper.sweep()
    sweeper.sweep()
    beat = SweeperBeat.objects.get()
    assert abs((timezone.now() - beat.at).total_seconds()) < 5
