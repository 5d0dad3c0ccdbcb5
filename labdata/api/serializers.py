"""How each thing looks from outside."""

from typing import Any

from drf_spectacular.utils import extend_schema_field
from rest_framework import serializers

from labdata.models import Analysis, AuditEntry, Job, Project, Release, Sample, Upload, Well
from qc.models import Decision, Flag, QcRun, ReviewSet, RuleSet, Severity, SignOff, Verdict
from qc.review.standing import valid_signature, verdict_counts


class ProjectOut(serializers.ModelSerializer[Project]):
    roles = serializers.SerializerMethodField(help_text="roles of the caller in the project")

    class Meta:
        model = Project
        fields = ["slug", "name", "description", "created_at", "roles"]

    def get_roles(self, project: Project) -> list[str]:
        held = self.context.get("roles", {})
        return sorted(held.get(project.pk, []))


class WellOut(serializers.ModelSerializer[Well]):
    project = serializers.SlugRelatedField[Project](slug_field="slug", read_only=True)
    aliases = serializers.SlugRelatedField[Any](slug_field="name", many=True, read_only=True)

    class Meta:
        model = Well
        fields = [
            "id", "project", "name", "uwi", "aliases", "operator", "field", "country", "latitude", "longitude", "crs",
            "datum_kind", "datum_elevation_m", "ground_elevation_m", "water_depth_m", "td_md_m",
        ]  # fmt: skip


class SampleOut(serializers.ModelSerializer[Sample]):
    project = serializers.CharField(source="well.project.slug", read_only=True)
    well = serializers.CharField(source="well.name", read_only=True)
    well_id = serializers.IntegerField(read_only=True)
    sample = serializers.CharField(source="label", read_only=True, help_text="sample number as reported")
    top_m = serializers.FloatField(source="top_md_m", read_only=True, help_text="m MD")
    base_m = serializers.FloatField(source="base_md_m", read_only=True, help_text="m MD")

    class Meta:
        model = Sample
        fields = [
            "id", "project", "well", "well_id", "sample", "kind", "formation", "top_m", "base_m", "top_reported",
            "base_reported", "depth_unit_reported", "depth_kind", "igsn", "parent",
        ]  # fmt: skip


class AnalysisOut(serializers.ModelSerializer[Analysis]):
    project = serializers.CharField(source="project.slug", read_only=True)
    well = serializers.CharField(source="sample.well.name", read_only=True, default=None, allow_null=True)
    sample = serializers.CharField(source="sample.label", read_only=True, default=None, allow_null=True)
    sample_id = serializers.IntegerField(read_only=True, allow_null=True)
    top_m = serializers.FloatField(source="sample.top_md_m", read_only=True, default=None, allow_null=True)
    base_m = serializers.FloatField(source="sample.base_md_m", read_only=True, default=None, allow_null=True)
    method = serializers.CharField(source="method.code", read_only=True)
    report = serializers.CharField(source="report.number", read_only=True)
    report_version = serializers.IntegerField(source="report.version", read_only=True)
    lab = serializers.CharField(source="laboratory.name", read_only=True, default=None, allow_null=True)
    review_set = serializers.IntegerField(
        source="review_item.review_set_id", read_only=True, default=None, allow_null=True
    )
    state = serializers.CharField(
        source="review_item.review_set.state", read_only=True, default=None, allow_null=True, help_text="open or signed"
    )

    class Meta:
        model = Analysis
        fields = [
            "id", "project", "well", "sample", "sample_id", "top_m", "base_m", "method", "replicate", "role", "report",
            "report_version", "lab", "lab_number", "remark", "current", "review_set", "state",
        ]  # fmt: skip


class ResultOut(serializers.Serializer[Any]):
    """One value: the long columns of a dataset, and where it belongs."""

    id = serializers.IntegerField()
    analysis = serializers.IntegerField()
    project = serializers.CharField()
    well = serializers.CharField()
    uwi = serializers.CharField()
    sample = serializers.CharField()
    kind = serializers.CharField()
    formation = serializers.CharField()
    top_m = serializers.FloatField(allow_null=True)
    base_m = serializers.FloatField(allow_null=True)
    tvd_top_m = serializers.FloatField(allow_null=True)
    tvd_base_m = serializers.FloatField(allow_null=True)
    depth_reported = serializers.CharField()
    depth_unit_reported = serializers.CharField()
    lab = serializers.CharField()
    report = serializers.CharField()
    report_version = serializers.IntegerField()
    method = serializers.CharField()
    replicate = serializers.IntegerField()
    analyte = serializers.CharField()
    value = serializers.FloatField(allow_null=True, help_text="null only with a qualifier")
    qualifier = serializers.ChoiceField(choices=["", "<", ">", "~"])
    unit = serializers.CharField()
    value_reported = serializers.CharField(help_text="the cell's text")
    unit_reported = serializers.CharField()
    verdict = serializers.ChoiceField(choices=Verdict.values)
    reason = serializers.CharField()
    decided_by = serializers.CharField()
    decided_at = serializers.DateTimeField(allow_null=True)
    signed_by = serializers.CharField()
    signed_at = serializers.DateTimeField(allow_null=True)
    flags = serializers.CharField(help_text="rule ids, separated by commas")
    file_sha256 = serializers.CharField()
    sheet = serializers.CharField()
    cell = serializers.CharField()
    lost_inputs = serializers.CharField(help_text="inputs of an index that were rejected; it is left out of releases")


