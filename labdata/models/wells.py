"""Wells and what was recorded along them. Depths are metres measured depth below the well's datum."""

import numpy as np
from django.db import models

from labdata.models.base import Choices
from labdata.models.projects import Project


class DatumKind(Choices):
    """Where measured depth starts."""

    UNKNOWN = "", "not stated"
    KELLY_BUSHING = "KB", "kelly bushing"
    ROTARY_TABLE = "RT", "rotary table"
    DRILL_FLOOR = "DF", "drill floor"
    GROUND_LEVEL = "GL", "ground level"
    SEA_LEVEL = "MSL", "mean sea level"
    SEA_FLOOR = "ML", "sea floor"


class Well(models.Model):
    """One borehole. Elevations are metres above mean sea level; water depth is positive.

    Within a project a unique well identifier names one well; without one, the name does.
    """

    project = models.ForeignKey(Project, on_delete=models.CASCADE, related_name="wells")
    name = models.CharField(max_length=120)
    name_key = models.CharField(max_length=120, editable=False, help_text="name folded for matching")
    uwi = models.CharField("UWI", max_length=40, blank=True, help_text="API number or unique well identifier")
    operator = models.CharField(max_length=120, blank=True)
    field = models.CharField(max_length=120, blank=True)
    country = models.CharField(max_length=80, blank=True)
    latitude = models.FloatField(null=True, blank=True, help_text="degrees north")
    longitude = models.FloatField(null=True, blank=True, help_text="degrees east")
    crs = models.CharField("coordinate reference system", max_length=60, blank=True)
    datum_kind = models.CharField(max_length=3, choices=DatumKind.choices, blank=True)
    datum_elevation_m = models.FloatField(null=True, blank=True)
    ground_elevation_m = models.FloatField(null=True, blank=True)
    water_depth_m = models.FloatField(null=True, blank=True)
    td_md_m = models.FloatField("total depth [m MD]", null=True, blank=True)

    class Meta:
        ordering = ["project", "name_key", "uwi"]
        constraints = [
            models.UniqueConstraint(
                fields=["project", "uwi"], condition=~models.Q(uwi=""), name="well_uwi_once_a_project"
            ),
            models.UniqueConstraint(
                fields=["project", "name_key"], condition=models.Q(uwi=""), name="well_name_once_without_uwi"
            ),
            models.CheckConstraint(condition=~models.Q(name=""), name="well_has_name"),
            models.CheckConstraint(
                condition=models.Q(td_md_m__isnull=True) | models.Q(td_md_m__gt=0), name="well_td_positive"
            ),
            DatumKind.constraint("datum_kind", "well_datum_known"),
        ]

    def __str__(self) -> str:
        return self.name


class WellAlias(models.Model):
    """Another name under which laboratories report the well."""

    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="aliases")
    name = models.CharField(max_length=120)
    name_key = models.CharField(max_length=120)

    class Meta:
        constraints = [models.UniqueConstraint(fields=["well", "name_key"], name="well_alias_once")]

    def __str__(self) -> str:
        return self.name


class WellIdentifier(models.Model):
    """A further identifier of the well: kind names the authority that gave it."""

    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="identifiers")
    kind = models.CharField(max_length=40)
    value = models.CharField(max_length=80)

    class Meta:
        constraints = [models.UniqueConstraint(fields=["well", "kind", "value"], name="well_identifier_once")]

    def __str__(self) -> str:
        return f"{self.kind} {self.value}"


class SurveyStation(models.Model):
    """One station of the deviation survey: measured depth, inclination and azimuth (degrees)."""

    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="survey")
    md_m = models.FloatField()
    inclination_deg = models.FloatField()
    azimuth_deg = models.FloatField()

    class Meta:
        ordering = ["well", "md_m"]
        constraints = [
            models.UniqueConstraint(fields=["well", "md_m"], name="survey_station_once"),
            models.CheckConstraint(
                condition=models.Q(inclination_deg__gte=0, inclination_deg__lte=180), name="survey_inclination_range"
            ),
        ]

    def __str__(self) -> str:
        return f"{self.well} {self.md_m} m"


