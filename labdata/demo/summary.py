"""What the demonstration did, as plain data, and which rules caught which fault."""

from collections import Counter
from typing import Any

import pyarrow.compute as pc

from labdata.demo.faults import FAULTS, Fault
from labdata.models import Analysis, Project, Release, Result, Sample, Upload, Well
from labdata.release import parquet
from labdata.release.shapes import usable
from qc.models import Flag, ReviewSet, Verdict
from qc.review.standing import valid_signature, verdict_counts


def summary(project: Project, release: Release) -> dict[str, Any]:
    """Files, counts, flags, decisions, signatures, the release and the faults, as ``demo --once --json`` prints them."""
    sets = list(ReviewSet.objects.filter(project=project))
    verdicts = sum((Counter(verdict_counts(review_set)) for review_set in sets), Counter())
    return {
        "project": project.slug,
        "files": [_file(upload) for upload in Upload.objects.filter(project=project).order_by("pk")],
        "wells": Well.objects.filter(project=project).count(),
        "samples": Sample.objects.filter(well__project=project).count(),
        "analyses": Analysis.objects.current().filter(project=project).count(),
        "results": Result.objects.current().filter(analysis__project=project, analysis__current=True).count(),
        "flags": _flags(project),
        "decisions": {str(v): verdicts[v] for v in (Verdict.ACCEPTED, Verdict.REJECTED, Verdict.HELD)},
        "signed_sets": sum(valid_signature(review_set) is not None for review_set in sets),
        "release": _release(release),
        "faults": [_fault(project, fault) for fault in FAULTS],
    }  # fmt: skip


def _release(release: Release) -> dict[str, Any]:
    """The release, counted as a pull gives it: rejected values and indices that lost an input are left out."""
    shown = usable(parquet.load(release.stored_as, release.data_sha256))
    return {
        "id": release.pk, "number": release.number, "results": shown.num_rows,
        "analyses": pc.count_distinct(shown["analysis"]).as_py(), "sha256": release.data_sha256,
    }  # fmt: skip


def _file(upload: Upload) -> dict[str, Any]:
    return {"file": upload.file_name, "outcome": upload.outcome, "counts": upload.answer.get("counts", {})}


def _flags(project: Project) -> dict[str, int]:
    """How many flags count now, by rule."""
    rules = Flag.objects.in_force().filter(well__project=project).values_list("rule", flat=True)
    return dict(sorted(Counter(rules).items()))


def _fault(project: Project, fault: Fault) -> dict[str, Any]:
    """A fault is caught when each of its rules has spoken of it, in any run."""
    caught = caught_by(project, fault)
    return {
        "fault": fault.code, "story": fault.story, "well": fault.well.name, "samples": list(fault.labels),
        "rules": list(fault.rules), "caught_by": caught, "caught": set(fault.rules) <= set(caught),
    }  # fmt: skip


def caught_by(project: Project, fault: Fault) -> list[str]:
    """Rules that flagged a sample of the fault, and those of its rules that spoke of its formation or whole well."""
    flags = Flag.objects.filter(well__project=project, well__name=fault.well.name)
    found = set(flags.filter(analysis__sample__label__in=fault.labels).values_list("rule", flat=True))
    of_sets = flags.filter(analysis__isnull=True, rule__in=fault.rules)
    return sorted(found | {flag.rule for flag in of_sets if fault.formation in f"{flag.message} {flag.evidence}"})