class FlagOut(serializers.ModelSerializer[Flag]):
    project = serializers.CharField(source="well.project.slug", read_only=True)
    well = serializers.CharField(source="well.name", read_only=True)
    sample = serializers.CharField(source="analysis.sample.label", read_only=True, default=None, allow_null=True)
    top_m = serializers.FloatField(source="analysis.sample.top_md_m", read_only=True, default=None, allow_null=True)
    base_m = serializers.FloatField(source="analysis.sample.base_md_m", read_only=True, default=None, allow_null=True)
    method = serializers.CharField(source="analysis.method.code", read_only=True, default=None, allow_null=True)
    replicate = serializers.IntegerField(source="analysis.replicate", read_only=True, default=None, allow_null=True)
    severity = serializers.ChoiceField(choices=Severity.values)
    evidence = serializers.DictField()

    class Meta:
        model = Flag
        fields = [
            "id", "run", "rule", "family", "severity", "project", "well", "sample", "top_m", "base_m", "method",
            "replicate", "analyte", "value", "analysis", "result", "message", "evidence", "source", "fingerprint",
        ]  # fmt: skip


class JobError(serializers.Serializer[Any]):
    code = serializers.CharField()
    message = serializers.CharField()


class JobProgress(serializers.Serializer[Any]):
    done = serializers.IntegerField()
    total = serializers.IntegerField()
    note = serializers.CharField()


class JobOut(serializers.ModelSerializer[Job]):
    project = serializers.CharField(source="project.slug", read_only=True, default=None, allow_null=True)
    progress = serializers.SerializerMethodField()
    error = serializers.SerializerMethodField()
    result = serializers.DictField()

    class Meta:
        model = Job
        fields = [
            "id", "project", "kind", "state", "attempt", "progress", "result", "error", "created_at", "started_at",
            "finished_at",
        ]  # fmt: skip

    @extend_schema_field(JobProgress)
    def get_progress(self, job: Job) -> dict[str, Any]:
        return {"done": job.progress_done, "total": job.progress_total, "note": job.progress_note}

    @extend_schema_field(JobError(allow_null=True))
    def get_error(self, job: Job) -> dict[str, str] | None:
        return {"code": job.error_code, "message": job.error_message} if job.error_message else None


class UploadOut(serializers.ModelSerializer[Upload]):
    project = serializers.CharField(source="project.slug", read_only=True)
    file = serializers.CharField(source="file_name", read_only=True)
    sha256 = serializers.CharField(source="source_file.sha256", read_only=True)
    lab = serializers.CharField(source="laboratory_name", read_only=True)
    report = serializers.CharField(source="report.number", read_only=True, default=None, allow_null=True)
    created_by = serializers.CharField(source="created_by.username", read_only=True, default=None, allow_null=True)
    answer = serializers.DictField(help_text="what intake says of the file: outcome, tables, counts, findings")

    class Meta:
        model = Upload
        fields = [
            "id", "project", "file", "sha256", "lab", "outcome", "report", "job", "answer", "answers", "created_by",
            "created_at",
        ]  # fmt: skip


class RuleSetOut(serializers.ModelSerializer[RuleSet]):
    project = serializers.CharField(source="project.slug", read_only=True, default=None, allow_null=True)
    author = serializers.CharField(source="author.username", read_only=True, default=None, allow_null=True)
    thresholds = serializers.DictField(help_text="rule -> parameter -> {value, unit, source}")
    disabled = serializers.ListField(child=serializers.CharField(), help_text="rules switched off")

    class Meta:
        model = RuleSet
        fields = ["id", "project", "name", "version", "thresholds", "disabled", "author", "reason", "created_at"]


class QcRunOut(serializers.ModelSerializer[QcRun]):
    project = serializers.CharField(source="project.slug", read_only=True)
    rule_set = serializers.SerializerMethodField()
    started_by = serializers.CharField(source="started_by.username", read_only=True, default=None, allow_null=True)
    wells = serializers.SlugRelatedField[Any](slug_field="name", many=True, read_only=True)
    summary = serializers.ListField(child=serializers.DictField(), help_text="rule, family, and counts of its answers")

    class Meta:
        model = QcRun
        fields = [
            "id", "project", "rule_set", "job", "wells", "started_by", "started_at", "seconds", "analyses_checked",
            "results_checked", "summary",
        ]  # fmt: skip

    def get_rule_set(self, run: QcRun) -> dict[str, Any]:
        return {"name": run.rule_set.name, "version": run.rule_set.version}


