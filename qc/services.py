"""Run the rules over wells and keep what they found. Rules compute outside the transaction; one short one writes."""

import time
from collections.abc import Callable, Iterable, Iterator, Sequence
from typing import Any

from django.contrib.auth.models import User
from django.db import transaction
from django.db.models import Count, Max

from labdata import audit
from labdata.access import Action, require
from labdata.errors import InvalidInput
from labdata.jobs import JobContext, enqueue
from labdata.models import Job, Project, Well
from qc.models import Flag, FlagAnswer, QcRun, QcRunWell, RuleSet
from qc.rules import RULES
from qc.rules.engine import parameters, run
from qc.rules.evidence import Witness
from qc.rules.panels import cell
from qc.rules.rule import OUTCOMES, Answer, Finding
from qc.rules.spans import num
from qc.rules.table import Table
from qc.rulesets import effective_rule_set
from qc.tables import read, results_of, rock

BATCH = 20_000  # analyses read at a time
WRITE = 500
Mark = dict[int, tuple[int, int]]


def start_run(project: Project, wells: Sequence[Well] | None, user: User | None) -> Job:
    """Enqueue a run over these wells, None for all of the project. ``user`` None is the service itself."""
    if user is not None:
        require(user, project, Action.RUN_QC)
    strangers = [well.name for well in wells or () if well.project_id != project.pk]
    if strangers:
        raise InvalidInput(
            f"No wells of project «{project.slug}»: {', '.join(strangers)}.", remedy="Name its own wells."
        )
    chosen = None if wells is None else sorted({well.pk for well in wells})
    with transaction.atomic():
        return enqueue("qc", {"project": project.pk, "wells": chosen}, project=project, user=user)


def prepare_qc(ctx: JobContext) -> Callable[[], dict[str, Any]]:
    """The job kind "qc": read, check, and return the commit that writes run and flags."""
    project = Project.objects.get(pk=ctx.job.params["project"])
    rule_set = effective_rule_set(project)
    wells = _wells(project, ctx.job.params.get("wells"))
    started, mark = time.monotonic(), _mark(wells)
    counts: dict[str, dict[str, int]] = {}
    flags: list[Flag] = []
    for number, batch in enumerate(_batches(wells, mark)):
        ctx.tick(
            done=number * BATCH, note=f"{batch[0].name} and {len(batch) - 1} more" if len(batch) > 1 else batch[0].name
        )
        flags += _check(batch, rule_set, counts, ctx)
    seconds = time.monotonic() - started

    def commit() -> dict[str, Any]:
        return _store(ctx.job, project, rule_set, wells, mark, counts=counts, flags=flags, seconds=seconds)

    return commit


def _wells(project: Project, chosen: Iterable[int] | None) -> list[Well]:
    """The wells in an order made of their names."""
    wells = Well.objects.filter(project=project)
    if chosen is not None:
        wells = wells.filter(pk__in=list(chosen))
    return sorted(wells, key=lambda well: (well.name_key, well.uwi))


def _mark(wells: Sequence[Well]) -> Mark:
    """Well -> (how many analyses, the newest): what a run has seen of it."""
    held = rock([well.pk for well in wells]).values("sample__well").annotate(n=Count("id"), last=Max("id")).order_by()
    return {row["sample__well"]: (row["n"], row["last"]) for row in held}


def _batches(wells: Sequence[Well], mark: Mark) -> Iterator[list[Well]]:
    """Wells with analyses, so many at a time that a batch stays near ``BATCH`` analyses."""
    batch: list[Well] = []
    size = 0
    for well in wells:
        count = mark.get(well.pk, (0, 0))[0]
        if batch and size + count > BATCH:
            yield batch
            batch, size = [], 0
        if count:
            batch.append(well)
            size += count
    if batch:
        yield batch


def _check(wells: list[Well], rule_set: RuleSet, counts: dict[str, dict[str, int]], ctx: JobContext) -> list[Flag]:
    """Flags of one batch, in order; outcomes are added to ``counts``."""
    table = read(wells)
    answers = run(
        table, rule_set.thresholds, rule_set.disabled, dismissed(wells), step=lambda rule: ctx.tick(note=rule)
    )  # fmt: skip
    for rule, answer in answers.items():
        so_far = counts.setdefault(rule, dict.fromkeys(OUTCOMES, 0))
        for outcome, number in answer.counts().items():
            so_far[outcome] += number
    return flags_of(table, wells, answers, rule_set)


def dismissed(wells: Iterable[Well]) -> set[str]:
    """Fingerprints of flags whose latest answer is a dismissal."""
    given = FlagAnswer.objects.filter(review_set__well__in=[well.pk for well in wells]).order_by("id")
    latest = dict(given.values_list("fingerprint", "answer"))
    return {fingerprint for fingerprint, answer in latest.items() if answer == FlagAnswer.Answer.DISMISSED}


