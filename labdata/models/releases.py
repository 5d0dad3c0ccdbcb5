"""Releases: frozen, numbered datasets made from signed review sets."""

from django.conf import settings
from django.db import models
from django.utils import timezone

from labdata.models.projects import Project


class Release(models.Model):
    """One immutable dataset. Its bytes lie in the file store under ``data_sha256``.

    ``manifest`` names inputs, report versions, rule set, decisions, signatures, counts and checksums.
    Only a withdrawal (who, when, why) may be written later; a database trigger refuses the rest.
    """

    project = models.ForeignKey(Project, on_delete=models.PROTECT, related_name="releases")
    number = models.PositiveIntegerField()
    title = models.CharField(max_length=200)
    created_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, related_name="releases")
    created_at = models.DateTimeField(default=timezone.now)
    sign_offs = models.ManyToManyField("qc.SignOff", related_name="releases")
    manifest = models.JSONField()
    manifest_sha256 = models.CharField(max_length=64)
    data_sha256 = models.CharField(max_length=64)
    stored_as = models.CharField(max_length=255)
    analysis_count = models.PositiveIntegerField()
    result_count = models.PositiveIntegerField()
    withdrawn_at = models.DateTimeField(null=True, blank=True)
    withdrawn_by = models.ForeignKey(
        settings.AUTH_USER_MODEL, on_delete=models.PROTECT, null=True, blank=True, related_name="+"
    )
    withdrawn_reason = models.TextField(blank=True)

    class Meta:
        ordering = ["project", "-number"]
        constraints = [
            models.UniqueConstraint(fields=["project", "number"], name="release_number_once"),
            models.CheckConstraint(
                condition=models.Q(withdrawn_at__isnull=True) | ~models.Q(withdrawn_reason=""),
                name="release_withdrawal_says_why",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.project} release {self.number}"
