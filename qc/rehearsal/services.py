"""Ask for a rehearsal, carry it out as a job, find the last one. The answer is kept with the job, nowhere else."""

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from django.contrib.auth.models import User
from django.db import transaction

from labdata.access import Action, require
from labdata.jobs import JobContext, JobError, enqueue
from labdata.models import Analysis, Job, JobState, Project, Well
from qc.models import Decision, Flag, FlagAnswer, Verdict
from qc.rehearsal.run import REPEATS, Terms, rehearse
from qc.rulesets import effective_rule_set
from qc.services import dismissed, rock
from qc.tables import read

SEED = 1
ANALYSES_MAX = 4000  # the copy stays small enough that a rehearsal ends within minutes


def start_rehearsal(project: Project, user: User | None, *, seed: int = SEED, repeats: int = REPEATS) -> Job:
    """Enqueue a rehearsal; one that waits or runs already is returned. ``user`` None is the service itself."""
    if user is not None:
        require(user, project, Action.RUN_QC)
    params = {"project": project.pk, "seed": seed, "repeats": repeats}
    with transaction.atomic():
        return enqueue("rehearse", params, project=project, user=user, dedupe_key=f"{project.pk}:{seed}:{repeats}")


def prepare_rehearsal(ctx: JobContext) -> Callable[[], dict[str, Any]]:
    """The job kind "rehearse": read, inject, ask, count; the commit only hands the answer over."""
    project = Project.objects.get(pk=ctx.job.params["project"])
    seed = int(ctx.job.params.get("seed", SEED))
    rule_set = effective_rule_set(project)
    wells, known = drawn_wells(project, seed)
    if not wells:
        raise JobError(
            "nothing_to_rehearse",
            f"Project «{project.slug}» has no analysis of rock yet.",
            remedy="Bring a report in first.",
        )
    table = read(wells)
    terms = Terms(
        thresholds=rule_set.thresholds, disabled=frozenset(rule_set.disabled), dismissed=frozenset(dismissed(wells)),
        faulty=accepted_faults(wells),
    )  # fmt: skip
    told = rehearse(
        table, terms, seed=seed, repeats=int(ctx.job.params.get("repeats", REPEATS)),
        step=lambda done, total, note: ctx.tick(done=done, total=total, note=note),
    )  # fmt: skip
    answer = {
        "project": project.slug, "rule_set": {"name": rule_set.name, "version": rule_set.version},
        "wells": {"rehearsed": len(wells), "with_analyses": known}, **told,
    }  # fmt: skip
    return lambda: answer


def drawn_wells(project: Project, seed: int, analyses_max: int = ANALYSES_MAX) -> tuple[list[Well], int]:
    """The wells of the copy, in the order of their names, and how many could be: all, or a draw of near ``analyses_max`` analyses."""
    sizes: dict[int, int] = {}
    for pk in rock(project.wells.values_list("pk", flat=True)).values_list("sample__well", flat=True).iterator():
        sizes[pk] = sizes.get(pk, 0) + 1
    wells = sorted(Well.objects.filter(pk__in=sizes), key=lambda well: (well.name_key, well.uwi))
    chosen: set[int] = set()
    total = 0
    for at in np.random.default_rng(seed).permutation(len(wells)):
        well = wells[int(at)]
        if not chosen or total + sizes[well.pk] <= analyses_max:
            chosen.add(well.pk)
            total += sizes[well.pk]
    return [well for well in wells if well.pk in chosen], len(wells)


def accepted_faults(wells: Sequence[Well]) -> frozenset[int]:
    """Samples with a fault that a person accepted: a value rejected or held, or a flag on the sample agreed to."""
    ids = [well.pk for well in wells]
    decided = Decision.objects.filter(result__analysis__sample__well__in=ids).order_by("id")
    standing: dict[int, tuple[int, str]] = {
        result: (sample, verdict)
        for result, sample, verdict in decided.values_list("result_id", "result__analysis__sample_id", "verdict")
    }
    doubted = {sample for sample, verdict in standing.values() if verdict in {Verdict.REJECTED, Verdict.HELD}}
    given = FlagAnswer.objects.filter(review_set__well__in=ids).order_by("id").values_list("fingerprint", "answer")
    agreed = {fingerprint for fingerprint, answer in dict(given).items() if answer == FlagAnswer.Answer.AGREED}
    flags = Flag.objects.in_force().filter(well__in=ids, analysis__isnull=False)
    of = dict(Analysis.objects.filter(flags__in=flags).values_list("id", "sample_id"))
    return frozenset(
        doubted | {of[analysis] for analysis, mark in flags.values_list("analysis_id", "fingerprint") if mark in agreed}
    )


def last_rehearsal(project: Project) -> Job | None:
    """The newest one that succeeded."""
    done = Job.objects.filter(project=project, kind="rehearse", state=JobState.SUCCEEDED)
    return done.order_by("-finished_at", "-created_at").first()


def waiting_rehearsal(project: Project) -> Job | None:
    """One that waits or runs."""
    live = Job.objects.filter(project=project, kind="rehearse", state__in=[JobState.QUEUED, JobState.RUNNING])
    return live.order_by("created_at").first()