class DecisionOut(serializers.ModelSerializer[Decision]):
    project = serializers.CharField(source="review_set.project.slug", read_only=True)
    well = serializers.CharField(source="review_set.well.name", read_only=True)
    sample = serializers.CharField(source="result.analysis.sample.label", read_only=True, default=None, allow_null=True)
    analysis = serializers.IntegerField(source="result.analysis_id", read_only=True)
    method = serializers.CharField(source="result.analysis.method.code", read_only=True)
    replicate = serializers.IntegerField(source="result.analysis.replicate", read_only=True)
    analyte = serializers.CharField(source="result.analyte.code", read_only=True)
    decided_by = serializers.CharField(source="decided_by.username", read_only=True)
    verdict = serializers.ChoiceField(choices=Verdict.values)
    carried = serializers.SerializerMethodField(help_text="kept from an earlier report version that had the same value")

    class Meta:
        model = Decision
        fields = [
            "id", "project", "review_set", "result", "analysis", "well", "sample", "method", "replicate", "analyte",
            "verdict", "reason", "text", "decided_by", "decided_at", "batch", "carried",
        ]  # fmt: skip

    def get_carried(self, decision: Decision) -> bool:
        return decision.carried_from_id is not None


class SignOffOut(serializers.ModelSerializer[SignOff]):
    project = serializers.CharField(source="review_set.project.slug", read_only=True)
    well = serializers.CharField(source="review_set.well.name", read_only=True)
    signed_by = serializers.CharField(source="signed_by.username", read_only=True)
    state = serializers.SerializerMethodField(help_text="in_force or reopened")
    reopened_reason = serializers.CharField(source="reopening.reason", read_only=True, default=None, allow_null=True)
    counts = serializers.DictField()

    class Meta:
        model = SignOff
        fields = [
            "id", "project", "review_set", "well", "signed_by", "signer_name", "signed_at", "meaning",
            "content_sha256", "counts", "qc_run", "state", "reopened_reason",
        ]  # fmt: skip

    def get_state(self, sign_off: SignOff) -> str:
        return "reopened" if hasattr(sign_off, "reopening") else "in_force"


class ReviewSetOut(serializers.ModelSerializer[ReviewSet]):
    project = serializers.CharField(source="project.slug", read_only=True)
    well = serializers.CharField(source="well.name", read_only=True)
    well_id = serializers.IntegerField(read_only=True)
    analyses = serializers.IntegerField(source="analysis_count", read_only=True, help_text="how many")

    class Meta:
        model = ReviewSet
        fields = ["id", "project", "well", "well_id", "number", "state", "version", "analyses", "created_at"]


class ReviewSetDetailOut(ReviewSetOut):
    counts = serializers.SerializerMethodField(help_text="results, and how many stand at each verdict")
    signature = serializers.SerializerMethodField(help_text="the signature in force")

    class Meta(ReviewSetOut.Meta):
        fields = [*ReviewSetOut.Meta.fields, "counts", "signature"]

    def get_counts(self, review_set: ReviewSet) -> dict[str, int]:
        return verdict_counts(review_set)

    @extend_schema_field(SignOffOut(allow_null=True))
    def get_signature(self, review_set: ReviewSet) -> dict[str, Any] | None:
        record = valid_signature(review_set)
        return dict(SignOffOut(record).data) if record else None


class ReleaseOut(serializers.ModelSerializer[Release]):
    project = serializers.CharField(source="project.slug", read_only=True)
    created_by = serializers.CharField(source="created_by.username", read_only=True)
    withdrawn_by = serializers.CharField(source="withdrawn_by.username", read_only=True, default=None, allow_null=True)
    state = serializers.SerializerMethodField(help_text="valid or withdrawn")
    counts = serializers.DictField(child=serializers.IntegerField())

    class Meta:
        model = Release
        fields = [
            "id", "project", "number", "title", "state", "created_by", "created_at", "data_sha256", "manifest_sha256",
            "counts", "withdrawn_at", "withdrawn_by", "withdrawn_reason",
        ]  # fmt: skip

    def get_state(self, release: Release) -> str:
        return "withdrawn" if release.withdrawn_at else "valid"


class AuditOut(serializers.ModelSerializer[AuditEntry]):
    project = serializers.CharField(source="project.slug", read_only=True, default=None, allow_null=True)
    actor = serializers.CharField(source="actor_name", read_only=True)
    before = serializers.JSONField(allow_null=True)
    after = serializers.JSONField(allow_null=True)

    class Meta:
        model = AuditEntry
        fields = [
            "seq", "at", "actor", "project", "action", "object_type", "object_id", "before", "after", "reason",
            "prev_hash", "hash",
        ]  # fmt: skip
