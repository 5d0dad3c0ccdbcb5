"""Who has a job: one worker at a time, and a worker that lost it writes nothing."""

import time

import pytest

from labdata.jobs import JobError, enqueue, request_cancel, run_all_here, run_here, sweeper
from labdata.jobs.clock import after
from labdata.jobs.context import LeaseLost
from labdata.jobs.lease import claim
from labdata.jobs.runner import run
from labdata.models import AuditEntry, Job, JobState
from tests.factories import MembershipFactory, UserFactory
from tests.jobs import probes

pytestmark = [pytest.mark.both, pytest.mark.django_db, pytest.mark.usefixtures("probe_table")]


def queue(kind="probe", user=None, project=None, **params):
    return enqueue(kind, params, project=project, user=user)


def call(function):
    """A job whose body is ``function``."""
    probes.CALLS["it"] = function
    return queue("call", name="it")


def let_lapse(job):
    Job.objects.filter(pk=job.pk).update(lease_until=after(-1))


def test_a_job_is_claimed_once():
    job = queue()
    assert claim(job.pk) is not None
    assert claim(job.pk) is None


def test_a_job_runs_and_keeps_its_answer():
    job = run_here(queue())
    assert (job.state, job.result, job.attempt) == (JobState.SUCCEEDED, {"attempt": 1}, 1)
    assert probes.effects() == {str(job.pk): 1}
    assert [e.to_state for e in job.events.all()] == ["queued", "running", "succeeded"]
    assert job.finished_at >= job.started_at
    assert (job.progress_done, job.progress_total) == (4, 4)


def test_the_late_end_of_a_worker_that_lost_its_job_is_not_written():
    job = queue()
    late = claim(job.pk)
    let_lapse(job)
    sweeper.sweep()
    run_here(job)
    run(late)
    assert probes.effects() == {str(job.pk): 1}
    job.refresh_from_db()
    assert (job.state, job.attempt) == (JobState.SUCCEEDED, 2)


@pytest.mark.parametrize("end", [
    lambda lease: lease.succeed(dict),
    lambda lease: lease.fail("x", "y"),
    lambda lease: lease.cancel(),
    lambda lease: lease.hand_back("z"),
    lambda lease: lease.give_up("w"),
    lambda lease: lease.renew(1, 2, "v"),
])  # fmt: skip
def test_every_write_is_fenced(end):
    job = queue()
    late = claim(job.pk)
    let_lapse(job)
    sweeper.sweep()
    with pytest.raises(LeaseLost):
        end(late)
    assert Job.objects.get(pk=job.pk).state == JobState.QUEUED


def test_a_commit_that_fails_leaves_nothing():
    def body(ctx):
        def commit():
            probes._effect(ctx)()
            raise JobError("conflict", "The report has changed meanwhile.")

        return commit

    job = run_here(call(body))
    assert (job.state, job.error_code, job.error_message) == (
        "failed", "conflict", "The report has changed meanwhile."
    )  # fmt: skip
    assert probes.effects() == {}


def test_a_refusal_is_shown_as_it_stands():
    job = run_here(queue("refuse"))
    assert (job.state, job.error_code, job.attempt) == (JobState.FAILED, "no_well_column", 1)
    assert job.error_message == "Sheet «Raw» has no column «Well» (row 1)."
    assert job.error_detail == ""


def test_a_bug_is_told_as_one_with_the_traceback_for_staff():
    job = run_here(queue("break"))
    assert job.error_message == "Internal error: KeyError: 'missing'"
    assert "break_down" in job.error_detail


def test_a_worker_told_to_stop_hands_its_job_back():
    def body(ctx):
        raise KeyboardInterrupt

    job = call(body)
    with pytest.raises(KeyboardInterrupt):
        run_here(job)
    job.refresh_from_db()
    assert (job.state, job.attempt) == (JobState.QUEUED, 0)


def test_cancelling_a_waiting_job_is_immediate():
    user = UserFactory()
    job = request_cancel(queue(user=user), user)
    assert (job.state, job.error_message) == ("cancelled", f"Cancelled by {user} before it began.")
    assert claim(job.pk) is None
    assert AuditEntry.objects.get().action == "job.cancelled"


def test_cancelling_a_running_job_stops_it_at_its_next_tick():
    user = UserFactory()

    def body(ctx):
        ctx.tick(note="first")
        request_cancel(ctx.job, user)
        ctx.tick(note="second")

    job = call(body)
    Job.objects.filter(pk=job.pk).update(created_by=user)
    job = run_here(job)
    assert (job.state, job.error_message) == ("cancelled", "Cancelled while it ran; nothing was written.")
    assert probes.effects() == {}


def test_cancelling_too_late_changes_nothing():
    user = UserFactory()
    job = run_here(queue(user=user))
    assert request_cancel(job, user).state == JobState.SUCCEEDED
    assert not AuditEntry.objects.exists()


def test_only_author_and_administrators_may_cancel():
    member = MembershipFactory()
    from labdata.errors import NotAllowed, NotFound  # noqa: PLC0415

    job = queue(project=member.project, user=UserFactory())
    with pytest.raises(NotAllowed):
        request_cancel(job, member.user)
    with pytest.raises(NotFound):
        request_cancel(job, UserFactory())
    assert request_cancel(job, MembershipFactory(project=member.project, role="administrator").user).settled


def test_jobs_queued_by_jobs_are_run_too():
    def body(ctx):
        return lambda: {"next": str(queue().pk)}

    done = run_all_here() if call(body) else []
    assert [job.kind for job in done] == ["call", "probe"]
    assert all(job.state == JobState.SUCCEEDED for job in done)


def test_the_database_away_is_no_failure_of_the_job():
    from django.db import OperationalError  # noqa: PLC0415

    def body(ctx):
        raise OperationalError("server closed the connection")

    job = call(body)
    run(claim(job.pk))
    job.refresh_from_db()
    assert (job.state, job.attempt, job.error_code) == (JobState.QUEUED, 1, "database")
    run(claim(job.pk))
    run(claim(job.pk))
    job.refresh_from_db()
    assert (job.state, job.error_message) == (
        "failed", "The database could not be used: server closed the connection"
    )  # fmt: skip


def test_a_step_may_take_its_time():
    seen = []

    def body(ctx):
        ctx._allowed = 0.01
        with ctx.step("one long call", allow=60):
            time.sleep(0.05)
            seen.append(ctx.stalled())
        time.sleep(0.05)
        seen.append(ctx.stalled())

    assert run_here(call(body)).state == JobState.SUCCEEDED
    assert seen == ["", "no progress for 0 s at step «one long call»"]
