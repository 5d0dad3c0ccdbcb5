from typing import Any

from django.apps import AppConfig
from django.db import connections
from django.db.models.signals import post_migrate


def _guard_tables(using: str, **_: Any) -> None:
    """Install the append-only triggers: after every migration, since a rebuilt SQLite table has lost its own."""
    from labdata import triggers  # noqa: PLC0415 - models must be loaded first

    triggers.install(connections[using])


class QcConfig(AppConfig):
    name = "qc"
    verbose_name = "quality control and review"

    def ready(self) -> None:
        post_migrate.connect(_guard_tables, sender=self)