def flags_of(table: Table, wells: Sequence[Well], answers: dict[str, Answer], rule_set: RuleSet) -> list[Flag]:
    """Unsaved flags by well, then down the table, then by rule; those of a whole unit come before its well's samples."""
    witness, made = Witness(table), []
    for number, rule in enumerate(RULES):
        values = parameters(rule, rule_set.thresholds)
        for finding in answers[rule.id].findings if rule.id in answers else ():
            row = finding.row if finding.row is not None else finding.rows[0]
            well = int(num(table.rows, row, "well"))
            flag = Flag(
                well=wells[well], rule=rule.id, family=rule.family, severity=finding.severity, analyte=finding.analyte,
                message=finding.message, evidence=witness.record(rule, values, finding), source=rule.source,
                fingerprint=witness.fingerprint(rule, values, finding), **_speaks_of(table, finding),
            )  # fmt: skip
            place = -1 if finding.row is None else finding.row
            made.append(((well, place, number, finding.analyte, finding.message), flag))
    return [flag for _, flag in sorted(made, key=lambda pair: pair[0])]


def _speaks_of(table: Table, finding: Finding) -> dict[str, Any]:
    """The analysis, result and value that a flag points at; none of them for a whole unit."""
    if finding.row is None:
        return {}
    held = cell(table, finding.row, finding.analyte)
    if held is None:
        return {"analysis_id": int(num(table.rows, finding.row, "analysis"))}
    value = float(held[""])
    return {
        "analysis_id": int(num(table.rows, int(held["_row"]), "analysis")),
        "result_id": int(held["_id"]),
        "value": None if value != value else value,  # noqa: PLR0124 - NaN
    }


def _store(
    job: Job, project: Project, rule_set: RuleSet, wells: list[Well], mark: Mark, *,
    counts: dict[str, dict[str, int]], flags: list[Flag], seconds: float,
) -> dict[str, Any]:  # fmt: skip
    """Write the run. A well that has changed since it was read is left out and checked again: its flags would be stale."""
    now = _mark(wells)
    fresh = [well for well in wells if now.get(well.pk) == mark.get(well.pk)]
    kept = {well.pk for well in fresh}
    made = QcRun.objects.create(
        project=project, rule_set=rule_set, job=job, started_by=job.created_by, seconds=round(seconds, 3),
        analyses_checked=sum(mark[pk][0] for pk in kept if pk in mark), results_checked=results_of(kept).count(),
        summary=summary(counts),
    )  # fmt: skip
    QcRunWell.objects.bulk_create([QcRunWell(run=made, well=well) for well in fresh], batch_size=WRITE)
    ours = [flag for flag in flags if flag.well_id in kept]
    for flag in ours:
        flag.run = made
    Flag.objects.bulk_create(ours, batch_size=WRITE)
    stale = sorted(well.pk for well in wells if well.pk not in kept)
    if stale:
        enqueue("qc", {"project": project.pk, "wells": stale}, project=project, user=job.created_by)
    after = {"rule_set": str(rule_set), "wells": len(fresh), "flags": len(ours)}
    audit.record("qc.run", made, actor=job.created_by, project=project, after=after)
    return {"run": made.pk, "flags": len(ours), "wells": len(fresh), "again": stale}


def summary(counts: dict[str, dict[str, int]]) -> list[dict[str, Any]]:
    """Outcome counts a rule, in the order in which rules run."""
    return [
        {"rule": rule.id, "family": rule.family, **counts.get(rule.id, dict.fromkeys(OUTCOMES, 0))}
        for rule in RULES
        if rule.id in counts or not counts
    ]


def run_answer(made: QcRun) -> dict[str, Any]:
    """The run as the outside contract has it."""
    flags = made.flags.select_related("well", "analysis__sample", "analysis__method").order_by("id")
    return {
        "run": made.pk,
        "rule_set": {"name": made.rule_set.name, "version": made.rule_set.version},
        "checked": {"analyses": made.analyses_checked, "results": made.results_checked},
        "seconds": made.seconds,
        "rules": made.summary,
        "flags": [flag_entry(flag) for flag in flags],
    }


def flag_entry(flag: Flag) -> dict[str, Any]:
    """One flag as the outside contract has it. Row numbers of the database stay inside, but for ``id``."""
    analysis = flag.analysis
    sample = analysis.sample if analysis else None
    top, base = flag.evidence.get("interval_m", [None, None])
    inputs = [
        {name: value for name, value in one.items() if name != "result"} for one in flag.evidence.get("inputs", [])
    ]
    return {
        "id": flag.pk, "rule": flag.rule, "family": flag.family, "severity": flag.severity, "well": flag.well.name,
        "sample": sample.label if sample else "", "top_m": sample.top_md_m if sample else top,
        "base_m": sample.base_md_m if sample else base, "method": analysis.method.code if analysis else "",
        "replicate": analysis.replicate if analysis else None, "analyte": flag.analyte, "value": flag.value,
        "message": flag.message, "evidence": {**flag.evidence, "inputs": inputs}, "source": flag.source,
    }  # fmt: skip
