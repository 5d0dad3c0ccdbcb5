"""Failed tries to sign in, kept for as long as they count."""

from django.db import models
from django.utils import timezone


class LoginFailure(models.Model):
    """One failed try: the account as typed (folded) and the address it came from."""

    account = models.CharField(max_length=150)
    address = models.CharField(max_length=45)
    at = models.DateTimeField(default=timezone.now)

    class Meta:
        ordering = ["-at"]
        indexes = [models.Index(fields=["account", "address", "at"], name="login_failure_lookup")]

    def __str__(self) -> str:
        return f"{self.account} from {self.address}"
