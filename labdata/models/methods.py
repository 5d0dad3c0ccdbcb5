"""What can be measured, and against what a laboratory checks itself."""

from django.db import models

from labdata.models.base import Choices
from labdata.models.projects import Project
from labdata.models.samples import Consignment, Laboratory


class Method(models.Model):
    """What was measured and by which procedure."""

    code = models.SlugField(max_length=40, unique=True)
    name = models.CharField(max_length=120)
    procedure = models.CharField(max_length=300, blank=True)

    class Meta:
        ordering = ["code"]

    def __str__(self) -> str:
        return self.code


class Analyte(models.Model):
    """A quantity that results are of: code, canonical unit, what is physically possible.

    ``inputs`` names the analytes that an index is made of (HI: S2 and TOC); it goes when one of
    them is rejected. ``project`` is empty for the analytes that every project has.
    """

    code = models.CharField(max_length=24)
    name = models.CharField(max_length=120)
    unit = models.CharField(max_length=24, blank=True)
    method = models.ForeignKey(Method, on_delete=models.PROTECT, related_name="analytes")
    low = models.FloatField(null=True, blank=True)
    high = models.FloatField(null=True, blank=True)
    decimals = models.PositiveSmallIntegerField(default=2)
    order = models.PositiveSmallIntegerField(default=1000)
    inputs = models.JSONField(default=list, blank=True)
    project = models.ForeignKey(Project, on_delete=models.CASCADE, null=True, blank=True, related_name="analytes")

    class Meta:
        ordering = ["order", "code"]
        constraints = [
            models.UniqueConstraint(
                fields=["code"], condition=models.Q(project__isnull=True), name="analyte_code_once"
            ),
            models.UniqueConstraint(fields=["project", "code"], name="analyte_code_once_a_project"),
        ]

    def __str__(self) -> str:
        return self.code


class AnalysisRequest(models.Model):
    """What was ordered for a consignment."""

    class State(Choices):
        REQUESTED = "requested", "requested"
        REPORTED = "reported", "reported"
        CANCELLED = "cancelled", "cancelled"

    consignment = models.ForeignKey(Consignment, on_delete=models.CASCADE, related_name="requests")
    method = models.ForeignKey(Method, on_delete=models.PROTECT)
    state = models.CharField(max_length=10, choices=State.choices, default=State.REQUESTED)
    due = models.DateField(null=True, blank=True)

    class Meta:
        constraints = [models.UniqueConstraint(fields=["consignment", "method"], name="request_once")]

    def __str__(self) -> str:
        return f"{self.method} for {self.consignment}"


class ReferenceMaterial(models.Model):
    """A material of known composition. ``certificate`` maps analyte code to [value, uncertainty]."""

    project = models.ForeignKey(Project, on_delete=models.CASCADE, related_name="reference_materials")
    laboratory = models.ForeignKey(Laboratory, on_delete=models.PROTECT, null=True, blank=True)
    name = models.CharField(max_length=120)
    lot = models.CharField(max_length=60, blank=True)
    certificate = models.JSONField(default=dict)

    class Meta:
        constraints = [models.UniqueConstraint(fields=["project", "name", "lot"], name="reference_material_once")]

    def __str__(self) -> str:
        return f"{self.name} {self.lot}".strip()
