"""Laboratory files as received, the reports they hold, and where each table and column stood."""

from django.conf import settings
from django.db import models
from django.utils import timezone

from labdata.models.base import Choices
from labdata.models.jobs import Job
from labdata.models.projects import Project
from labdata.models.samples import Laboratory


class SourceFile(models.Model):
    """The bytes of a file, kept for ever under their SHA-256 in the file store."""

    project = models.ForeignKey(Project, on_delete=models.PROTECT, related_name="source_files")
    sha256 = models.CharField(max_length=64)
    name = models.CharField(max_length=255)
    size = models.PositiveBigIntegerField()
    stored_as = models.CharField(max_length=255)
    received_at = models.DateTimeField(default=timezone.now, editable=False)
    received_from = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, null=True, blank=True)

    class Meta:
        ordering = ["-received_at"]
        constraints = [models.UniqueConstraint(fields=["project", "sha256"], name="source_file_once")]

    def __str__(self) -> str:
        return self.name


class Report(models.Model):
    """One version of one laboratory report. A correction is a further version that supersedes."""

    project = models.ForeignKey(Project, on_delete=models.PROTECT, related_name="reports")
    source_file = models.OneToOneField(SourceFile, on_delete=models.PROTECT, related_name="report")
    laboratory = models.ForeignKey(Laboratory, on_delete=models.PROTECT, null=True, blank=True)
    number = models.CharField(max_length=120, help_text="the laboratory's number, or the file's name")
    version = models.PositiveSmallIntegerField(default=1)
    supersedes = models.OneToOneField(
        "self", on_delete=models.PROTECT, null=True, blank=True, related_name="superseded_by"
    )
    reported_on = models.DateField(null=True, blank=True)
    imported_at = models.DateTimeField(default=timezone.now, editable=False)
    difference = models.JSONField(
        default=dict, blank=True, help_text="against the version superseded: added, changed, withdrawn, unchanged"
    )

    class Meta:
        ordering = ["-imported_at"]
        constraints = [
            models.UniqueConstraint(fields=["project", "number", "version"], name="report_version_once"),
            models.CheckConstraint(condition=models.Q(version__gte=1), name="report_version_positive"),
        ]

    def __str__(self) -> str:
        return f"{self.number} v{self.version}"


class SourceTable(models.Model):
    """One table found in a sheet. ``orientation``: samples run down the rows or along the columns."""

    class Orientation(Choices):
        ROWS = "rows", "a sample a row"
        COLUMNS = "columns", "a sample a column"

    report = models.ForeignKey(Report, on_delete=models.PROTECT, related_name="tables")
    sheet = models.CharField(max_length=120, blank=True)
    cell_range = models.CharField(max_length=40)
    kind = models.CharField(max_length=40)
    orientation = models.CharField(max_length=8, choices=Orientation.choices, default=Orientation.ROWS)

    class Meta:
        ordering = ["report", "id"]
        constraints = [
            models.CheckConstraint(
                condition=models.Q(orientation__in=["rows", "columns"]), name="source_table_orientation_known"
            )
        ]

    def __str__(self) -> str:
        return f"{self.sheet}!{self.cell_range}"


class SourceColumn(models.Model):
    """One mapped column: its place in the table and what it was read as.

    ``line`` is the column number (1 = A) where samples run down the rows, else the row number.
    ``factor`` multiplies a reported number into the analyte's canonical unit.
    """

    table = models.ForeignKey(SourceTable, on_delete=models.PROTECT, related_name="columns")
    line = models.PositiveIntegerField()
    header = models.CharField(max_length=300)
    field = models.CharField(max_length=24, help_text="field code of the mapping")
    unit_reported = models.CharField(max_length=40, blank=True)
    factor = models.FloatField(default=1.0)
    decimals = models.PositiveSmallIntegerField(default=0, help_text="largest number of decimals in the column")
    confidence = models.FloatField(default=1.0)
    reason = models.CharField(max_length=300, blank=True)

    class Meta:
        ordering = ["table", "line"]
        constraints = [models.UniqueConstraint(fields=["table", "line"], name="source_column_once")]

    def __str__(self) -> str:
        return f"{self.header} -> {self.field}"


class Upload(models.Model):
    """One attempt to bring a file in: what was asked, what was found, how it ended.

    ``answer`` is the file's entry of the outside contract (outcome, tables, counts, findings).
    """

    class Outcome(Choices):
        RECEIVED = "received", "being read"
        IMPORTED = "imported", "imported"
        IMPORTED_WITH_FINDINGS = "imported_with_findings", "imported, with findings"
        WAITING = "waiting", "waiting for answers"
        REFUSED = "refused", "refused"
        ALREADY_HELD = "already_held", "already held"
        FAILED = "failed", "failed"
        WITHDRAWN = "withdrawn", "withdrawn"

    project = models.ForeignKey(Project, on_delete=models.PROTECT, related_name="uploads")
    source_file = models.ForeignKey(SourceFile, on_delete=models.PROTECT, related_name="uploads")
    file_name = models.CharField(max_length=255)
    laboratory_name = models.CharField(max_length=160, blank=True)
    options = models.JSONField(
        default=dict, help_text="well, create_wells; look, remember; said_by: answer id -> name; corrected_by: user"
    )
    answers = models.JSONField(default=dict, help_text="question id -> answer")
    outcome = models.CharField(max_length=24, choices=Outcome.choices, default=Outcome.RECEIVED)
    answer = models.JSONField(default=dict, blank=True)
    report = models.ForeignKey(Report, on_delete=models.PROTECT, null=True, blank=True, related_name="uploads")
    job = models.ForeignKey(Job, on_delete=models.SET_NULL, null=True, blank=True, related_name="uploads")
    created_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, null=True, blank=True)
    created_at = models.DateTimeField(default=timezone.now, editable=False)

    class Meta:
        ordering = ["-created_at", "-id"]
        constraints = [
            models.CheckConstraint(
                condition=models.Q(
                    outcome__in=[
                        "received",
                        "imported",
                        "imported_with_findings",
                        "waiting",
                        "refused",
                        "already_held",
                        "failed",
                        "withdrawn",
                    ]
                ),
                name="upload_outcome_known",
            )
        ]

    def __str__(self) -> str:
        return self.file_name


class RememberedLayout(models.Model):
    """How a person corrected the mapping of one laboratory's layout, for the next file that has the same header.

    ``fingerprint`` is of the header's texts and units in order (labdata/intake/layouts.py); ``mapping`` is
    {"header_height": rows of a header that a person named, else 0, "columns": [{"offset", "header", "field", "unit"}]}.
    """

    project = models.ForeignKey(Project, on_delete=models.PROTECT, related_name="remembered_layouts")
    laboratory_name = models.CharField(max_length=160, blank=True)
    fingerprint = models.CharField(max_length=64)
    headers = models.CharField(max_length=300, help_text="the header's texts, to know the layout by")
    mapping = models.JSONField(default=dict)
    made_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, null=True, blank=True)
    at = models.DateTimeField(default=timezone.now)

    class Meta:
        ordering = ["laboratory_name", "-at"]
        constraints = [
            models.UniqueConstraint(fields=["project", "laboratory_name", "fingerprint"], name="remembered_layout_once")
        ]

    def __str__(self) -> str:
        return f"{self.laboratory_name or 'laboratory not named'}: {self.headers}"
