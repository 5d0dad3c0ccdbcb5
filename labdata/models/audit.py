"""The audit trail: every change, hash-chained, append-only in the database itself."""

from django.conf import settings
from django.db import models

from labdata.models.projects import Project


class AuditEntry(models.Model):
    """Who did what to which thing, when, before and after, and why; see labdata/audit.py for the chain."""

    seq = models.PositiveBigIntegerField(primary_key=True)
    at = models.DateTimeField()
    actor = models.ForeignKey(
        settings.AUTH_USER_MODEL, on_delete=models.PROTECT, null=True, blank=True, related_name="audit_entries"
    )
    actor_name = models.CharField(max_length=150)
    project = models.ForeignKey(Project, on_delete=models.PROTECT, null=True, blank=True, related_name="audit_entries")
    action = models.CharField(max_length=60)
    object_type = models.CharField(max_length=60)
    object_id = models.CharField(max_length=60)
    before = models.JSONField(null=True)
    after = models.JSONField(null=True)
    reason = models.TextField(blank=True)
    prev_hash = models.CharField(max_length=64, unique=True)
    hash = models.CharField(max_length=64, unique=True)

    class Meta:
        ordering = ["seq"]
        verbose_name_plural = "audit entries"
        indexes = [models.Index(fields=["object_type", "object_id"], name="audit_by_object")]

    def __str__(self) -> str:
        return f"{self.seq} {self.action} {self.object_type} {self.object_id}"
