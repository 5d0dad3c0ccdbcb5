from typing import Any

from django.apps import AppConfig
from django.db import connections
from django.db.models.signals import post_migrate


def _guard_tables(using: str, **_: Any) -> None:
    """Install the append-only triggers: after every migration, since a rebuilt SQLite table has lost its own."""
    from labdata import triggers  # noqa: PLC0415 - models must be loaded first

    triggers.install(connections[using])


def _seed_rule_set(using: str, **_: Any) -> None:
    """Keep the standard rule set as shipped: idempotent, and there again after a flush."""
    from qc import models, rulesets  # noqa: PLC0415

    if models.RuleSet._meta.db_table in connections[using].introspection.table_names():
        rulesets.seed(using)


class QcConfig(AppConfig):
    name = "qc"
    verbose_name = "quality control and review"

    def ready(self) -> None:
        post_migrate.connect(_guard_tables, sender=self)
        post_migrate.connect(_seed_rule_set, sender=self)