class FormationTop(models.Model):
    """The top of a formation in the well, by one interpreter's version."""

    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="tops")
    name = models.CharField(max_length=120)
    top_md_m = models.FloatField()
    version = models.CharField(max_length=60, default="1")

    class Meta:
        ordering = ["well", "version", "top_md_m"]
        constraints = [models.UniqueConstraint(fields=["well", "name", "version"], name="formation_top_once")]

    def __str__(self) -> str:
        return f"{self.name} {self.top_md_m} m"


class CoreRun(models.Model):
    """One run of the core barrel, in driller's depth, with its shift to the log (log = driller + shift)."""

    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="core_runs")
    number = models.PositiveSmallIntegerField()
    top_md_m = models.FloatField()
    base_md_m = models.FloatField()
    recovered_m = models.FloatField(null=True, blank=True)
    shift_to_log_m = models.FloatField(null=True, blank=True)

    class Meta:
        ordering = ["well", "number"]
        constraints = [
            models.UniqueConstraint(fields=["well", "number"], name="core_run_once"),
            models.CheckConstraint(condition=models.Q(base_md_m__gt=models.F("top_md_m")), name="core_run_downward"),
        ]

    def __str__(self) -> str:
        return f"core {self.number} of {self.well}"


class CasingShoe(models.Model):
    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="casing_shoes")
    md_m = models.FloatField()
    diameter_in = models.FloatField(null=True, blank=True)

    class Meta:
        ordering = ["well", "md_m"]
        constraints = [models.UniqueConstraint(fields=["well", "md_m"], name="casing_shoe_once")]

    def __str__(self) -> str:
        return f"casing shoe {self.md_m} m"


class MudKind(Choices):
    """What the drilling fluid is based on."""

    WATER = "water", "water-based"
    OIL = "oil", "oil-based"
    SYNTHETIC = "synthetic", "synthetic-based"
    AIR = "air", "air or foam"


class MudInterval(models.Model):
    """The drilling fluid in use between two depths, with the additives recorded."""

    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="muds")
    top_md_m = models.FloatField()
    base_md_m = models.FloatField()
    kind = models.CharField(max_length=10, choices=MudKind.choices)
    additives = models.CharField(max_length=300, blank=True)

    class Meta:
        ordering = ["well", "top_md_m"]
        constraints = [
            models.CheckConstraint(condition=models.Q(base_md_m__gt=models.F("top_md_m")), name="mud_downward"),
            MudKind.constraint("kind", "mud_kind_known"),
        ]

    def __str__(self) -> str:
        return f"{self.get_kind_display()} mud {self.top_md_m}-{self.base_md_m} m"


class CurveQuantity(Choices):
    """What a gamma tool measures."""

    GAMMA = "gamma", "gamma"
    POTASSIUM = "potassium", "potassium by spectral gamma"
    URANIUM = "uranium", "uranium by spectral gamma"
    THORIUM = "thorium", "thorium by spectral gamma"


class LogCurve(models.Model):
    """One gamma curve logged along the well, as a wireline file gives it.

    ``depths`` are metres and ``values`` are in ``unit``, both little-endian doubles of one length; NaN where the file
    has its null value. Several files may log the same well.
    """

    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="curves")
    report = models.ForeignKey("labdata.Report", on_delete=models.PROTECT, related_name="curves")
    mnemonic = models.CharField(max_length=40)
    description = models.CharField(max_length=160, blank=True)
    quantity = models.CharField(max_length=10, choices=CurveQuantity.choices)
    unit = models.CharField(max_length=24, blank=True)
    depth_unit_reported = models.CharField(max_length=10)
    top_md_m = models.FloatField()
    base_md_m = models.FloatField()
    count = models.PositiveIntegerField()
    depths = models.BinaryField()
    values = models.BinaryField()

    class Meta:
        ordering = ["well", "report", "id"]
        constraints = [
            models.UniqueConstraint(fields=["report", "mnemonic"], name="log_curve_once_a_report"),
            models.CheckConstraint(
                condition=models.Q(base_md_m__gte=models.F("top_md_m"), count__gt=0), name="log_curve_downward"
            ),
            CurveQuantity.constraint("quantity", "log_curve_quantity_known"),
        ]

    def __str__(self) -> str:
        return f"{self.mnemonic} of {self.well}"

    def arrays(self) -> tuple[np.ndarray, np.ndarray]:
        """(depths [m], values [``unit``]), NaN where the file has its null value."""
        return np.frombuffer(self.depths, dtype="<f8"), np.frombuffer(self.values, dtype="<f8")
