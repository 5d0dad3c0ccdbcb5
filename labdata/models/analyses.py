"""Analyses and their results: what the laboratory measured, value by value."""

from django.db import models

from labdata.models.base import Choices, Qualifier
from labdata.models.methods import Analyte, Method, ReferenceMaterial
from labdata.models.projects import Project
from labdata.models.reports import Report, SourceColumn, SourceTable
from labdata.models.samples import Laboratory, Sample


class AnalysisRole(Choices):
    """Whether rock was measured, or the laboratory checked itself."""

    SAMPLE = "sample", "sample"
    DUPLICATE = "duplicate", "duplicate"
    REFERENCE = "reference", "reference material"
    BLANK = "blank", "blank"


class AnalysisQuerySet(models.QuerySet["Analysis"]):
    def current(self) -> "AnalysisQuerySet":
        """Analyses not superseded by a later version of their report."""
        return self.filter(current=True)

    def of_rock(self) -> "AnalysisQuerySet":
        """Samples and their duplicates, not reference materials or blanks."""
        return self.filter(role__in=[AnalysisRole.SAMPLE, AnalysisRole.DUPLICATE])


class Analysis(models.Model):
    """One run of one method on one sample, from one row (or column) of a table.

    ``line`` is the row number in the sheet where samples run down the rows, else the column number.
    A current analysis of rock is named by (sample, method, replicate).
    """

    project = models.ForeignKey(Project, on_delete=models.PROTECT, related_name="analyses")
    sample = models.ForeignKey(Sample, on_delete=models.PROTECT, null=True, blank=True, related_name="analyses")
    reference_material = models.ForeignKey(
        ReferenceMaterial, on_delete=models.PROTECT, null=True, blank=True, related_name="analyses"
    )
    method = models.ForeignKey(Method, on_delete=models.PROTECT, related_name="analyses")
    report = models.ForeignKey(Report, on_delete=models.PROTECT, related_name="analyses")
    table = models.ForeignKey(SourceTable, on_delete=models.PROTECT, related_name="analyses")
    line = models.PositiveIntegerField()
    laboratory = models.ForeignKey(Laboratory, on_delete=models.PROTECT, null=True, blank=True)
    replicate = models.PositiveSmallIntegerField(default=1)
    role = models.CharField(max_length=10, choices=AnalysisRole.choices, default=AnalysisRole.SAMPLE)
    lab_number = models.CharField(max_length=120, blank=True)
    remark = models.TextField(blank=True)
    current = models.BooleanField(default=True)

    objects = AnalysisQuerySet.as_manager()

    class Meta:
        ordering = ["id"]
        verbose_name_plural = "analyses"
        constraints = [
            models.UniqueConstraint(fields=["table", "line", "method"], name="analysis_once_a_line"),
            models.UniqueConstraint(
                fields=["sample", "method", "replicate"],
                condition=models.Q(current=True, sample__isnull=False),
                name="analysis_slot_current_once",
            ),
            AnalysisRole.constraint("role", "analysis_role_known"),
            models.CheckConstraint(
                condition=models.Q(sample__isnull=False) | models.Q(role__in=["reference", "blank"]),
                name="analysis_of_rock_has_sample",
            ),
            models.CheckConstraint(condition=models.Q(replicate__gte=1), name="analysis_replicate_positive"),
        ]

    def __str__(self) -> str:
        return f"{self.method} of {self.sample}"


class ResultQuerySet(models.QuerySet["Result"]):
    def current(self) -> "ResultQuerySet":
        """Results not superseded by a later version of their report."""
        return self.filter(current=True)


class Result(models.Model):
    """One value as reported, and as a double in the analyte's canonical unit.

    Nothing edits it: only ``current`` may change, when a later report version supersedes it, and a
    database trigger refuses the rest. ``value`` is null only with a qualifier ("below an unknown limit").
    The cell is the column's letter and the analysis's row.
    """

    analysis = models.ForeignKey(Analysis, on_delete=models.PROTECT, related_name="results")
    analyte = models.ForeignKey(Analyte, on_delete=models.PROTECT, related_name="results")
    column = models.ForeignKey(SourceColumn, on_delete=models.PROTECT, related_name="results")
    value = models.FloatField(null=True, blank=True)
    qualifier = models.CharField(max_length=1, choices=Qualifier.choices, blank=True)
    value_reported = models.CharField(max_length=120)
    decimals = models.PositiveSmallIntegerField(default=0)
    current = models.BooleanField(default=True)
    supersedes = models.ForeignKey("self", on_delete=models.PROTECT, null=True, blank=True, related_name="successors")

    objects = ResultQuerySet.as_manager()

    class Meta:
        ordering = ["id"]
        constraints = [
            models.UniqueConstraint(fields=["analysis", "analyte"], name="result_once_an_analysis"),
            Qualifier.constraint("qualifier", "result_qualifier_known"),
            models.CheckConstraint(
                condition=models.Q(value__isnull=False) | ~models.Q(qualifier=""), name="result_value_or_qualifier"
            ),
            # NaN compares greater than every number on PostgreSQL and is NULL on SQLite: neither passes
            models.CheckConstraint(
                condition=models.Q(value__isnull=True) | models.Q(value__gte=-1e300, value__lte=1e300),
                name="result_value_finite",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.analyte} {self.qualifier}{self.value}"
