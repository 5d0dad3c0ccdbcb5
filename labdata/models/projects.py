"""Projects, who may do what in them, and the keys by which programs come in."""

from django.conf import settings
from django.db import models
from django.utils import timezone

from labdata.models.base import Choices


class Role(Choices):
    """What a member of a project is there for; labdata/access.py says what each role may do."""

    COORDINATOR = "coordinator", "sample coordinator"
    ANALYST = "analyst", "laboratory analyst"
    GEOCHEMIST = "geochemist", "geochemist"
    APPROVER = "approver", "approver"
    INTERPRETER = "interpreter", "interpreter"
    ADMINISTRATOR = "administrator", "administrator"


class Project(models.Model):
    """A body of wells and results with its own members. Nothing is shared between projects."""

    slug = models.SlugField(max_length=60, unique=True)
    name = models.CharField(max_length=200)
    description = models.TextField(blank=True)
    created_at = models.DateTimeField(default=timezone.now, editable=False)

    class Meta:
        ordering = ["slug"]
        constraints = [models.CheckConstraint(condition=~models.Q(slug=""), name="project_has_slug")]

    def __str__(self) -> str:
        return self.slug


class Membership(models.Model):
    """One role of one user in one project; several roles are several rows."""

    project = models.ForeignKey(Project, on_delete=models.CASCADE, related_name="memberships")
    user = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.CASCADE, related_name="memberships")
    role = models.CharField(max_length=20, choices=Role.choices)

    class Meta:
        ordering = ["project", "user", "role"]
        constraints = [
            models.UniqueConstraint(fields=["project", "user", "role"], name="membership_once"),
            Role.constraint("role", "membership_role_known"),
        ]

    def __str__(self) -> str:
        return f"{self.user} is {self.role} of {self.project}"


class TokenScope(Choices):
    READ = "read", "read"
    WRITE = "write", "read and write"


class ApiToken(models.Model):
    """A key for a program acting as ``user`` in one project. Only the SHA-256 of the key is kept."""

    user = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.CASCADE, related_name="api_tokens")
    project = models.ForeignKey(Project, on_delete=models.CASCADE, related_name="api_tokens")
    scope = models.CharField(max_length=5, choices=TokenScope.choices)
    key_sha256 = models.CharField(max_length=64, unique=True)
    created_at = models.DateTimeField(default=timezone.now, editable=False)
    expires_at = models.DateTimeField(null=True, blank=True)
    revoked_at = models.DateTimeField(null=True, blank=True)

    class Meta:
        ordering = ["-created_at"]
        constraints = [TokenScope.constraint("scope", "token_scope_known")]

    def __str__(self) -> str:
        return f"{self.scope} token of {self.user} for {self.project}"


class IdempotencyRecord(models.Model):
    """The answer once given to a POST with an Idempotency-Key, so that a retry gets the same answer."""

    user = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.CASCADE)
    key = models.CharField(max_length=200)
    request_sha256 = models.CharField(max_length=64)
    status = models.PositiveSmallIntegerField()
    body = models.JSONField()
    created_at = models.DateTimeField(default=timezone.now, editable=False)

    class Meta:
        constraints = [models.UniqueConstraint(fields=["user", "key"], name="idempotency_key_once")]

    def __str__(self) -> str:
        return self.key
