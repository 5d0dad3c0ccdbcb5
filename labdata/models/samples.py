"""Pieces of rock (or of what may have contaminated it), where they came from and who has had them."""

from django.conf import settings
from django.db import models
from django.utils import timezone

from labdata.models.base import Choices
from labdata.models.projects import Project
from labdata.models.wells import Well


class SampleKind(Choices):
    """How the sample was taken."""

    UNKNOWN = "unknown", "not stated"
    CORE = "core", "whole core"
    PLUG = "plug", "core plug"
    SIDEWALL = "sidewall", "sidewall core"
    CUTTINGS = "cuttings", "cuttings"
    COMPOSITE = "composite", "composite"
    OUTCROP = "outcrop", "outcrop"
    FLUID = "fluid", "fluid"
    ADDITIVE = "additive", "drilling fluid or additive"


class DepthKind(Choices):
    """Which depth was reported."""

    UNKNOWN = "", "not stated"
    DRILLER = "driller", "driller's depth"
    LOGGER = "logger", "logger's depth"
    CORE = "core", "core depth"
    TVD = "TVD", "true vertical depth"


class Sample(models.Model):
    """One sample. Canonical depth in metres measured depth beside the depth as it was reported.

    ``match_key`` is made of kind, label and depth (to a millimetre) and finds the sample again.
    """

    well = models.ForeignKey(Well, on_delete=models.PROTECT, related_name="samples")
    kind = models.CharField(max_length=10, choices=SampleKind.choices, default=SampleKind.UNKNOWN)
    label = models.CharField(max_length=120, blank=True, help_text="sample number as reported")
    match_key = models.CharField(max_length=220, editable=False)
    top_md_m = models.FloatField(null=True, blank=True)
    base_md_m = models.FloatField(null=True, blank=True)
    top_reported = models.CharField(max_length=60, blank=True)
    base_reported = models.CharField(max_length=60, blank=True)
    depth_unit_reported = models.CharField(max_length=10, blank=True)
    depth_kind = models.CharField(max_length=10, choices=DepthKind.choices, blank=True)
    formation = models.CharField(max_length=120, blank=True, help_text="as reported by the laboratory")
    parent = models.ForeignKey("self", on_delete=models.PROTECT, null=True, blank=True, related_name="splits")
    igsn = models.CharField("IGSN", max_length=60, blank=True)

    class Meta:
        ordering = ["well", "top_md_m", "label", "id"]
        constraints = [
            models.UniqueConstraint(fields=["well", "match_key"], name="sample_once_a_well"),
            SampleKind.constraint("kind", "sample_kind_known"),
            DepthKind.constraint("depth_kind", "sample_depth_kind_known"),
            models.CheckConstraint(
                condition=models.Q(base_md_m__isnull=True) | models.Q(top_md_m__isnull=False),
                name="sample_base_needs_top",
            ),
        ]
        indexes = [models.Index(fields=["well", "top_md_m"], name="sample_by_depth")]

    def __str__(self) -> str:
        depth = "" if self.top_md_m is None else f"{self.top_md_m:.2f} m"
        return " ".join(part for part in (self.label, depth) if part) or f"sample {self.pk}"


class CustodyEvent(models.Model):
    """The sample changed hands or state."""

    class Kind(Choices):
        COLLECTED = "collected", "collected"
        SENT = "sent", "sent"
        RECEIVED = "received", "received"
        SPLIT = "split", "split"
        CONSUMED = "consumed", "consumed"
        RETURNED = "returned", "returned"
        STORED = "stored", "stored"

    sample = models.ForeignKey(Sample, on_delete=models.CASCADE, related_name="custody")
    kind = models.CharField(max_length=10, choices=Kind.choices)
    place = models.CharField(max_length=200)
    at = models.DateTimeField()
    recorded_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT)
    remark = models.TextField(blank=True)

    class Meta:
        ordering = ["sample", "at", "id"]

    def __str__(self) -> str:
        return f"{self.sample} {self.kind} at {self.place}"


class Laboratory(models.Model):
    """Who measured, within one project."""

    project = models.ForeignKey(Project, on_delete=models.CASCADE, related_name="laboratories")
    name = models.CharField(max_length=160)

    class Meta:
        ordering = ["project", "name"]
        verbose_name_plural = "laboratories"
        constraints = [models.UniqueConstraint(fields=["project", "name"], name="laboratory_once")]

    def __str__(self) -> str:
        return self.name


class Consignment(models.Model):
    """Samples sent together to a laboratory, with the cautions that travel with them."""

    project = models.ForeignKey(Project, on_delete=models.CASCADE, related_name="consignments")
    laboratory = models.ForeignKey(Laboratory, on_delete=models.PROTECT, related_name="consignments")
    number = models.CharField(max_length=60)
    sent_at = models.DateTimeField(default=timezone.now)
    cautions = models.TextField(blank=True)
    samples = models.ManyToManyField(Sample, related_name="consignments", blank=True)

    class Meta:
        ordering = ["project", "number"]
        constraints = [models.UniqueConstraint(fields=["project", "number"], name="consignment_once")]

    def __str__(self) -> str:
        return self.number
